"""Edges where a wrong number would look right: rates, levels, false roots, guards, kinds."""

from __future__ import annotations

from typing import Any

import pytest
from flint import fmpq

from published.calling import JSON, call
from tangentbook.analysis.conditions import PointText, understand_point
from tangentbook.contract.plant import Plant
from tangentbook.errors import TangentbookError
from tangentbook.plant import build_plant
from tangentbook.tools.convert import plant_text


def plant(*equations: str, **more: Any) -> JSON:  # noqa: ANN401 - fields of a plant
    """A plant of these equations."""
    return {"name": "edge", "equations": list(equations), **more}


@pytest.mark.parametrize("time", ["s", "h"])
def test_a_rate_as_output_has_the_unit_of_its_state(time: str) -> None:
    """Without outputs every state is one: C is the unit matrix whatever the units are."""
    raw = plant("x'' = -x + u", states={"x": "mm"}, inputs={"u": "m"}, time=time)
    result = call("linearize", raw, {"hold": {"u": 1}})
    model = result["points"][0]["model"]
    assert model["C"] == [[1, 0], [0, 1]]
    assert model["B"] == [[0], [1000]]
    assert all(c["holds"] for c in result["checks"])


def test_a_level_rests_at_its_own_zero() -> None:
    """0 without a value means 0 degC where degC is declared, not 0 K."""
    raw = plant(
        "T' = (Ta - T)/tau",
        states={"T": "degC"},
        inputs={"Ta": {"unit": "degC", "role": "disturbance"}},
        parameters={"tau": "30 s"},
    )
    values = call("trim", raw, {})["points"][0]["values"]
    assert [values[name]["value"] for name in ("T", "Ta")] == [0, 0]


def test_a_free_level_is_assumed_at_its_own_zero() -> None:
    """The same for a coordinate that no rate depends on."""
    raw = plant("T' = Q*k", states={"T": "degC"}, inputs={"Q": "W"}, parameters={"k": "1 K/J"})
    value = call("trim", raw, {})["points"][0]["values"]["T"]
    assert value == {"value": 0, "unit": "degC", "known": "assumed"}


def test_a_flat_spot_is_no_root() -> None:
    """x^3 = 1e-30 has the one root 1e-10; 0 meets it to 1e-30 and is none."""
    point = call("trim", plant("x' = x^3 - 1e-30"), {})["points"][0]
    assert point["outcome"] != "done" or point["values"]["x"]["value"] == 1e-10


@pytest.mark.parametrize("equations", [["x' = exp(-x)"], ["x' = z", "0 = exp(x) - z"]])
def test_a_root_at_infinity_is_not_found(equations: list[str]) -> None:
    """exp(x) = 0 has no solution, however small it becomes."""
    more = {"algebraic": ["z"]} if len(equations) == 2 else {}
    point = call("trim", plant(*equations, **more), {})["points"][0]
    assert point["outcome"] == "no-point"
    assert point["reason"] == "not found"


def test_decimals_that_nearly_agree_do_not() -> None:
    """Exact rationals conflict although double precision cannot tell them apart."""
    raw = plant("x' = -x + u", "y' = -y + x", inputs=["u"])
    hold = {"u": 1, "x": "1.0000000000000000000000001"}
    point = call("trim", raw, {"hold": hold})["points"][0]
    assert (point["outcome"], point["reason"]) == ("no-point", "conflict")


GUARDED = {
    "x' = -x + if(u > 1e-3, 1/u, 0)": 0,
    "x' = -x + if(abs(u) < 1e-6, 1 - u^2/6, sin(u)/u)": 0,
    "x' = -x + if(u > 1e-3, atan2(0*x, u), u)": 1,
    "x' = -x + if(u > 1, 1/(u*0*x), u)": 1,
}


@pytest.mark.parametrize(("equation", "slope"), GUARDED.items())
@pytest.mark.parametrize("tool", ["trim", "linearize"])
def test_a_branch_that_is_not_in_force_does_no_harm(tool: str, equation: str, slope: int) -> None:
    """A guarded division has no value in the other branch, and need not have one."""
    result = call(tool, plant(equation, inputs=["u"]), {"hold": {"u": 0}})
    point = result["points"][0]
    assert point["outcome"] == "done"
    if tool == "linearize":
        assert point["model"]["A"] == [[-1]]
        assert point["model"]["B"] == [[slope]]
        assert all(c["holds"] for c in result["checks"])


def test_a_jump_to_an_isolated_value_is_no_set_of_rest_points() -> None:
    """Only where zero lies between the sides does a jump make a set of rest points."""
    isolated = call(
        "linearize", plant("x' = -x + if(u == 1, 5*u, u)", inputs=["u"]), {"hold": {"u": 1}}
    )
    assert isolated["points"][0]["model"] is None
    assert "set of rest points" not in isolated["answer"]
    friction = call("linearize", plant("v' = F - v - sign(v)", inputs=["F"]), {"hold": {"v": 0}})
    assert friction["points"][0]["model"] is None
    assert "set of rest points" in friction["answer"]


WRONG_KIND = {
    "1500 rpm": "2*pi",
    "50 Hz": "2*pi",
    "3 m": "rad/s",
}


@pytest.mark.parametrize(("value", "hint"), WRONG_KIND.items())
def test_a_value_of_another_kind_is_refused(value: str, hint: str) -> None:
    """A value is of the kind of its name's unit; cycles are told apart from radians."""
    raw = plant("w' = M - w", states={"w": "rad/s"}, inputs={"M": "rad/s^2"})
    with pytest.raises(TangentbookError) as caught:
        call("trim", raw, {"hold": {"w": value}})
    assert caught.value.code == "unit.dimension"
    assert hint in caught.value.hint


def test_an_override_of_another_kind_is_refused() -> None:
    """The same for `set`."""
    raw = plant("m*v' = F", states={"v": "m/s"}, inputs={"F": "N"}, parameters={"m": "180 t"})
    with pytest.raises(TangentbookError) as caught:
        call("trim", raw, {"hold": {"v": 0}, "set": {"m": "200 s"}})
    assert caught.value.code == "unit.dimension"


def test_a_parameter_cannot_be_held() -> None:
    """Its value is given; `set` overrides it."""
    with pytest.raises(TangentbookError) as caught:
        call("trim", plant("x' = -k*x + 1", parameters={"k": 2}), {"hold": {"k": 2}})
    assert caught.value.code == "point.name"
    assert "set" in caught.value.hint


def test_the_gain_of_a_slow_plant_is_given() -> None:
    """A regular A is inverted however slow it is: the gain is 1e14."""
    raw = plant("x' = -1e-14*x + y", "y' = -y + u", inputs=["u"])
    result = call("linearize", raw, {"hold": {"u": 1}}, also=["dc gain"])
    assert result["points"][0]["model"]["dc_gain"] == [[1e14], [1]]


@pytest.mark.parametrize(
    ("time", "value", "expected"),
    [("s", "0.5 rad/s", fmpq(1, 2)), ("min", "0.5 rad/s", fmpq(30)), ("min", 30, fmpq(30))],
)
def test_a_rate_is_read_in_the_time_of_the_equations(
    time: str, value: str | int, expected: fmpq
) -> None:
    """Where no unit contains time, rates are per `time`; a value with a unit is brought to that."""
    raw = plant("a'' = -a' + T", states={"a": "rad"}, inputs=["T"], time=time)
    understood = build_plant(plant_text(Plant.model_validate(raw)))
    asked = understand_point(understood, PointText(hold=(("a'", value), ("T", 0))))
    (row,) = (row for row in asked.rows if row.hold == 0)
    graph = understood.graph
    assert graph.value_of(graph.children(row.residual)[1]) == expected
