# pyright: reportUnknownMemberType=false, reportUnknownVariableType=false
# pyright: reportUnknownArgumentType=false, reportUnknownLambdaType=false
"""The worked example of the plant language: the lift bridge leaf, in every form it may be written.

The source of the numbers is the plant itself: M = Mc = W r cos 60 deg = 52 kN 0.35 m / 2,
A[1][0] = W r sin 60 deg / J, and so on; `published.independent` computes them all a second time.
"""

from __future__ import annotations

import io
import json
import math
import shutil
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any

import mpmath as mp
import pytest

from published.calling import JSON, call, codes, kept, read_plant, text_of
from published.independent import OwnPlant
from published.matching import PRINTED, about, differences, same_spectrum
from tangentbook.cli import main
from tangentbook.contract.plant import BRIDGE
from tangentbook.errors import TangentbookError

if TYPE_CHECKING:
    from collections.abc import Callable

DESIGN = Path(__file__).parent / "design"

AT_60: JSON = json.loads(text_of(DESIGN, "point.json"))


def bridge() -> JSON:
    """The plant of the TOML fixture."""
    return read_plant(text_of(DESIGN, "lift-bridge.toml"), suffix=".toml")


def the_point(result: JSON) -> JSON:
    """The one entry of a result that was found."""
    (entry,) = result["points"]
    assert entry["outcome"] == "done", entry
    return entry


def refused(tool: str, plant: JSON, point: object = None, **arguments: object) -> TangentbookError:
    """The error of a call that must be refused."""
    with pytest.raises(TangentbookError) as caught:
        call(tool, plant, point, **arguments)
    return caught.value


# --- the plant as written


def test_the_toml_plant_is_understood() -> None:
    """Roles, order of the states, the disturbance among the inputs, the output."""
    result = kept("check-plant", bridge())
    summary = result["plant"]
    assert summary["name"] == "Lift bridge leaf"
    assert summary["states"] == ["theta", "theta'", "M"]
    assert summary["inputs"] == ["Mc", "Mw"]
    assert summary["outputs"] == ["angle"]
    assert summary["algebraic"] == []
    assert {n: summary["roles"][n] for n in ("theta", "M", "Mc", "Mw")} == {
        "theta": "state",
        "M": "state",
        "Mc": "input",
        "Mw": "input",
    }
    assert all(summary["roles"][n] == "parameter" for n in ("J", "b", "W", "r", "Tm"))
    assert "unused-name" not in codes(result)


def test_an_equation_may_be_a_table() -> None:
    """Labels and sources beside the equations change nothing in the model."""
    plant = read_plant(text_of(DESIGN, "equation-as-table.toml"), suffix=".toml")
    entry = the_point(kept("linearize", plant, AT_60))
    assert entry["model"] == the_point(kept("linearize", bridge(), AT_60))["model"]
    message = refused("trim", {**plant, "equations": [*plant["equations"], {"is": "Tm*M' = x*"}]})
    assert message.code.startswith("expression.")


def test_a_label_names_the_equation_in_a_conflict() -> None:
    """What blocks is said in the words of the plant."""
    plant = read_plant(text_of(DESIGN, "equation-as-table.toml"), suffix=".toml")
    result = call("trim", plant, {"hold": {"theta": "60 deg", "M": "9000 N m"}})
    assert "hinge" in result["points"][0]["why"]


@pytest.mark.parametrize(
    ("changed", "where"),
    [
        ({"settings": {"s0": "m"}}, "plant.settings"),
        ({"equations": [{"is": "x' = -x", "numeric": True}]}, "plant.equations.0"),
        ({"definitions": {"k": {"is": "J/b", "numeric": True}}}, "plant.definitions.k"),
    ],
)
def test_later_parts_of_the_plant_are_refused_by_name(changed: JSON, where: str) -> None:
    """Understood, not done, and said where."""
    error = refused("linearize", {**bridge(), **changed}, AT_60)
    assert (error.code, error.where) == ("request.not-available", where)
    assert error.hint


def test_the_saturation_table_is_refused_by_name() -> None:
    """The look-up table of the language."""
    table = read_plant(text_of(DESIGN, "table-saturation.toml"), suffix=".toml")
    error = refused("check-plant", {**bridge(), **table})
    assert (error.code, error.where) == ("request.not-available", "plant.tables")


@pytest.mark.parametrize(
    "point",
    [
        {"moving": {"theta": "any"}},
        {"frozen": ["theta"]},
        {"hold": {"theta": 1}, "least": "Mc"},
        {"hold": {"theta": 1}, "most": "Mc"},
        {"every": True, "within": {"theta": [0, 1]}},
    ],
    ids="-".join,
)
def test_later_parts_of_the_point_are_refused_by_name(point: JSON) -> None:
    """Steady motion, quasi-steady points, extrema, all points."""
    error = refused("trim", bridge(), point)
    assert error.code == "request.not-available"
    assert error.where in {f"point.{name}" for name in point}


@pytest.mark.parametrize("also", ["transfer functions", "zeros", "frequency response", "held"])
def test_later_answers_of_linearize_are_refused_by_name(also: str) -> None:
    """Only the gain at rest is there yet."""
    error = refused("linearize", bridge(), AT_60, also=[also])
    assert (error.code, error.where) == ("request.not-available", "also")


@pytest.mark.parametrize(
    "equations",
    [
        ["J*theta′′ + b*theta′ + W*r*cos(theta) = M + Mw", "Tm*M’ = Mc - M"],
        ["J*theta″ + b*theta′ + W*r*cos(theta) = M + Mw", "Tm*M’ = Mc - M"],
        ["J*theta'' + b*d(theta)/dt + W*r*cos(theta) = M + Mw", "Tm*d(M)/dt = Mc - M"],
        ["(J*theta')' = M + Mw - b*theta' - W*r*cos(theta)", "(Tm*M)' = Mc - M"],
        ["0 = M + Mw - W*r*cos(theta) - b*theta' - J*theta''", "M' = (Mc - M)*Tm**(-1)"],
        [
            "swing = W*r*cos(theta)",
            "J*theta'' + b*theta' + swing = M + Mw",
            "M' = lag/Tm",
            "lag = Mc - M",
        ],
    ],
)
def test_the_ways_of_writing_a_rate_lead_to_one_model(equations: list[str]) -> None:
    """Primes of three kinds, d(x)/dt, primed brackets, implicit forms, definitions in any order."""
    entry = the_point(kept("linearize", {**bridge(), "equations": equations}, AT_60))
    assert entry["model"] == the_point(kept("linearize", bridge(), AT_60))["model"]


FUNCTIONS: dict[str, Callable[[Any], Any]] = {
    "sin(x) + cos(x) + tan(x)": lambda x: mp.sin(x) + mp.cos(x) + mp.tan(x),
    "asin(x) + arccos(x) + atan(x)": lambda x: mp.asin(x) + mp.acos(x) + mp.atan(x),
    "atan2(x, 2) + sinh(x) + cosh(x) + tanh(x)": lambda x: (
        mp.atan2(x, 2) + mp.sinh(x) + mp.cosh(x) + mp.tanh(x)
    ),
    "exp(x) + ln(x) + log(x) + log10(x)": lambda x: mp.exp(x) + 2 * mp.log(x) + mp.log10(x),
    "sqrt(x) + abs(-x) + sign(x) + min(x, 1) + max(x, 2) + clip(x, 0, 1)": lambda x: (
        mp.sqrt(x) + x + 1 + x + 2 + x
    ),
    "if(x < 1 and not (x >= 0.9), x^2, 7) + 64.94[1]*x": lambda x: x**2 + mp.mpf("64.94") * x,
    "if(x > 1 or x == 2, 7, -x**3)": lambda x: -(x**3),
    "e*x + i*x + S*x + beta*x + pi*x": lambda x: (3 + mp.pi) * x,
    "2^x^2 + x**2 - -x": lambda x: 2 ** (x**2) + x**2 + x,
}
"""Expressions of the language and what they mean, written with mpmath."""


@pytest.mark.parametrize("expression", FUNCTIONS)
def test_the_functions_of_the_language(expression: str) -> None:
    """Every function by value and slope; e, i, S, beta are ordinary names; 2^x^2 is 2^(x^2)."""
    letters = dict.fromkeys(("e", "i", "S", "beta"), 0.75)
    plant: JSON = {
        "name": "functions",
        "time": "1",
        "equations": ["x' = u - x"],
        "inputs": ["u"],
        "outputs": {"y": expression},
        "parameters": letters if "beta" in expression else {},
    }
    model = the_point(kept("linearize", plant, {"hold": {"x": "1/2"}}))["model"]
    meant = FUNCTIONS[expression]
    with mp.workdps(40):
        value, slope = float(meant(mp.mpf("0.5"))), float(mp.diff(meant, mp.mpf("0.5")))
    assert model["y0"][0] == about(value, rel=PRINTED)
    assert model["C"][0][0] == about(slope, rel=PRINTED)


def test_a_decimal_is_exact() -> None:
    """A tenth and two tenths are 3/10: no rounding shows in an exact value."""
    plant: JSON = {
        "name": "decimals",
        "equations": ["x' = a + b - x"],
        "parameters": {"a": "0.1", "b": 0.2},
    }
    entry = the_point(kept("trim", plant, {"hold": {"x": "a + b"}}))
    assert entry["values"]["x"] == {**entry["values"]["x"], "value": 0.3, "exact": "3/10"}


def test_a_state_may_be_called_like_anything() -> None:
    """e, i, d, I, S, N, lambda and zeta are states; only pi, and, or, not are reserved."""
    names = ["e", "i", "d", "I", "S", "N", "lambda", "zeta"]
    plant: JSON = {"name": "names", "equations": [f"{n}' = 1 - {n}" for n in names]}
    assert the_point(kept("linearize", plant))["model"]["states"] == names
    error = refused("trim", {"name": "names", "equations": ["and' = 1"]})
    assert error.code.startswith(("name.", "expression."))


# --- the operating point


def test_the_leaf_at_sixty_degrees() -> None:
    """M = Mc = 9100 N m; theta is known exactly as pi/3."""
    entry = the_point(kept("trim", bridge(), AT_60))
    values = entry["values"]
    assert entry["name"] == "leaf at 60 degrees"
    assert values["theta"] == {**values["theta"], "value": 1.047197551, "exact": "pi/3"}
    assert values["theta"]["known"] == "exact"
    for name in ("M", "Mc"):
        assert values[name]["value"] == 9100
        assert values[name]["unit"] == "N m"
    assert values["Mw"] == {**values["Mw"], "value": 0, "known": "exact"}


@pytest.mark.parametrize("value", ["60 deg", "pi/3", "pi/3 rad", "1/6 turn"])
def test_one_angle_in_several_words(value: str) -> None:
    """Values are numbers with units or constant expressions."""
    entry = the_point(kept("trim", bridge(), {"hold": {"theta": value}}))
    assert entry["values"]["theta"]["exact"] == "pi/3"
    assert entry["values"]["M"]["value"] == 9100


@pytest.mark.parametrize(
    "hold",
    [
        {"is": "W*r/M", "equals": 2},
        [{"is": "W*r/M", "equals": 2}],
        {"any label": {"is": "W*r/M", "equals": 2}},
    ],
)
def test_an_expression_may_be_held(hold: object) -> None:
    """W r/M = 2 means cos(theta) = 1/2: two angles, and the other one is told."""
    result = kept("trim", bridge(), {"hold": hold, "guess": {"theta": "50 deg"}})
    entry = the_point(result)
    assert entry["values"]["theta"]["value"] == 1.047197551
    assert entry["values"]["theta"]["known"] == "computed twice"
    assert entry["values"]["M"]["value"] == 9100
    unguided = kept("trim", bridge(), {"hold": hold})
    assert "other-points" in codes(unguided)
    assert abs(the_point(unguided)["values"]["theta"]["value"]) == 1.047197551


def test_conditions_that_agree_are_redundant_and_listed() -> None:
    """The ratio follows from the angle: fine, and said."""
    hold = [{"theta": "60 deg"}, {"is": "W*r/M", "equals": 2}]
    result = kept("trim", bridge(), {"hold": hold})
    assert the_point(result)["redundant"] == ["hold W*r/M"]
    assert "redundant" in codes(result)
    assert the_point(result)["values"]["M"]["value"] == 9100


def test_conditions_that_conflict_are_no_point() -> None:
    """At 60 degrees the torque is 9100 N m: holding 9000 contradicts the hinge equation."""
    result = kept("trim", bridge(), {"hold": {"theta": "60 deg", "M": "9 kN m"}})
    assert result["outcome"] == "no-point"
    (entry,) = result["points"]
    assert entry["reason"] == "conflict"
    assert {"hold theta", "hold M"} <= set(entry["blocking"])
    assert "equation 2" not in entry["blocking"]
    assert "values" not in entry


def test_what_is_undetermined_is_named_with_a_way_out() -> None:
    """Nothing held: the leaf may rest at any angle; one of the named quantities settles it."""
    result = kept("trim", bridge(), {})
    (entry,) = result["points"]
    assert (entry["outcome"], entry["reason"]) == ("no-point", "undetermined")
    assert set(entry["undetermined"]) == {"theta", "M", "Mc"}
    assert "hold one of them" in entry["why"]
    for name, value in (("theta", 1), ("M", 9100), ("Mc", 9100)):
        assert kept("trim", bridge(), {"hold": {name: value}})["outcome"] == "done", name


def test_a_disturbance_rests_unless_held_or_found() -> None:
    """Mw = 0 at rest; held it counts; found it takes the place of another condition."""
    held = the_point(kept("trim", bridge(), {"hold": {"theta": "60 deg", "Mw": "100 N m"}}))
    assert held["values"]["M"]["value"] == 9000
    asked = {"hold": {"theta": "60 deg", "M": "9 kN m"}, "find": ["Mw"]}
    found = the_point(kept("trim", bridge(), asked))
    assert found["values"]["Mw"]["value"] == 100


def test_a_configuration_may_set_parameters() -> None:
    """`set` in the point: half the weight, half the torque."""
    asked = {"hold": {"theta": "60 deg"}, "set": {"W": "26 kN"}}
    assert the_point(kept("trim", bridge(), asked))["values"]["M"]["value"] == 4550


def test_margins_to_declared_limits() -> None:
    """Upper then lower, in the declared unit; beyond a limit a caution, not a refusal."""
    entry = the_point(kept("trim", bridge(), AT_60))
    assert [(m["side"], m["limit"], m["margin"], m["unit"]) for m in entry["margins"]] == [
        ("upper", 20000, 10900, "N m"),
        ("lower", 0, 9100, "N m"),
    ]
    over = kept("trim", bridge(), {"hold": {"theta": "120 deg"}})
    assert the_point(over)["margins"][1]["margin"] == -9100
    assert "outside-limits" in codes(over)


def test_every_key_of_a_point_at_once() -> None:
    """hold, find, guess, within and set together are understood."""
    asked = {
        "name": "gust",
        "hold": {"is": "W*r*cos(theta)", "equals": "9.1 kN m"},
        "find": "Mw",
        "guess": {"theta": "50 deg", "Mw": 0},
        "within": {"theta": [0, "90 deg"]},
        "set": {"b": "2000 N m s"},
    }
    result = kept("trim", bridge(), [asked])
    # one condition, three unknown torques: the quantities left open are named
    (entry,) = result["points"]
    assert entry["reason"] == "undetermined"
    assert "theta" not in entry["undetermined"]


# --- the result


def subset(found: object, expected: object, place: str = "") -> None:
    """Everything of `expected` stands in `found`, lists of equal length."""
    if isinstance(expected, dict):
        assert isinstance(found, dict), place
        for key, value in expected.items():
            assert key in found, f"{place}/{key}"
            subset(found[key], value, f"{place}/{key}")
    elif isinstance(expected, list):
        assert isinstance(found, list), place
        assert len(found) == len(expected), place
        for k, (one, other) in enumerate(zip(found, expected, strict=True)):
            subset(one, other, f"{place}/{k}")
    else:
        assert found == expected, place


def test_the_result_is_the_one_of_the_contract() -> None:
    """Matrices, values, margins, eigenvalues: character for character what is promised."""
    result = kept("linearize", bridge(), AT_60)
    subset(result, json.loads(text_of(DESIGN, "result.json")))
    assert {"tool_version", "answer", "validity", "checks", "cautions"} <= result.keys()
    assert set(result["validity"]) == {"amplitude", "duration", "parameters", "not_checked"}
    assert result["validity"]["parameters"]["b"] == {"tolerance": "20 %"}
    assert all(
        check.keys() >= {"code", "what", "value", "limit", "holds"} for check in result["checks"]
    )
    assert all(caution.keys() == {"code", "about", "text"} for caution in result["cautions"])


def test_the_result_agrees_with_the_equations_read_anew() -> None:
    """A second parser and differences at 80 digits."""
    model = OwnPlant(bridge()).model(
        {"theta": 1, "theta'": 0, "M": 9000, "Mc": 9000, "Mw": 0}, {"theta": "60 deg", "Mw": 0}
    )
    entry = the_point(kept("linearize", bridge(), AT_60))
    for matrix in "ABCD":
        assert not differences(entry["model"][matrix], getattr(model, matrix)), matrix
    values = [complex(e["re"], e["im"]) for e in entry["stability"]["eigenvalues"]]
    assert same_spectrum(values, [complex(v) for v in model.eigenvalues])
    assert model.A[1][0] == about(52e3 * 0.35 * math.sin(math.pi / 3) / 2.4e5)


def test_the_built_in_example_is_the_documented_plant() -> None:
    """What the tool descriptions show is the plant of the TOML fixture."""
    mine = the_point(kept("linearize", bridge(), AT_60))
    shown = the_point(kept("linearize", BRIDGE, {"name": "leaf at 60 degrees", **AT_60}))
    assert mine == shown


# --- the command line


def run(*arguments: str) -> int:
    """The exit status of a command."""
    with pytest.raises(SystemExit) as left:
        main(arguments)
    assert isinstance(left.value.code, int)
    return left.value.code


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The current folder, with the fixtures."""
    monkeypatch.chdir(tmp_path)
    for path in DESIGN.iterdir():
        shutil.copy(path, tmp_path / path.name)
    return tmp_path


def send(monkeypatch: pytest.MonkeyPatch, arguments: JSON) -> None:
    """Put JSON on the command's standard input."""
    content = io.BytesIO(json.dumps(arguments).encode())
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(content))


def printed(capsys: pytest.CaptureFixture[str]) -> JSON:
    """What a command printed, as JSON."""
    return json.loads(capsys.readouterr().out)


@pytest.mark.usefixtures("folder")
def test_a_plant_is_referred_to_by_the_id_of_an_earlier_reply(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """{"ref": id, "set": {"J": "2.6e5 kg m^2"}} with the same report folder."""
    send(monkeypatch, {"plant": "lift-bridge.toml"})
    assert run("call", "check-plant", "-", "--json", "--reports", "kept") == 0
    known = printed(capsys)["plant"]["id"]
    heavier = {"ref": known, "set": {"J": "2.6e5 kg m^2"}}
    send(monkeypatch, {"plant": heavier, "point": AT_60})
    assert run("call", "linearize", "-", "--json", "--reports", "kept") == 0
    A = the_point(printed(capsys))["model"]["A"]
    assert A[1][0] == about(52e3 * 0.35 * math.sin(math.pi / 3) / 2.6e5, rel=1e-9)
    send(monkeypatch, {"plant": heavier, "point": AT_60})
    assert run("call", "linearize", "-", "--json", "--reports", "elsewhere") == 1
    error = printed(capsys)["error"]
    assert error["code"] == "request.reference"
    assert set(error) == {"code", "where", "message", "hint"}


def test_the_envelopes_of_run_and_audit(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A sheet with a grid and expectations, then the audit of its reports: the promised keys."""
    assert run("run", "sheet.toml", "--json", "--reports", "kept", "--jobs", "1") == 0
    listed = printed(capsys)["calls"]
    assert len(listed) == 5
    keys = {"name", "tool", "plant", "outcome", "answer", "failures", "report"}
    assert all(set(one) == keys for one in listed)
    assert {one["outcome"] for one in listed} == {"holds"}
    assert listed[0]["tool"] == "linearize"
    assert listed[0]["plant"] == "Lift bridge leaf"
    assert run("audit", "kept", "--json", "--jobs", "1") == 0
    audits = printed(capsys)["reports"]
    assert len(audits) == len(list((folder / "kept").glob("*.md"))) == 5
    assert all(set(one) == {"path", "outcome", "differences"} for one in audits)
    assert {one["outcome"] for one in audits} <= {"reproduced", "same digits"}
    report = next((folder / "kept").glob("*linearize*.md"))
    report.write_text(report.read_text("utf-8").replace('"value": 9100', '"value": 9200'), "utf-8")
    assert run("audit", str(report), "--json") == 1
    (changed,) = printed(capsys)["reports"]
    assert changed["outcome"] == "differs"
    assert all(set(one) == {"where", "stated", "found"} for one in changed["differences"])
    assert any(one["stated"] == 9200 for one in changed["differences"])


def test_an_expectation_that_fails_is_status_one(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """A wrong expectation names the pointer, what was stated and what was found."""
    sheet = (folder / "sheet.toml").read_text("utf-8")
    (folder / "sheet.toml").write_text(sheet.replace("= 9100", "= 9101"), "utf-8")
    assert run("run", "sheet.toml", "--json", "--reports", "kept", "--jobs", "2") == 1
    listed = printed(capsys)["calls"]
    assert listed[0]["outcome"] == "failed"
    assert "/points/0/values/M/value" in json.dumps(listed[0]["failures"])
    assert [one["outcome"] for one in listed[1:]] == ["holds"] * 4


@pytest.mark.usefixtures("folder")
def test_a_refused_part_of_the_language_is_status_one(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """A call that was read but refused leaves with 1, its error as JSON on standard output."""
    table = read_plant(text_of(DESIGN, "table-saturation.toml"), suffix=".toml")
    send(monkeypatch, {"plant": {**bridge(), **table}, "point": AT_60})
    status = run("call", "linearize", "-", "--json", "--reports", "kept")
    assert printed(capsys)["error"]["code"] == "request.not-available"
    assert status == 1
