"""Sheets: mistakes are found before the first call, grids are laid out, expectations compared."""

from __future__ import annotations

import asyncio
import json
from pathlib import Path
from typing import Any

import pytest

from support_running.cases import AT_60
from tangentbook.contract.plain import MISSING
from tangentbook.contract.plant import BRIDGE
from tangentbook.errors import TangentbookError
from tangentbook.expectations import Failure, failures_of
from tangentbook.sheet_runs import Outcome, run_calls, summary
from tangentbook.sheets import Call, read_sheet


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """A folder with the bridge leaf as plants/leaf.json."""
    (tmp_path / "plants").mkdir()
    (tmp_path / "plants" / "leaf.json").write_text(json.dumps(BRIDGE), "utf-8")
    return tmp_path


def sheet(folder: Path, *calls: dict[str, Any], name: str = "sheet.json") -> Path:
    path = folder / name
    path.write_text(json.dumps({"call": calls}), "utf-8")
    return path


def leaf(**entries: object) -> dict[str, Any]:
    """An entry that trims the bridge leaf at 60 degrees."""
    point = {"hold": {"theta": "60 deg"}}
    return {"tool": "trim", "plant": "plants/leaf.json", "point": point, **entries}


def run(folder: Path, calls: list[Call], *, jobs: int = 2) -> list[Outcome]:
    return asyncio.run(run_calls(calls, reports=folder / "reports", jobs=jobs))


def test_the_three_formats_read_alike(folder: Path) -> None:
    toml = (
        '[[call]]\nname = "up"\ntool = "trim"\nplant = "plants/leaf.json"\n'
        'point = { hold = { theta = "60 deg" } }\n[call.expect]\n"/outcome" = "done"\n'
    )
    (folder / "a.toml").write_text(toml, "utf-8")
    entry = leaf(name="up", expect={"/outcome": "done"})
    (folder / "a.jsonl").write_text(json.dumps(entry) + "\n", "utf-8")
    paths = [folder / "a.toml", folder / "a.jsonl", sheet(folder, entry, name="a.json")]
    calls = [read_sheet(path)[0] for path in paths]
    assert {call.name for call in calls} == {"up"}
    assert all(call.arguments == AT_60 for call in calls)
    assert all(call.expect == {"/outcome": "done"} for call in calls)


def test_arguments_may_stand_in_a_table_of_their_own(folder: Path) -> None:
    entry = leaf()
    del entry["tool"]
    calls = read_sheet(sheet(folder, {"tool": "trim", "arguments": entry}))
    assert calls[0].arguments == AT_60


def test_a_grid_makes_every_combination(folder: Path) -> None:
    entry = leaf(
        name="grid",
        over={"plant.set.r": [0.3, "0.4 m"], "/point/hold/theta": ["30 deg", "60 deg", 1]},
    )
    calls = read_sheet(sheet(folder, entry))
    assert len(calls) == 6
    assert len({call.name for call in calls}) == 6
    assert calls[0].name == "grid [plant.set.r=0.3, /point/hold/theta=30 deg]"
    assert calls[-1].arguments["plant"]["parameters"]["r"] == {"is": "0.4 m"}
    assert calls[-1].arguments["point"] == {"hold": {"theta": 1}}


@pytest.mark.parametrize(
    ("entry", "match"),
    [
        ({"plant": "plants/leaf.json"}, "tool is missing"),
        (leaf(tool="trimm"), "there is no tool 'trimm'"),
        (leaf(expect={"outcome": "done"}), "begins with a slash"),
        (leaf(expect={"/a": {"value": 1}}), "abs"),
        (leaf(expect={"/a": {"value": 1, "abs": -1}}), "not negative"),
        (leaf(expect={"/a": {"value": "x", "rel": 1}}), "abs"),
        (leaf(over={"point.hold.theta": []}), "at least 1"),
        (leaf(over={"tool.x.y": [1]}, arguments={"tool": 1}), "tool"),
        (leaf(over={"plant.file.x": [1]}), "no place"),
        (leaf(arguments={"plant": {}}), "in `arguments`"),
        (leaf(over={"point.hold.theta": [1] * 200, "point.hold.M": [1] * 200}), "more than 10000"),
    ],
)
def test_a_mistake_names_file_and_call_before_anything_runs(
    folder: Path, entry: dict[str, Any], match: str
) -> None:
    path = sheet(folder, leaf(name="fine"), {"name": "wrong", **entry})
    with pytest.raises(TangentbookError, match=match) as caught:
        read_sheet(path)
    assert caught.value.code == "sheet.call"
    assert str(path) in caught.value.where


@pytest.mark.parametrize(
    ("plant", "code"), [("plants/none.json", "file.missing"), ("../leaf.json", "sheet.call")]
)
def test_a_plant_file_is_looked_for_beside_the_sheet(folder: Path, plant: str, code: str) -> None:
    with pytest.raises(TangentbookError) as caught:
        read_sheet(sheet(folder, leaf(name="lost", plant=plant)))
    assert caught.value.code == code
    assert "'lost'" in caught.value.where


def test_one_bad_call_never_stops_the_others(folder: Path) -> None:
    moment = "/points/0/values/M/value"
    path = sheet(
        folder,
        leaf(name="holds", expect={"/outcome": "done", moment: 9100}),
        leaf(name="fails", expect={moment: {"value": 9000, "rel": 0.001}}),
        leaf(name="refused", pont={}),
        leaf(name="half", plant={"file": "plants/leaf.json", "set": {"W": "26 kN"}}),
        leaf(name="expects refusal", pont={}, expect={"/error/code": "request.field"}),
    )
    outcomes = run(folder, read_sheet(path))
    assert [outcome.name for outcome in outcomes] == [
        "holds",
        "fails",
        "refused",
        "half",
        "expects refusal",
    ]
    assert [outcome.outcome for outcome in outcomes] == [
        "holds",
        "failed",
        "refused",
        "holds",
        "holds",
    ]
    failed = outcomes[1].as_dict()
    assert failed["failures"] == [
        {"pointer": moment, "expected": {"value": 9000, "rel": 0.001}, "found": 9100}
    ]
    assert failed["plant"] == "Lift bridge leaf"
    assert Path(failed["report"]["path"]).is_file()
    assert outcomes[2].as_dict()["report"] is None
    assert "did you mean point?" in outcomes[2].answer
    assert "'refused'" in outcomes[2].answer
    assert summary(outcomes) == "5 calls: 3 holds, 1 failed, 1 refused"


def test_jobs_change_nothing_but_the_time(folder: Path) -> None:
    path = sheet(folder, leaf(over={"point.hold.theta": ["30 deg", "60 deg", "80 deg"]}))
    one, three = (run(folder, read_sheet(path), jobs=jobs) for jobs in (1, 3))
    assert [outcome.as_dict() for outcome in one] == [outcome.as_dict() for outcome in three]


RESULT: dict[str, Any] = {
    "outcome": "done",
    "n": 9100,
    "x": 0.2525460312,
    "list": [1, -0.0, None],
    "a/b": {"m~n": True},
}


@pytest.mark.parametrize(
    ("pointer", "expected"),
    [
        ("/outcome", "done"),
        ("/n", 9100.0),
        ("/n", {"value": 9000, "abs": 100}),
        ("/n", {"value": 9000, "rel": 0.02, "abs": 0}),
        ("/x", 0.25254603121),
        ("/x", {"value": 0.2525, "abs": 1e-4}),
        ("/list", [1, 0, None]),
        ("/list/0", 1),
        ("/list/2", None),
        ("/a~1b/m~0n", True),
    ],
)
def test_an_expectation_that_is_met(pointer: str, expected: object) -> None:
    assert list(failures_of(RESULT, {pointer: expected})) == []


@pytest.mark.parametrize(
    ("pointer", "expected", "found"),
    [
        ("/outcome", "no-point", "done"),
        ("/x", 0.252546032, 0.2525460312),
        ("/n", {"value": 9000, "abs": 99}, 9100),
        ("/n", "9100", 9100),
        ("/n", True, 9100),
        ("/a~1b/m~0n", 1, True),
        ("/list/2", 0, None),
        ("/list", [1, 0], [1, -0.0, None]),
        ("/list/3", 1, MISSING),
        ("/list/-1", None, MISSING),
        ("/outcome/0", "d", MISSING),
        ("/nothing", None, MISSING),
    ],
)
def test_an_expectation_that_fails_says_what_is_there(
    pointer: str, expected: object, found: object
) -> None:
    failures = list(failures_of(RESULT, {pointer: expected}))
    assert failures == [Failure(pointer=pointer, expected=expected, found=found)]
    assert pointer in str(failures[0])
    assert ("found" in failures[0].as_dict()) == (found is not MISSING)
