"""References become contents: plants by id and name, overrides, points of earlier reports."""

from __future__ import annotations

import json
from copy import deepcopy
from pathlib import Path
from typing import Any

import pytest

from support_running.cases import AT_60
from tangentbook.contract.identity import plant_id
from tangentbook.contract.plant import BRIDGE, Plant
from tangentbook.errors import LimitError, ReportError, RequestError
from tangentbook.running.overrides import unit_of, with_parameters
from tangentbook.running.resolve import References, resolve, served_plants
from tangentbook.running.store import Store


@pytest.fixture
def store(tmp_path: Path) -> Store:
    return Store(tmp_path / "reports")


@pytest.fixture
def known(store: Store) -> str:
    """The id of the bridge leaf, known to the store."""
    return store.put_plant(Plant.model_validate(BRIDGE))


def resolved_plant(reference: dict[str, Any], store: Store) -> dict[str, Any]:
    call = resolve("check-plant", {"plant": reference}, references=References(store=store))
    return call.arguments["plant"]


def test_a_resolved_call_resolves_to_itself() -> None:
    call = resolve("trim", AT_60)
    again = resolve("trim", json.loads(json.dumps(call.arguments)))
    assert again == call
    assert call.stem == f"lift-bridge-leaf-trim-{call.report_id}"


def test_the_budget_is_kept_apart_and_changes_no_id() -> None:
    with_budget = resolve("trim", {**AT_60, "budget_s": 3})
    assert with_budget.budget_s == 3
    assert with_budget.arguments == resolve("trim", AT_60).arguments
    assert with_budget.report_id == resolve("trim", AT_60).report_id


def test_a_reference_is_the_plant_itself(store: Store, known: str) -> None:
    references = References(store=store)
    by_id = resolve("trim", {**AT_60, "plant": {"ref": known}}, references=references)
    assert by_id == resolve("trim", AT_60)


@pytest.mark.parametrize(
    ("name", "change", "entry"),
    [
        ("J", 260000, {"is": "260000 kg m^2"}),
        ("J", 2.5, {"is": "2.5 kg m^2"}),
        ("J", "26e4", {"is": "26e4 kg m^2"}),
        ("J", "2*pi", {"is": "2*pi kg m^2"}),
        ("J", "260 Mg m^2", {"is": "260 Mg m^2"}),
        ("J", "W*r^2/9.81[m/s^2]", {"is": "W*r^2/9.81[m/s^2]"}),
        ("b", 2000, {"value": 2000, "unit": "N m s", "tolerance": "20 %"}),
        ("b", "2 kN m s", {"is": "2 kN m s", "unit": "N m s", "tolerance": "20 %"}),
    ],
)
def test_an_override_keeps_or_replaces_the_unit(
    store: Store, known: str, name: str, change: object, entry: dict[str, Any]
) -> None:
    plant = resolved_plant({"ref": known, "set": {name: change}}, store)
    expected = deepcopy(
        Plant.model_validate(BRIDGE).model_dump(by_alias=True, exclude_defaults=True)
    )
    assert plant["parameters"][name] == entry
    assert {k: v for k, v in plant["parameters"].items() if k != name} == {
        k: v for k, v in expected["parameters"].items() if k != name
    }
    assert list(plant["parameters"]) == list(expected["parameters"])


def test_the_source_of_a_changed_value_is_dropped() -> None:
    entry = {"value": 3, "unit": "m", "source": "drawing 7", "about": "span"}
    changed = with_parameters({"parameters": {"L": entry}}, {"L": 4})
    assert changed["parameters"]["L"] == {"value": 4, "unit": "m", "about": "span"}
    assert entry["source"] == "drawing 7"


@pytest.mark.parametrize(
    ("text", "unit"),
    [
        ("52 kN", "kN"),
        ("2*pi*50 rad/s", "rad/s"),
        ("2 * pi * 50 rad/s", "rad/s"),
        ("(1 + 2) m", "m"),
        ("2*a + 3", ""),
        ("pi/3", ""),
        (" 7 ", ""),
        (7, ""),
    ],
)
def test_the_unit_follows_the_first_space_outside_the_expression(text: object, unit: str) -> None:
    assert unit_of(text) == unit


def test_an_unknown_parameter_is_refused_with_the_nearest(store: Store, known: str) -> None:
    with pytest.raises(RequestError, match="Jj is not a parameter") as caught:
        resolved_plant({"ref": known, "set": {"Jj": 1}}, store)
    assert caught.value.code == "request.set"
    assert caught.value.where == "plant.set.Jj"
    assert caught.value.hint == "did you mean J?"


@pytest.mark.parametrize("name", ["0123456789abcdef", "bridge", "../../etc/passwd"])
def test_an_unknown_reference_says_send_the_plant_inline(store: Store, name: str) -> None:
    with pytest.raises(RequestError, match="no plant") as caught:
        resolved_plant({"ref": name}, store)
    assert caught.value.code == "request.reference"
    assert "send the plant inline" in caught.value.hint


def test_a_name_resolves_in_the_served_folder_only(store: Store, tmp_path: Path) -> None:
    folder = tmp_path / "plants"
    folder.mkdir()
    (folder / "leaf.json").write_text(json.dumps(BRIDGE), "utf-8")
    (folder / "decay.toml").write_text('name = "Decay"\nequations = ["x\' = -x"]\n', "utf-8")
    (folder / "broken.toml").write_text("name = ", "utf-8")
    (folder / "other.json").write_text('{"no": "plant"}', "utf-8")
    (tmp_path / "outside.json").write_text(json.dumps({**BRIDGE, "name": "Outside"}), "utf-8")
    (folder / "link.json").symlink_to(tmp_path / "outside.json")
    assert set(served_plants(folder)) == {"leaf", "Lift bridge leaf", "decay", "Decay"}
    references = References(store=store, plants=folder)
    bridge = plant_id(Plant.model_validate(BRIDGE))
    for name in ("leaf", "Lift bridge leaf"):
        call = resolve("check-plant", {"plant": {"ref": name}}, references=references)
        assert call.plant_id == bridge
    with pytest.raises(RequestError) as caught:
        resolve("check-plant", {"plant": {"ref": "lea"}}, references=references)
    assert "did you mean leaf?" in caught.value.hint


def earlier(store: Store, point: dict[str, Any], values: dict[str, float]) -> str:
    """A report of a trim of the bridge leaf in the store; its id."""
    call = resolve("trim", {"plant": BRIDGE, "point": [{"hold": {"theta": 0}}, point]})
    roles = {"theta": "state", "M": "state", "Mc": "input", "Mw": "input", "lift": "definition"}
    entry = {
        "request": 1,
        "id": "p2",
        "outcome": "done",
        "values": {name: {"value": value, "known": "exact"} for name, value in values.items()},
    }
    result = {"plant": {"roles": roles}, "points": [{"request": 0, "id": "p1"}, entry]}
    embedded = {"tool": "trim", "tool_version": "0.1.0", "arguments": call.arguments}
    fences = "\n\n".join(f"```json\n{json.dumps(item)}\n```" for item in (embedded, result))
    store.write_report(call.stem, f"## Call and result\n\n{fences}\n", {})
    return call.report_id


def test_a_point_is_taken_over_with_its_values_as_guess(store: Store) -> None:
    asked = {"name": "up", "hold": {"theta": "60 deg"}, "guess": {"M": 1}, "set": {"b": 5}}
    report = earlier(store, asked, {"theta": 1.047, "M": 9100, "Mc": 9100, "Mw": 0, "lift": 3})
    changed = with_parameters(BRIDGE, {"J": 1})
    point = {"from": {"report": report, "point": "p2"}, "set": {"W": "50 kN"}}
    call = resolve("trim", {"plant": changed, "point": point}, references=References(store=store))
    assert call.arguments["point"] == [
        {
            "name": "up",
            "hold": [{"is": "theta", "equals": "60 deg"}],
            "guess": {"M": 9100, "Mc": 9100},
            "set": {"b": 5, "W": "50 kN"},
        }
    ]
    assert resolve("trim", call.arguments) == call


@pytest.mark.parametrize(
    ("plant", "point", "match"),
    [
        (BRIDGE, "p1", "no point 'p1'"),
        (BRIDGE, "p9", "no point 'p9'"),
        ({**BRIDGE, "equations": ["M' = -M + theta", "theta' = M"]}, "p2", "another plant"),
    ],
)
def test_a_point_that_is_not_there_is_refused(
    store: Store, plant: dict[str, Any], point: str, match: str
) -> None:
    report = earlier(store, {"hold": {"theta": 1}}, {"theta": 1, "M": 2})
    wanted = {"from": {"report": report, "point": point}}
    with pytest.raises(RequestError, match=match) as caught:
        resolve("trim", {"plant": plant, "point": wanted}, references=References(store=store))
    assert caught.value.where.startswith("point.0.from")


def test_a_point_of_an_unknown_report_is_refused(store: Store) -> None:
    wanted = {"from": {"report": "0123456789abcdef"}}
    arguments = {"plant": BRIDGE, "point": wanted}
    with pytest.raises(ReportError, match="no report"):
        resolve("trim", arguments, references=References(store=store))
    with pytest.raises(RequestError, match="no reports"):
        resolve("trim", arguments)


@pytest.mark.parametrize(
    ("arguments", "where", "hint"),
    [
        ({"plant": BRIDGE, "pont": {}}, "pont", "did you mean point?"),
        ({"plant": BRIDGE, "point": {"hld": {}}}, "point.0.hld", "did you mean hold?"),
        ({"plant": {"name": "x", "equation": ["x'=1"]}}, "plant.equation", "equations?"),
        ({"plant": {"reff": "x"}}, "plant.reff", ""),
        ({"plant": {"ref": "x", "sett": {}}}, "plant.sett", "did you mean set?"),
        ({"plant": "bridge"}, "plant", "ref"),
        ({"plant": BRIDGE, "budget_s": -1}, "budget_s", ""),
        ({}, "plant", ""),
        ([], "", "plant"),
        (None, "", "plant"),
    ],
)
def test_what_is_not_understood_names_the_place_and_the_remedy(
    arguments: object, where: str, hint: str
) -> None:
    with pytest.raises(RequestError) as caught:
        resolve("trim", arguments)
    assert caught.value.where == where
    assert hint in caught.value.hint
    assert "function-" not in caught.value.message
    assert "pydantic" not in str(caught.value)


def nested(levels: int) -> object:
    value: object = 1
    for _ in range(levels):
        value = [value]
    return value


@pytest.mark.parametrize(
    ("arguments", "match"),
    [
        ({"plant": {**BRIDGE, "tables": {"T": nested(100_000)}}}, "nested deeper"),
        ({"plant": {**BRIDGE, "tables": {"T": float("nan")}}}, "NaN"),
        ({"plant": {**BRIDGE, "parameters": {"J": float("inf")}}}, "NaN and infinity"),
        ({"plant": BRIDGE, "frequencies": {1, 2}}, "a set is not"),
    ],
)
def test_what_json_cannot_hold_is_refused(arguments: dict[str, Any], match: str) -> None:
    with pytest.raises(RequestError, match=match):
        resolve("linearize", arguments)


def test_arguments_beyond_the_limit_are_refused() -> None:
    with pytest.raises(LimitError, match="1 MiB") as caught:
        resolve("trim", {"plant": {**BRIDGE, "about": "x" * 1_100_000}})
    assert caught.value.code == "limit.text"


def test_an_unknown_tool_is_refused_with_the_nearest() -> None:
    with pytest.raises(RequestError) as caught:
        resolve("trimm", AT_60)
    assert caught.value.hint == "did you mean trim?"
