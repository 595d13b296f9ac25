"""Operating points that are hard to find, to tell, or not there."""

from __future__ import annotations

import math

import pytest

from published.calling import JSON, call, caution_text, check, codes
from published.matching import about


def plant(*equations: str, **more: object) -> JSON:
    """A plant in pure numbers."""
    return {"name": "point", "time": "1", "equations": list(equations), **more}


def entry(raw: JSON, point: JSON | None = None) -> JSON:
    """The one entry of a trim call."""
    (found,) = call("trim", raw, point or {})["points"]
    return found


# --- sizes side by side


SIZES = plant(
    "a' = 1e-9 - a",
    "b' = 1e9 + 1e18*a - 2*b",
    "c' = a*b - 3*c",
)


def test_states_of_1e_minus_9_and_1e9_side_by_side() -> None:
    """With typical sizes: every digit of both, nothing else claimed, every check holds."""
    typical = {"a": {"typical": 1e-9}, "b": {"typical": 1e9}, "c": {}}
    result = call("linearize", {**SIZES, "states": typical})
    values = {n: v["value"] for n, v in result["points"][0]["values"].items()}
    assert values == {"a": 1e-9, "b": 1e9, "c": 0.3333333333}
    assert result["points"][0]["model"]["A"] == [[-1, 0, 0], [1e18, -2, 0], [1e9, 1e-9, -3]]
    assert all(c["holds"] for c in result["checks"])
    assert not codes(result) & {"other-points", "check-failed"}


def test_no_points_are_invented_where_typical_sizes_are_missing() -> None:
    """The equations have exactly one solution; a caution must not tell of others."""
    result = call("trim", SIZES)
    assert result["points"][0]["values"]["a"]["value"] == 1e-9
    assert "other-points" not in codes(result)
    assert "check-failed" not in codes(result)


@pytest.mark.parametrize("exponent", [-12, -6, 0, 6, 12])
def test_one_equation_at_any_size(exponent: int) -> None:
    """X' = a - x - x^2/a has the positive root a (sqrt(5) - 1)/2 at every size a."""
    size = f"1e{exponent}"
    raw = plant(
        "x' = a - x - x^2/a", parameters={"a": size}, states={"x": {"typical": float(size)}}
    )
    root = (math.sqrt(5) - 1) / 2 * float(size)
    found = entry(raw, {"guess": {"x": root * 1.1}})
    assert found["values"]["x"]["value"] == about(root, rel=6e-10)


# --- double roots and folds


DOUBLE = {
    "rational": ("x' = (x-1)^2", 1.0),
    "irrational": ("x' = x^2 - 2*sqrt(2)*x + 2", math.sqrt(2)),
    "transcendental": ("x' = exp(x) - exp(1)*x", 1.0),
    "triple": ("x' = (x-1)^3", 1.0),
}


@pytest.mark.parametrize("which", DOUBLE)
def test_a_multiple_root_is_found_to_all_printed_digits(which: str) -> None:
    """Half the digits are lost by a plain iteration; ten of them stand here."""
    text, root = DOUBLE[which]
    found = entry(plant(text), {"guess": {"x": root * 1.2}})
    assert found["values"]["x"]["value"] == about(root, rel=6e-10)


@pytest.mark.parametrize("which", DOUBLE)
def test_a_multiple_root_is_told(which: str) -> None:
    """Small changes of the plant make the point vanish: the reader must know."""
    text, root = DOUBLE[which]
    result = call("trim", plant(text), {"guess": {"x": root * 1.2}})
    assert codes(result) & {"singular-point", "ill-conditioned"}


def test_a_double_root_at_zero_is_told() -> None:
    """X' = u - x^2 at u = 0."""
    result = call("trim", plant("x' = u - x^2", inputs=["u"]), {"hold": {"u": 0}})
    assert "singular-point" in codes(result)


def test_the_model_at_a_double_root_is_confirmed() -> None:
    """X' = (x-1)^2 at 1: A = 0 within 1e-20, which the second routes confirm."""
    result = call("linearize", plant("x' = (x-1)^2"), {"guess": {"x": 1.2}})
    assert result["points"][0]["model"]["A"] == [[0]]
    assert check(result, "jacobian.second-route")["holds"]
    assert "NOT" not in result["answer"]


def test_a_zero_that_is_only_bounded_makes_no_growing_eigenvalue() -> None:
    """X'' = u - cos(x) at pi: A = [[0, 1], [sin(pi), 0]], a double zero, no side may be claimed."""
    raw = plant("x'' = u - cos(x)", inputs=["u"])
    result = call("linearize", raw, {"hold": {"x": "pi"}})
    assert result["points"][0]["model"]["A"] == [[0, 1], [0, 0]]
    assert "eigenvalue-right" not in codes(result)


def test_a_weakly_damped_pair_is_not_called_undecidable() -> None:
    """Real part -5e-11 beside sqrt(2): known to 40 digits, so its side is known."""
    raw = plant("x'' + 1e-10*x' + 2*x = 0")
    result = call("linearize", raw)
    assert {e["re"] for e in result["points"][0]["stability"]["eigenvalues"]} == {-5e-11}
    assert "eigenvalue-near-axis" not in codes(result)


@pytest.mark.parametrize("beyond", ["1e-3", "1", "1e6"])
def test_beyond_a_fold_no_point_is_found_and_none_is_denied(beyond: str) -> None:
    """x^2 + r = 0 has no real solution; the program says what it saw, never that none exists."""
    result = call("trim", plant("x' = x^2 + r", parameters={"r": beyond}))
    (found,) = result["points"]
    assert found["outcome"] == "no-point"
    assert found["reason"] == "not found"
    assert "that none exists is not shown" in found["why"]
    assert abs(found["closest"]["x"]["value"]) < 10
    assert "equation 1" in found["why"]


@pytest.mark.parametrize("distance", ["1e-4", "1e-8", "1e-12"])
def test_just_before_a_fold_both_points_are_told(distance: str) -> None:
    """x^2 = r: one root is answered, the other told, to all digits."""
    result = call("trim", plant("x' = x^2 - r", parameters={"r": distance}))
    value = result["points"][0]["values"]["x"]["value"]
    assert abs(value) == about(math.sqrt(float(distance)), rel=6e-10)
    assert "other-points" in codes(result)


@pytest.mark.parametrize("text", ["x' = x^2 - 1", "x' = x^2 + 1"])
def test_a_guess_at_a_stationary_point_is_no_contradiction(text: str) -> None:
    """Nothing is held, so no hold can be dropped; for x^2 - 1 the points -1 and 1 exist."""
    found = entry(plant(text), {"guess": {"x": 0}})
    assert found.get("reason") != "conflict"


def test_a_search_that_overflows_is_an_answer() -> None:
    """The three equations have no common solution; that is `not found`, not an error."""
    raw = plant(
        "2*x'' + sin(x)*x' + exp(x)*z = u",
        "z' = (x - z*w)/(1 + z^2)",
        "0 = w^3 + w - x + u/2",
        algebraic=["w"],
        inputs=["u"],
    )
    found = entry(raw, {"hold": {"u": "0.7"}, "guess": {"x": 0.4, "z": 0.5, "w": 0.1}})
    assert found["reason"] == "not found"


# --- rank and consistency


TWO = plant("x' = u - v", "y' = u - y", inputs=["u", "v"])


def test_undetermined_quantities_are_named_and_the_way_out_works() -> None:
    """X may be anything (assumed); of y, u, v one must be held, and any one will do."""
    found = entry(TWO)
    assert found["reason"] == "undetermined"
    assert set(found["undetermined"]) == {"y", "u", "v"}
    assert "hold one of them" in found["why"]
    for name in found["undetermined"]:
        settled = entry(TWO, {"hold": {name: 2}})
        assert {settled["values"][n]["value"] for n in "yuv"} == {2}
        assert settled["values"]["x"]["known"] == "assumed"


def test_an_assumed_coordinate_takes_its_guess_and_stays_in_the_model() -> None:
    """A coordinate on which no rate depends: guess, else 0, and a column of zeros."""
    result = call("linearize", TWO, {"hold": {"y": 2}, "guess": {"x": 5}})
    (found,) = result["points"]
    assert found["values"]["x"] == {**found["values"]["x"], "value": 5, "known": "assumed"}
    assert found["model"]["states"] == ["x", "y"]
    assert [row[0] for row in found["model"]["A"]] == [0, 0]
    assert "no condition depends on x" in caution_text(result, "assumed")


@pytest.mark.parametrize(
    ("hold", "redundant"),
    [
        ([{"y": 2}, {"u": 2}], ["hold u"]),
        ([{"y": 2}, {"y": 2}], ["hold y"]),
        ([{"y": 2}, {"u": 2}, {"v": 2}], ["hold u", "hold v"]),
        ([{"y": 2}, {"is": "u + v", "equals": 4}], ["hold u + v"]),
    ],
)
def test_conditions_that_agree_are_listed(hold: list[JSON], redundant: list[str]) -> None:
    """Redundant conditions are fine, in the order they add nothing."""
    found = entry(TWO, {"hold": hold})
    assert found["outcome"] == "done"
    assert found["redundant"] == redundant


@pytest.mark.parametrize(
    ("hold", "blocking"),
    [
        ([{"y": 2}, {"u": 3}], {"hold y", "hold u"}),
        ([{"y": 2}, {"y": 3}], {"hold y"}),
        ([{"u": 2}, {"v": 3}], {"hold u", "hold v"}),
        ([{"y": 2}, {"is": "u^2", "equals": 9}], {"hold y", "hold u^2"}),
    ],
)
def test_conditions_that_conflict_are_named(hold: list[JSON], blocking: set[str]) -> None:
    """What blocks is named, what does not is not."""
    found = entry(TWO, {"hold": hold})
    assert found["outcome"] == "no-point"
    assert found["reason"] == "conflict"
    assert blocking <= set(found["blocking"])
    assert "hold v" not in set(found["blocking"]) - blocking
    assert found["closest"]


def test_a_hold_that_a_rate_forbids_is_a_conflict() -> None:
    """X' of a state is 0 at rest: holding it at 1 contradicts the rest."""
    found = entry(plant("x'' = -x"), {"hold": {"x'": 1}})
    assert found["reason"] == "conflict"
    assert "hold x'" in found["blocking"]


def test_explicit_time_has_no_rest() -> None:
    """sin(t) never rests."""
    result = call("trim", plant("x' = sin(t) - x"))
    assert result["points"][0]["reason"] == "depends on time"
    assert "explicit-time" in codes(result)


def test_outside_every_domain_the_culprit_is_named() -> None:
    """Log of a negative number everywhere."""
    found = entry(plant("x' = log(-1 - x^2)"))
    assert found["reason"] == "outside domain"
    assert "log" in found["why"]


def test_dry_friction_at_rest_is_a_set_of_points_without_a_model() -> None:
    """sign(v) at 0: the point is a rest point, the model is none, the reason says so."""
    raw = plant("v' = u - sign(v)", inputs=["u"])
    (found,) = call("linearize", raw, {"hold": {"v": 0, "u": "0.3"}})["points"]
    if found["outcome"] == "done":
        assert found["model"] is None
        assert "set of rest points" in found["no_model"]["reason"]
    else:
        assert found["reason"] in ("conflict", "not found")
    (found,) = call("linearize", raw, {"hold": {"v": 0, "u": 0}})["points"]
    assert found["model"] is None
    assert found["no_model"]["names"] == ["v"]


def test_quadratic_drag_at_rest_has_a_model_and_a_kink_has_none() -> None:
    """v|v| has slope 0 on both sides of 0; |v| has two slopes."""
    smooth = call("linearize", plant("v' = u - v*abs(v)", inputs=["u"]), {"hold": {"u": 0, "v": 0}})
    assert smooth["points"][0]["model"]["A"] == [[0]]
    assert "switch-at-point" in codes(smooth)
    kink = call("linearize", plant("v' = u - abs(v)", inputs=["u"]), {"hold": {"v": 0}})
    assert kink["points"][0]["model"] is None
    assert "two sides" in kink["points"][0]["no_model"]["reason"]
