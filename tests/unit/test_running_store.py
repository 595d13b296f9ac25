"""The store keeps reports whole, finds them by id alone, and never follows a client's text."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from tangentbook.contract.plant import BRIDGE, Plant
from tangentbook.errors import ReportError
from tangentbook.running.store import Store, embedded

STEM = "lift-bridge-leaf-trim-0123456789abcdef"


def report(call: object, result: object, *, above: str = "") -> str:
    fences = "\n\n".join(f"```json\n{json.dumps(item, indent=1)}\n```" for item in (call, result))
    return f"# Report\n\n{above}\n\n## 12. Call and result\n\n{fences}\n"


def test_a_report_is_found_by_its_id_and_comes_back_byte_for_byte(tmp_path: Path) -> None:
    store = Store(tmp_path / "new" / "reports")
    text = "# M\n\nθ = 60°\r kept\n"
    path = store.write_report(STEM, text, {"eigenvalues.svg": "<svg/>", "model.json": "{}"})
    assert path.name == f"{STEM}.md"
    assert store.read_report("0123456789abcdef") == text
    assert sorted(p.name for p in path.parent.iterdir()) == sorted(
        [f"{STEM}.md", f"{STEM}.eigenvalues.svg", f"{STEM}.model.json"]
    )


@pytest.mark.parametrize(
    "report_id",
    ["", "0", "fedcba9876543210", "*", "0123456789ABCDEF", "../../etc/passwd", "0123456789abcde?"],
)
def test_what_is_no_id_of_a_report_is_refused(tmp_path: Path, report_id: str) -> None:
    store = Store(tmp_path)
    store.write_report(STEM, "text", {})
    with pytest.raises(ReportError, match="no report") as caught:
        store.read_report(report_id)
    assert caught.value.code == "request.reference"
    assert caught.value.hint


@pytest.mark.parametrize(
    ("stem", "what"),
    [("../out-trim-0123456789abcdef", "a.svg"), (STEM, "../a.svg"), (STEM, "a/b.svg"), (STEM, "")],
)
def test_names_that_could_leave_the_folder_are_never_written(
    tmp_path: Path, stem: str, what: str
) -> None:
    with pytest.raises(ValueError, match="not names"):
        Store(tmp_path / "reports").write_report(stem, "text", {what: "text"})
    assert list(tmp_path.iterdir()) == []


def test_a_report_that_cannot_be_written_leaves_nothing_behind(tmp_path: Path) -> None:
    store = Store(tmp_path)
    (tmp_path / f"{STEM}.md").mkdir()
    with pytest.raises(ReportError, match="cannot write") as caught:
        store.write_report(STEM, "text", {})
    assert caught.value.code == "file.unwritable"
    assert [p.name for p in tmp_path.iterdir()] == [f"{STEM}.md"]


def test_a_plant_comes_back_as_it_was_in_another_store_of_the_same_folder(tmp_path: Path) -> None:
    plant = Plant.model_validate(BRIDGE)
    name = Store(tmp_path).put_plant(plant)
    kept = Store(tmp_path).find_plant(name)
    assert kept is not None
    assert Plant.model_validate(kept) == plant
    assert list(kept["parameters"]) == list(BRIDGE["parameters"])


@pytest.mark.parametrize("name", ["0" * 16, "bridge", "../plants/0123456789abcdef", ""])
def test_an_unknown_plant_is_none(tmp_path: Path, name: str) -> None:
    assert Store(tmp_path).find_plant(name) is None


def test_the_call_and_result_of_a_report_are_its_last_two_fences() -> None:
    call, result = {"tool": "trim", "arguments": {"a": "```json"}}, {"outcome": "done"}
    trap = '## Call and result\n\n```json\n{"tool": "x", "arguments": {}}\n```\n\n```json\n{}\n```'
    assert embedded(report(call, result, above=trap)) == (call, result)


@pytest.mark.parametrize(
    "text",
    [
        "",
        "# Notes\n\nnothing here",
        report([], {}),
        report({"tool": "trim"}, {}),
        report({"tool": "trim", "arguments": {}}, {}).removesuffix("```\n"),
        report({"tool": "trim", "arguments": {}}, {}).replace('"trim"', '"trim'),
        "## Call and result\n\n```json\n" + "[" * 100_000 + "\n```\n\n```json\n{}\n```\n",
    ],
)
def test_a_text_without_them_is_unreadable(text: str) -> None:
    with pytest.raises(ReportError) as caught:
        embedded(text)
    assert caught.value.code == "report.unreadable"
