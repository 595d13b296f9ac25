"""What a careless tool gets wrong in the published cases (`watch_for` in each case file)."""

from __future__ import annotations

import math
import re
from typing import TYPE_CHECKING

import pytest

from published import adapter
from published.calling import JSON, call, caution_text, codes, eigenvalues, kept
from published.matching import about, distance

if TYPE_CHECKING:
    from collections.abc import Mapping

SEVERAL: dict[str, tuple[str, ...]] = {
    # what of the other points must be told where no guess was given
    "bead-hoop": ("phi = 0.821328", "phi = -0.821328"),
    "cstr-three-states": ("T = 368.063",),
    "duffing": ("x = 1", "x = -1"),
    "lorenz": ("x = -8.48528", "x = 8.48528"),
    "maglev": ("i = -7",),
    "van-de-vusse": ("Ca = -11.4286",),
}


def _unguided(name: str) -> JSON:
    hold = adapter.held(name)
    return kept("trim", adapter.plant(name), {"hold": hold} if hold else {})


@pytest.mark.parametrize("name", [*SEVERAL, "pend-damped", "smib-classical", "smib-dae"])
def test_where_several_points_exist_the_reader_is_told(name: str) -> None:
    """One point is answered, others are told, and that these are all is not claimed."""
    result = _unguided(name)
    assert len(result["points"]) == 1
    text = caution_text(result, "other-points")
    assert "that these are all is not shown" in text
    assert "not shown to be the only such point" in result["answer"]
    assert result["complete"] is None
    for other in SEVERAL.get(name, ()):
        assert re.search(rf"{re.escape(other)}(?!\.?\d)", text), other


def test_the_second_point_of_lotka_volterra_is_told() -> None:
    """Two equilibria exist; a request without a guess gives one of them."""
    assert "other-points" in codes(_unguided("lotka-volterra"))


@pytest.mark.parametrize("name", [n for n in adapter.LABELS if n != "van-der-pol"])
def test_every_published_point_is_reached_by_a_rough_guess(name: str) -> None:
    """Points to two digits lead to different points, each the published one."""
    count = len(adapter.linearizations(name))
    found: set[tuple[float, ...]] = set()
    for index in range(count):
        entry = adapter.entry(name, index)
        changed = adapter.linearizations(name)[index]["parameters_changed"]
        values = tuple(v["value"] for v in entry["values"].values())
        found.add((*values, *map(float, changed.values())))
    assert len(found) == count


def test_one_call_answers_all_published_points() -> None:
    """The three steady states of the reactor in one call, in the order asked for."""
    published = adapter.linearizations("cstr-three-states")
    points = [adapter.point("cstr-three-states", one) for one in published]
    result = call("linearize", adapter.plant("cstr-three-states"), points)
    assert [p["id"] for p in result["points"]] == ["p1", "p2", "p3"]
    for entry, one in zip(result["points"], published, strict=True):
        assert entry["values"]["T"]["value"] == about(float(one["point"]["T"]), rel=1e-9)
    right = [max(v.real for v in eigenvalues(p)) > 0 for p in result["points"]]
    assert right == [False, True, False]


def test_the_reactor_uses_the_books_298_kelvin() -> None:
    """298.15 K instead of the book's 298 K would move the published digits visibly."""
    published = adapter.linearizations("cstr-three-states")[1]
    asked = adapter.point("cstr-three-states", published)
    moved = {**asked, "set": {"Tf": 298.15}, "hold": {"Tj": 298.15}}
    (entry,) = kept("linearize", adapter.plant("cstr-three-states"), moved)["points"]
    assert abs(entry["values"]["T"]["value"] - 339.09712374756) > 0.05
    assert adapter.entry("cstr-three-states", 1)["values"]["Tj"]["value"] == 298


def test_an_algebraic_unknown_is_eliminated_not_frozen() -> None:
    """D is not zero, the synchronising coefficient is the one of the whole network."""
    entry = adapter.entry("smib-dae")
    assert entry["model"]["D"] == [[0, 0.664140847], [0, 0.1645022177]]
    frozen = 1.1230051771612314 * 1.0 / 0.3 * math.cos(0.8713144781836787 - 0.6285094499624666)
    assert abs(-7 * entry["model"]["A"][0][1] - 0.757) < 0.0015
    assert abs(frozen - 0.757) > 2  # what a frozen terminal voltage would give


def test_the_collapsed_voltage_is_not_returned() -> None:
    """V = 0 meets the network equations too, but V = 1 was asked for."""
    entry = adapter.entry("smib-dae")
    assert entry["values"]["V"]["value"] == 1
    assert entry["values"]["V"]["known"] == "exact"
    assert entry["values"]["E"]["value"] == about(1.1230051771612314, rel=1e-9)
    for other in _unguided("smib-dae")["points"]:
        assert other["values"]["V"]["value"] == 1


def test_upright_is_pi() -> None:
    """The upright pendulum is at pi, not at 180 and not at 0."""
    for name, quantity in (
        ("pend-damped", "theta"),
        ("cart-pendulum", "theta"),
        ("bead-hoop", "phi"),
    ):
        index = {"pend-damped": 1, "cart-pendulum": 0, "bead-hoop": 3}[name]
        assert adapter.entry(name, index)["values"][quantity]["value"] == 3.141592654
    assert adapter.entry("cart-pendulum")["values"]["theta"]["exact"] == "pi"
    # hanging would have the signs the other way round
    assert adapter.entry("cart-pendulum")["model"]["A"][3][2] > 0


def test_an_angle_in_degrees_is_the_same_point() -> None:
    """180 deg with the angle declared in degrees: same eigenvalues, entries scaled."""
    plant = adapter.plant("pend-damped")
    degrees = {
        **plant,
        "states": {"theta": "deg"},
        "outputs": {"y": {"is": "theta", "unit": "deg"}},
    }
    (entry,) = call("linearize", degrees, {"hold": {"theta": "180 deg", "T": 0}})["points"]
    assert entry["values"]["theta"]["value"] == 180
    reference = adapter.entry("pend-damped", 1)
    assert eigenvalues(entry) == eigenvalues(reference)
    assert entry["model"]["A"] == reference["model"]["A"]
    assert entry["model"]["B"][1][0] == about(180 / math.pi, rel=1e-9)


def test_a_defective_double_eigenvalue_keeps_its_digits() -> None:
    """At mu = 2 it is (s - 1)^2. Half the digits are easily lost; here all ten stand."""
    (found,) = adapter.labelled("van-der-pol", "mu2")["points"][0]["stability"]["eigenvalues"]
    assert found["re"] == 1
    assert found["im"] == 0
    assert found["count"] == 2
    assert found["radius"] < 1e-10


CENTRES: Mapping[str, tuple[str, float]] = {
    "lotka-volterra": ("coexistence", math.sqrt(0.4)),
    "pend-undamped": ("", math.sqrt(9.81)),
    "smib-classical": ("KD0", 6.3861249320843705629),
    "van-der-pol": ("mu0", 1.0),
}


@pytest.mark.parametrize("name", CENTRES)
def test_the_eigenvalues_of_a_centre_have_real_part_zero(name: str) -> None:
    """Exactly 0 printed, not +-1e-17, and the caution says what the linear model cannot decide."""
    label, frequency = CENTRES[name]
    result = adapter.labelled(name, label) if label else adapter.result(name)
    values = result["points"][0]["stability"]["eigenvalues"]
    assert [e["re"] for e in values] == [0, 0]
    assert all(isinstance(e["re"], int) for e in values)
    gaps = distance(eigenvalues(result["points"][0]), [1j * frequency, -1j * frequency])
    assert all(gap < 1e-8 for gap, _ in gaps)
    assert "eigenvalue-near-axis" in codes(result)
    assert "eigenvalue-right" not in codes(result)
    assert "cannot decide stability" in caution_text(result, "eigenvalue-near-axis")


def test_a_small_positive_real_part_is_seen() -> None:
    """The convecting points of Lorenz' equations are unstable by a real part of only 0.094."""
    result = adapter.labelled("lorenz", "Cplus")
    assert "2 eigenvalues with positive real part" in caution_text(result, "eigenvalue-right")
    assert "0.0939556" in caution_text(result, "eigenvalue-right")


def test_a_ratio_of_parameters_is_not_rounded() -> None:
    """A beta of 8/3 as 2.667 would spoil the digits of C+ and of every eigenvalue."""
    entry = adapter.entry("lorenz", 1)
    assert entry["model"]["A"][2][2] == -2.666666667
    assert entry["values"]["x"]["value"] == 8.485281374


def test_rolling_friction_is_not_an_impulse() -> None:
    """sign(v) at 20 m/s has slope 0; the torque curve contributes to a."""
    entry = adapter.entry("cruise-control")
    assert entry["model"]["A"] == [[-0.01012440529]]
    drag_alone = -1.3 * 0.32 * 2.4 * 20 / 1600
    assert abs(entry["model"]["A"][0][0] - drag_alone) > 1e-3


def test_a_slope_in_degrees_is_converted() -> None:
    """An uphill slope of 4 degrees acts as 4 pi/180 rad."""
    plant = adapter.plant("cruise-control")
    inputs = {"u": "1", "theta": "deg"}
    (entry,) = call(
        "linearize", {**plant, "inputs": inputs}, {"hold": {"v": 20, "theta": "4 deg"}}
    )["points"]
    assert entry["values"]["theta"]["value"] == 4
    slope = -9.8 * math.cos(math.radians(4)) * math.pi / 180
    assert entry["model"]["B"][0][1] == about(slope, rel=1e-9)


def test_twenty_four_states_with_two_growing_modes() -> None:
    """At lam = 5: two eigenvalues to the right, the largest 4.0013, all 24 of them known."""
    entry = adapter.entry("chafee-infante")
    values = eigenvalues(entry)
    assert len(values) == 24
    # closed form of the discrete line: 5 - (4/h^2) sin^2(k h/2), h = pi/25
    h = math.pi / 25
    expected = [complex(5 - 4 / h**2 * math.sin(k * h / 2) ** 2) for k in range(1, 25)]
    assert all(gap < 1e-6 * abs(value) for gap, value in distance(values, expected))
    assert sum(v.real > 0 for v in values) == 2
    text = caution_text(adapter.result("chafee-infante"), "eigenvalue-right")
    assert "2 eigenvalues with positive real part" in text


def test_published_levels_are_no_equilibrium() -> None:
    """The printed levels held with both pumps at 3 V contradict the equations."""
    levels = {"h1": 12.4, "h2": 12.7, "h3": 1.8, "h4": 1.4}
    asked = {"hold": {**levels, "v1": 3, "v2": 3}}
    for tool in ("trim", "linearize"):
        result = call(tool, adapter.plant("quad-tank-min"), asked)
        assert result["outcome"] == "no-point"
        (entry,) = result["points"]
        assert entry["reason"] == "conflict"
        assert {"hold h3", "hold v2"} <= set(entry["blocking"])
        assert entry["closest"]["h1"] == {"value": 12.4, "unit": "cm", "known": "exact"}
        assert "contradict" in result["answer"]
        assert "model" not in entry


def test_levels_in_centimetres_and_in_metres_are_one_plant() -> None:
    """With the levels declared in metres the numbers change, the eigenvalues do not."""
    plant = adapter.plant("quad-tank-min")
    metres = {**plant, "states": dict.fromkeys(plant["states"], "m")}
    (entry,) = call("linearize", metres, {"hold": {"v1": 3, "v2": 3}})["points"]
    reference = adapter.entry("quad-tank-min")
    assert entry["values"]["h1"]["value"] == about(0.12262967519550693, rel=1e-9)
    assert eigenvalues(entry) == eigenvalues(reference)
    assert entry["model"]["C"][0][0] == 50
    assert entry["model"]["B"][0][0] == about(0.0008325, rel=1e-9)


def test_the_currents_of_the_suspended_ball() -> None:
    """+7 A and -7 A both balance the weight; each is reached, and i = 0 stops no search."""
    plant = adapter.plant("maglev")
    for sign in (1, -1):
        (entry,) = call("linearize", plant, {"hold": {"h": 0.01}, "guess": {"i": 5 * sign}})[
            "points"
        ]
        assert entry["values"]["i"]["value"] == 7 * sign
        assert entry["values"]["V"]["value"] == 7 * sign
        assert entry["model"]["A"][1] == [980, 0, -2.8 * sign]
    (entry,) = call("trim", plant, {"hold": {"h": 0.01}, "guess": {"i": 0}})["points"]
    assert abs(entry["values"]["i"]["value"]) == 7


def test_guesses_of_zero_at_a_singular_start_are_no_conflict() -> None:
    """No current makes the Jacobian singular; +-7 A exist, so nothing contradicts anything."""
    asked = {"hold": {"h": 0.01}, "guess": {"i": 0, "V": 0}}
    (entry,) = call("trim", adapter.plant("maglev"), asked)["points"]
    assert entry.get("reason") != "conflict"


def test_the_unstable_twin_of_the_machine() -> None:
    """Beyond 90 degrees: pi - delta, with one eigenvalue to the right (from memory)."""
    first, second = (adapter.entry("smib-classical", k)["values"]["delta"]["value"] for k in (0, 3))
    assert first + second == about(math.pi, rel=1e-9)
    assert max(v.real for v in eigenvalues(adapter.entry("smib-classical", 3))) > 6


def test_the_free_position_of_the_cart_is_a_zero_eigenvalue() -> None:
    """The cart's position is free: one eigenvalue is exactly 0 and says so."""
    result = adapter.result("cart-pendulum")
    (zero,) = [e for e in result["points"][0]["stability"]["eigenvalues"] if e["re"] == 0]
    assert zero["exact"] == "0"
    assert zero["radius"] == 0
    free = call("linearize", adapter.plant("cart-pendulum"), {"hold": {"theta": "pi", "F": 0}})
    (entry,) = free["points"]
    assert entry["values"]["x"] == {**entry["values"]["x"], "value": 0, "known": "assumed"}
    assert "assumed" in codes(free)
    assert entry["model"]["A"] == result["points"][0]["model"]["A"]


def test_the_wrong_way_response_of_the_reactor() -> None:
    """Positive zero of the transfer function: B and C have the signs that make it."""
    model = adapter.entry("van-de-vusse")["model"]
    (a, _), (c, _) = model["A"]
    zero = a - c * model["B"][0][0] / model["B"][1][0]
    assert zero == about(2.8174603174603174603, rel=1e-8)
