# pyright: reportUnknownMemberType=false, reportUnknownVariableType=false
# pyright: reportUnknownArgumentType=false, reportUnknownLambdaType=false
"""What may not change the model: units, order, scale of time, an added constant, the call before.

Properties over random plants and units; every case is also a small end-to-end call.
"""

from __future__ import annotations

import math
from typing import Any

import pytest
from flint import ctx
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from published.calling import JSON, call, eigenvalues, kept
from published.matching import PRINTED, about, distance
from tangentbook.contract.plant import BRIDGE

PROPERTY = settings(
    max_examples=8,
    deadline=None,
    derandomize=True,
    suppress_health_check=[HealthCheck.too_slow],
)
"""A call costs about a tenth of a second; derandomized, so that a run says the same every time."""

LENGTHS = {"m": 1.0, "cm": 1e-2, "mm": 1e-3, "km": 1e3}
FORCES = {"N": 1.0, "kN": 1e3, "mN": 1e-3}
TIMES = {"s": 1.0, "min": 60.0, "h": 3600.0, "ms": 1e-3}


def spring(length: str, force: str, time: str) -> JSON:
    """A hardening spring with damper: A, B, C, D are known in closed form."""
    return {
        "name": "spring",
        "time": time,
        "equations": ["m*x'' + b*x' + k*x + k3*x^3 = F"],
        "states": {"x": length},
        "inputs": {"F": force},
        "outputs": {"back": {"is": "k*x + k3*x^3", "unit": force}},
        "parameters": {"m": "2 kg", "b": "3 N s/m", "k": "50 N/m", "k3": "20 N/m^3"},
    }


@PROPERTY
@given(st.sampled_from([*LENGTHS]), st.sampled_from([*FORCES]), st.sampled_from([*TIMES]))
def test_units_scale_rows_and_columns(length: str, force: str, time: str) -> None:
    """An entry is the unit of its row per unit of its column; rates are per `time` again."""
    result = kept("linearize", spring(length, force, time), {"hold": {"x": "0.5 m"}})
    (entry,) = result["points"]
    model = entry["model"]
    size, push, clock = LENGTHS[length], FORCES[force], TIMES[time]
    slope = 50 + 3 * 20 * 0.25
    assert entry["values"]["F"]["value"] == about((25 + 2.5) / push, rel=PRINTED)
    assert model["A"][0] == [0, 1]
    assert model["A"][1] == about([-slope / 2 * clock**2, -1.5 * clock], rel=PRINTED)
    assert model["B"] == [[0], [about(0.5 * push * clock**2 / size, rel=PRINTED)]]
    assert model["C"][0] == [about(slope * size / push, rel=PRINTED), 0]
    assert model["D"] == [[0]]
    root = complex(-0.75, math.sqrt(slope / 2 - 0.75**2)) * clock
    gaps = distance(eigenvalues(entry), [root, root.conjugate()])
    assert all(gap <= 2 * PRINTED * abs(root) for gap, _ in gaps)


NAMES = ("p", "q", "r", "w")
ROWS = {
    "p": "p' = q*r - 2*p + u",
    "q": "q' = sin(p) - q + w",
    "r": "r' = p*w - r^3 + 1",
    "w": "w' = -w + q - p/3",
}


@PROPERTY
@given(st.permutations(NAMES), st.permutations(NAMES))
def test_the_declared_order_permutes_the_matrices(states: list[str], rows: list[str]) -> None:
    """Order of `states` orders rows and columns; order of the equations changes nothing."""

    def model(order: list[str], equations: list[str]) -> JSON:
        plant: JSON = {
            "name": "order",
            "time": "1",
            "equations": [ROWS[n] for n in equations],
            "states": order,
            "inputs": ["u"],
            "outputs": {"y": "p*q"},
        }
        asked = {"hold": {"u": 0}, "guess": {"p": 0, "q": 0, "r": 1, "w": 0}}
        (entry,) = kept("linearize", plant, asked)["points"]
        return entry["model"]

    reference, found = model([*NAMES], [*NAMES]), model(states, rows)
    place = [NAMES.index(n) for n in states]
    assert found["A"] == [[reference["A"][i][j] for j in place] for i in place]
    assert found["B"] == [reference["B"][i] for i in place]
    assert found["C"] == [[reference["C"][0][j] for j in place]]
    assert found["x0"] == [reference["x0"][i] for i in place]


def test_an_added_constant_that_cancels_changes_nothing() -> None:
    """1e9 added on both sides of an equation: exact arithmetic does not notice."""
    moved = [e.replace("=", "+ 1000000000.125 = 1000000000.125 +") for e in BRIDGE["equations"]]
    units = [e.replace("1000000000.125", "1000000000.125[N m]") for e in moved]
    asked = {"hold": {"theta": "60 deg"}}
    plain = kept("linearize", BRIDGE, asked)["points"][0]
    assert (
        kept("linearize", {**BRIDGE, "equations": units}, asked)["points"][0]["model"]
        == plain["model"]
    )


def test_one_call_for_two_points_says_the_same_as_two_calls() -> None:
    """Points of one call do not act on each other."""
    points: list[JSON] = [{"hold": {"theta": "60 deg"}}, {"hold": {"theta": "20 deg"}}]
    together = call("linearize", BRIDGE, points)["points"]
    for k, point in enumerate(points):
        alone = call("linearize", BRIDGE, point)["points"][0]
        assert {**together[k], "request": 0, "id": "p1"} == alone


@pytest.mark.parametrize("angle", ["40 deg", "80 deg"])
def test_the_call_before_does_not_change_a_result(angle: str) -> None:
    """A fresh worker (53 bits) and a used one (256 bits) give the same check values."""
    results: list[Any] = []
    before = ctx.prec
    try:
        for bits in (20, 53, 256):
            ctx.prec = bits
            results.append(call("trim", BRIDGE, {"hold": {"theta": angle}}))
    finally:
        ctx.prec = before
    assert results[0] == results[1] == results[2]
