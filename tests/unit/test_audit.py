"""An audit tells a report that comes out again from one that does not, and says where."""

from __future__ import annotations

import asyncio
import json
import os
from pathlib import Path
from typing import Any

import pytest

from support_running.cases import AT_60, ODD, odd
from tangentbook.audit import Audit, audit_report, audit_reports, find_reports
from tangentbook.differences import Difference, alike, of_lines, of_values
from tangentbook.errors import ReportError
from tangentbook.running.calls import Runner
from tangentbook.running.pool import Pool
from tangentbook.running.store import Store


def written(folder: Path, arguments: dict[str, Any], *, tool: str = "trim") -> Path:
    """A report of a call in the folder."""

    async def main() -> Path:
        async with Pool(jobs=1, module=ODD) as pool:
            return (await Runner(pool=pool, store=Store(folder)).answer(tool, arguments)).path

    return asyncio.run(main())


def audited_often(path: Path, times: int) -> list[Audit]:
    async def main() -> list[Audit]:
        async with Pool(jobs=1, module=ODD) as pool:
            return [await audit_report(path, pool) for _ in range(times)]

    return asyncio.run(main())


def audited(path: Path) -> Audit:
    return audited_often(path, 1)[0]


@pytest.fixture(scope="module")
def honest(tmp_path_factory: pytest.TempPathFactory) -> str:
    """The text of a report of the bridge leaf, and its name in the first line."""
    path = written(tmp_path_factory.mktemp("honest"), AT_60, tool="linearize")
    return f"{path.name}\n{path.read_text('utf-8')}"


@pytest.fixture
def report(honest: str, tmp_path: Path) -> Path:
    """A copy of that report on its own, as on another machine."""
    name, text = honest.split("\n", 1)
    path = tmp_path / name
    path.write_text(text, "utf-8")
    return path


def test_a_report_is_reproduced_without_its_store(report: Path) -> None:
    audit = audited(report)
    assert audit.as_dict() == {"path": str(report), "outcome": "reproduced", "differences": []}
    assert audit.holds


def altered(report: Path, old: str, new: str) -> Audit:
    text = report.read_text("utf-8")
    assert old in text
    report.write_text(text.replace(old, new), "utf-8")
    return audited(report)


def test_a_changed_number_of_the_result_is_located(report: Path) -> None:
    text = report.read_text("utf-8")
    at = text.rindex("0.2525460312")
    report.write_text(text[:at] + "-0.252546031" + text[at + 12 :], "utf-8")
    audit = audited(report)
    assert audit.outcome == "differs"
    assert not audit.holds
    assert audit.as_dict()["differences"] == [
        {
            "where": "/points/0/stability/eigenvalues/0/re",
            "stated": -0.252546031,
            "found": 0.2525460312,
        }
    ]


def test_a_changed_line_of_the_text_is_located(report: Path) -> None:
    title, rest = report.read_text("utf-8").split("\n", 1)
    report.write_text(f"{title}\n\nIt is certified.\n{rest}", "utf-8")
    audit = audited(report)
    assert audit.outcome == "differs"
    assert any("It is certified." in str(item.stated) for item in audit.differences)


def test_a_changed_call_differs(report: Path) -> None:
    audit = altered(report, '"60 deg"', '"61 deg"')
    assert audit.outcome == "differs"
    assert "/points/0/values/M/value" in [item.where for item in audit.differences]


def test_a_call_that_is_refused_now_differs(report: Path) -> None:
    audit = altered(report, '"point"', '"pont"')
    assert audit.outcome == "differs"
    assert "did you mean point?" in str(audit.differences[0].found)


def test_another_version_is_told_apart(report: Path) -> None:
    audit = altered(report, '"tool_version": "0.1.0"', '"tool_version": "0.0.9"')
    assert audit.outcome == "other version"
    assert not audit.holds


@pytest.mark.parametrize("content", [b"", b"# Notes\n", b"\xff\xfe", b"## Call and result\n"])
def test_what_is_no_report_is_unreadable(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "notes.md"
    path.write_bytes(content)
    audit = audited(path)
    assert audit.outcome == "unreadable"
    assert audit.differences[0].found


def test_measured_digits_may_wobble_and_proved_ones_may_not(tmp_path: Path) -> None:
    for about, outcome in (("", "same digits"), ("proved", "differs")):
        path = written(tmp_path, odd("wobbler", about=about))
        outcomes = {audit.outcome for audit in audited_often(path, 12)}
        assert outcomes <= {outcome, "reproduced"}
        assert outcome in outcomes


def test_side_files_are_compared_too(tmp_path: Path) -> None:
    path = written(tmp_path, odd("wobbler"))
    figure = path.with_suffix(".figure.svg")
    figure.write_text("<svg>no figure</svg>\n", "utf-8")
    assert "figure.svg 1" in [item.where for item in audited(path).differences]
    figure.unlink()
    assert ("figure.svg 1", "(no such file)") in [
        (item.where, item.stated) for item in audited(path).differences
    ]
    path.with_suffix(".extra.csv").write_text("1\n", "utf-8")
    assert ("extra.csv 1", "(no such file)") in [
        (item.where, item.found) for item in audited(path).differences
    ]


def test_reports_are_found_in_trees(report: Path, tmp_path: Path) -> None:
    below = tmp_path / "a" / "b"
    below.mkdir(parents=True)
    renamed = below / "signed.md"
    renamed.write_bytes(report.read_bytes())
    (below / "README.md").write_text("# Notes\n", "utf-8")
    (below / "loop").symlink_to(tmp_path)
    assert find_reports([tmp_path]) == [report, renamed]
    assert find_reports([below / "README.md"]) == [below / "README.md"]
    outcomes = asyncio.run(audit_reports([renamed, report, below / "README.md"], jobs=2))
    assert [audit.outcome for audit in outcomes] == ["reproduced", "reproduced", "unreadable"]


def test_nothing_to_audit_is_a_mistake_of_the_command_line(tmp_path: Path) -> None:
    (tmp_path / "README.md").write_text("# Notes\n", "utf-8")
    for path in (tmp_path, tmp_path / "none"):
        with pytest.raises(ReportError) as caught:
            find_reports([path])
        assert caught.value.code == "file.missing"


@pytest.mark.parametrize(
    ("one", "other", "same"),
    [
        (1.234567891, 1.234567892, True),
        (1.234567891, 1.234567893, False),
        (-0.5, 0.5, False),
        (1e-12, 1.1e-12, False),
        (0.123, 0.124, True),
        (3, 4, False),
        (135, 140, False),
        (0, 0.0, True),
        (0, 1e-9, False),
    ],
)
def test_numbers_are_alike_within_their_printed_digits(
    one: float,
    other: float,
    same: bool,  # noqa: FBT001 - a table of cases
) -> None:
    assert alike(one, other) is same
    assert alike(other, one) is same


def test_values_are_compared_by_pointer_and_by_how_they_are_known() -> None:
    stated = {
        "known": "proved",
        "a/b": [1.234567891, 2],
        "run": {"known": "measured", "x": 1.234567891, "n": None},
        "gone": 1,
    }
    found = {
        "known": "proved",
        "a/b": [1.234567892],
        "run": {"known": "measured", "x": 1.234567892, "n": False},
        "new": 1,
    }
    assert [(item.where, item.soft) for item in of_values(stated, found)] == [
        ("/a~1b/0", False),
        ("/a~1b/1", False),
        ("/run/x", True),
        ("/run/n", False),
        ("/gone", False),
        ("/new", False),
    ]


def test_lines_with_numbers_alone_are_soft_only_where_allowed() -> None:
    stated, found = "rest\nx is 1.23457 m\nend", "rest\nx is 1.23458 m\nend"
    for soft in (True, False):
        (item,) = of_lines(stated, found, where="line", soft=soft)
        assert item == Difference(
            where="line 2", stated="x is 1.23457 m", found="x is 1.23458 m", soft=soft
        )
    (item,) = of_lines("x is 1 m", "y is 1 m", where="line", soft=True)
    assert not item.soft


def test_a_difference_reads_as_json_and_as_text() -> None:
    item = Difference(where="/x", stated="a" * 400, found=None)
    assert json.loads(json.dumps(item.as_dict())) == {
        "where": "/x",
        "stated": "a" * 400,
        "found": None,
    }
    assert len(str(item).split(os.linesep)) == 1
    assert len(str(item)) < 250
