# pyright: reportUnknownMemberType=false, reportUnknownVariableType=false
# pyright: reportUnknownArgumentType=false, reportUnknownLambdaType=false
"""The numbers that were printed in books, papers and course pages, within their printed digits.

Each test names the case, the published quantity and whether it was taken down from memory; the
source is the case's `source`. Quantities that are functions of the linear model (damping, gains,
zeros, time constants …) are computed here from the matrices as printed by the program. What needs
a verdict or a simulation is listed in `LATER_QUANTITIES`.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

import numpy as np
import pytest
from scipy.linalg import eigvals as generalized

from published import adapter
from published.calling import JSON, eigenvalues, kept
from published.matching import distance

if TYPE_CHECKING:
    from collections.abc import Callable

LATER_QUANTITIES = {
    "pend-undamped": {"ratio30", "ratio60", "ratio90"},
    "van-der-pol": {"limit_cycle_period_mu1", "limit_cycle_amplitude_mu1"},
}
"""Published quantities of nonlinear motions, which need a simulation."""

CRITICAL = {
    ("bead-hoop", "omega_critical"),
    ("lorenz", "rho_Hopf"),
    ("chafee-infante", "lam_critical"),
}
"""Published critical values, tested by the eigenvalues on their two sides."""


def _value(name: str, quantity: str, which: int = 0) -> float:
    return adapter.entry(name, which)["values"][quantity]["value"]


def _model(name: str, which: int = 0) -> JSON:
    return adapter.entry(name, which)["model"]


def _spectrum(name: str, label: str = "") -> list[complex]:
    which = adapter.LABELS[name].index(label) if label else 0
    return eigenvalues(adapter.entry(name, which))


def _point(name: str, label: str) -> list[float]:
    which = adapter.LABELS[name].index(label)
    states = adapter.read_case(name)["states"]
    return [_value(name, state, which) for state in states]


def _transfer(name: str) -> tuple[list[float], list[float]]:
    """Numerator and denominator (s^1, s^0) of a two-state model with one input and one output."""
    model = _model(name)
    (a, b), (c, d) = model["A"]
    adjugate = np.array([[-d, b], [c, -a]])
    C, B = np.array(model["C"]), np.array(model["B"])
    return [(C @ B).item(), (C @ adjugate @ B).item()], [-(a + d), a * d - b * c]


def _zeros(name: str) -> list[complex]:
    """Transmission zeros: finite generalized eigenvalues of the system matrix."""
    model = _model(name)
    A, B, C, D = (np.array(model[m], dtype=float) for m in "ABCD")
    n = len(A)
    values = generalized(np.block([[A, B], [C, D]]), np.diag([1.0] * n + [0.0] * len(D)))
    return [complex(v) for v in values if np.isfinite(v) and abs(v) < 1e6]


def _zero_of_column(name: str, column: int) -> complex:
    model = _model(name)
    A, C = np.array(model["A"], dtype=float), np.array(model["C"], dtype=float)
    B, D = (np.array(model[m], dtype=float)[:, [column]] for m in "BD")
    values = generalized(np.block([[A, B], [C, D]]), np.diag([1.0] * len(A) + [0.0]))
    (zero,) = [complex(v) for v in values if np.isfinite(v) and abs(v) < 1e8]
    return zero


def _buck(what: str) -> float:
    """f0 and Q of s^2 + s w0/Q + w0^2 (averaged converter)."""
    w0 = math.sqrt(np.linalg.det(np.array(_model("buck-boost-erickson")["A"])))
    return {
        "f0": w0 / (2 * math.pi),
        "Q": w0 / -np.trace(np.array(_model("buck-boost-erickson")["A"])),
    }[what]


def _machine(what: str) -> float:
    """Synchronising coefficient, natural frequency and damping of the swing equation, H = 3.5 s."""
    A, damped = _model("smib-classical")["A"], _model("smib-classical", 1)["A"]
    wn = math.sqrt(-A[0][1] * A[1][0])
    return {"Ks": -7 * A[0][1], "omega_n": wn, "zeta": -damped[0][0] / (2 * wn)}[what]


def _degrees(name: str, quantity: str) -> float:
    return math.degrees(_value(name, quantity))


def _diagonal_times(name: str) -> list[float]:
    A = _model(name)["A"]
    return [-1 / A[k][k] for k in range(len(A))]


def _flat(rows: list[list[float]]) -> list[float]:
    return [v for row in rows for v in row]


QUANTITIES: dict[tuple[str, str], Callable[[], Any]] = {
    ("buck-boost-erickson", "v"): lambda: _value("buck-boost-erickson", "v"),
    ("buck-boost-erickson", "Gd0"): lambda: _model("buck-boost-erickson")["dc_gain"][0][0],
    ("buck-boost-erickson", "Gg0"): lambda: _model("buck-boost-erickson")["dc_gain"][0][1],
    ("buck-boost-erickson", "f0"): lambda: _buck("f0"),
    ("buck-boost-erickson", "Q"): lambda: _buck("Q"),
    # a zero in the right half-plane: its sign is part of the number
    ("buck-boost-erickson", "fz_RHP"): lambda: (
        _zero_of_column("buck-boost-erickson", 0).real / (2 * math.pi)
    ),
    ("cart-pendulum", "A"): lambda: _model("cart-pendulum")["A"],
    ("cart-pendulum", "B"): lambda: _model("cart-pendulum")["B"],
    ("cart-pendulum", "eig"): lambda: _spectrum("cart-pendulum"),
    ("chafee-infante", "unstable_modes"): lambda: sum(
        value.real > 0 for value in _spectrum("chafee-infante")
    ),
    ("cruise-control", "u"): lambda: _value("cruise-control", "u"),
    ("cruise-control", "a"): lambda: -_model("cruise-control")["A"][0][0],
    ("cruise-control", "b"): lambda: _model("cruise-control")["B"][0][0],
    ("cruise-control", "bg"): lambda: -_model("cruise-control")["B"][0][1],
    **{
        ("cstr-three-states", which): lambda which=which: _point("cstr-three-states", which)
        for which in ("low", "middle", "high")
    },
    **{
        ("cstr-three-states", f"{which}.eig"): lambda which=which: _spectrum(
            "cstr-three-states", which
        )
        for which in ("low", "middle", "high")
    },
    ("duffing", "right.x"): lambda: _value("duffing", "x", 1),
    ("duffing", "left.x"): lambda: _value("duffing", "x", 2),
    ("duffing", "right.eig"): lambda: _spectrum("duffing", "right"),
    ("lorenz", "Cplus"): lambda: _point("lorenz", "Cplus"),
    ("lorenz", "origin.eig"): lambda: _spectrum("lorenz", "origin"),
    ("lorenz", "Cplus.eig"): lambda: _spectrum("lorenz", "Cplus"),
    ("lotka-volterra", "period_linear"): lambda: (
        2 * math.pi / _spectrum("lotka-volterra", "coexistence")[0].imag
    ),
    ("maglev", "A"): lambda: _model("maglev")["A"],
    ("maglev", "B"): lambda: _model("maglev")["B"],
    ("maglev", "eig"): lambda: _spectrum("maglev"),
    ("maglev", "i"): lambda: _value("maglev", "i"),
    ("pend-damped", "hanging.eig"): lambda: _spectrum("pend-damped", "hanging"),
    ("pend-damped", "upright.eig"): lambda: _spectrum("pend-damped", "upright"),
    ("quad-tank-min", "h"): lambda: _model("quad-tank-min")["x0"],
    ("quad-tank-min", "time_constants"): lambda: _diagonal_times("quad-tank-min"),
    ("quad-tank-min", "gains"): lambda: _flat(_model("quad-tank-min")["dc_gain"]),
    ("quad-tank-min", "zeros"): lambda: sorted(v.real for v in _zeros("quad-tank-min")),
    ("smib-classical", "delta_deg"): lambda: _degrees("smib-classical", "delta"),
    ("smib-classical", "Ks"): lambda: _machine("Ks"),
    ("smib-classical", "omega_n"): lambda: _machine("omega_n"),
    ("smib-classical", "zeta_KD10"): lambda: _machine("zeta"),
    ("smib-classical", "KD0.eig"): lambda: _spectrum("smib-classical", "KD0"),
    ("smib-classical", "KD10.eig"): lambda: _spectrum("smib-classical", "KD10"),
    ("smib-classical", "KD-10.eig"): lambda: _spectrum("smib-classical", "KD-10"),
    # the voltage behind the reactance that the published 1.123 was rounded from
    ("smib-classical", "E_exact"): lambda: _value("smib-dae", "E"),
    ("smib-dae", "E"): lambda: _value("smib-dae", "E"),
    ("smib-dae", "delta_deg"): lambda: _degrees("smib-dae", "delta"),
    ("smib-dae", "th_deg"): lambda: _degrees("smib-dae", "th"),
    ("smib-dae", "Ks"): lambda: -7 * _model("smib-dae")["A"][0][1],
    ("smib-dae", "eig"): lambda: _spectrum("smib-dae"),
    ("van-de-vusse", "Ca"): lambda: _value("van-de-vusse", "Ca"),
    ("van-de-vusse", "Cb"): lambda: _value("van-de-vusse", "Cb"),
    ("van-de-vusse", "A"): lambda: _model("van-de-vusse")["A"],
    ("van-de-vusse", "B"): lambda: _model("van-de-vusse")["B"],
    ("van-de-vusse", "num_s1_s0"): lambda: _transfer("van-de-vusse")[0],
    ("van-de-vusse", "den_s1_s0"): lambda: _transfer("van-de-vusse")[1],
    ("van-der-pol", "mu1.eig"): lambda: _spectrum("van-der-pol", "mu1"),
    ("van-der-pol", "mu2.eig"): lambda: _spectrum("van-der-pol", "mu2"),
}


def _published() -> list[tuple[str, JSON]]:
    return [(n, item) for n in adapter.reachable() for item in adapter.read_case(n)["expected"]]


def _is_verdict(item: JSON) -> bool:
    return item["quantity"].endswith("verdict")


TESTED = [
    pytest.param(
        name,
        item,
        id=f"{name}-{item['quantity']}{'-from memory' if item['from_memory'] else ''}",
    )
    for name, item in _published()
    if (name, item["quantity"]) in QUANTITIES
]


def test_every_published_quantity_is_tested_or_named() -> None:
    """No printed number is passed over: tested, critical, a verdict, or named as later."""
    for name, item in _published():
        key = (name, item["quantity"])
        later = item["quantity"] in LATER_QUANTITIES.get(name, set())
        assert (key in QUANTITIES) + (key in CRITICAL) + _is_verdict(item) + later == 1, key
    assert len(TESTED) == len(QUANTITIES)


@pytest.mark.parametrize(("name", "item"), TESTED)
def test_a_published_number_is_met_within_its_printed_digits(name: str, item: JSON) -> None:
    """The tolerance is the case's: half a unit of the last printed digit unless it says why."""
    found, wanted = QUANTITIES[name, item["quantity"]](), adapter.numbers(item["value"])
    tolerance = float(item["tol"])
    if item["quantity"].endswith("eig"):
        gaps = distance([complex(v) for v in found], [complex(v) for v in wanted])
        assert all(_near(gap, tolerance) for gap, _ in gaps), (found, wanted)
        return
    difference = np.abs(np.array(found, dtype=float) - np.array(wanted, dtype=float))
    assert np.all(difference <= tolerance + 1e-12), (found, wanted)


def _near(gap: float, tolerance: float) -> bool:
    # the tolerance is per part; a distance in the plane is at most sqrt(2) of it
    return gap <= math.sqrt(2) * tolerance


@pytest.mark.parametrize(
    ("name", "below", "above"),
    [
        # Strogatz, from memory: sqrt(g/r) = 9.9045
        ("bead-hoop", {"omega": "9.90445"}, {"omega": "9.90455"}),
        # Sparrow 1982, from memory: 470/19 = 24.74; here within a hundredth of the last digit
        ("lorenz", {"rho": "24.7368"}, {"rho": "24.7369"}),
        # the discrete line loses stability at (4/h^2) sin^2(h/2) = 0.998685, the continuum at 1
        ("chafee-infante", {"lam": "0.998684"}, {"lam": "0.998685"}),
    ],
)
def test_the_rightmost_eigenvalue_crosses_at_the_published_critical_value(
    name: str, below: JSON, above: JSON
) -> None:
    """On the two sides of a published critical value the sign of the rightmost part differs."""
    reals: list[float] = []
    for changed in (below, above):
        index = 1 if name == "lorenz" else 0
        published = {**adapter.linearizations(name)[index], "parameters_changed": changed}
        asked = adapter.point(name, published)
        result = kept("linearize", adapter.plant(name), asked)
        reals.append(max(v.real for v in eigenvalues(result["points"][0])))
    assert reals[0] < 0 < reals[1]


def test_a_critical_value_given_exactly_is_a_zero_eigenvalue_and_no_more() -> None:
    """At omega = sqrt(g/r) the eigenvalue is 0 (Strogatz, sec. 3.5): no side may be claimed."""
    asked = {"guess": {"phi": 0}, "set": {"omega": "sqrt(g/r)"}}
    result = kept("linearize", adapter.plant("bead-hoop"), asked)
    assert sorted(v.real for v in eigenvalues(result["points"][0])) == [-0.5, 0.0]
    codes = {c["code"] for c in result["cautions"]}
    assert "eigenvalue-near-axis" in codes
    assert "eigenvalue-right" not in codes


def test_the_hopf_point_of_lorenz_has_a_pair_on_the_axis() -> None:
    """At rho = 470/19 exactly: +-9.6245i, and the caution that the linear model cannot decide."""
    asked = {"guess": {"x": 8, "y": 8, "z": 24}, "set": {"rho": "470/19"}}
    result = kept("linearize", adapter.plant("lorenz"), asked)
    values = eigenvalues(result["points"][0])
    expected = [9.6245300637157563534j, -9.6245300637157563534j, complex(-41 / 3)]
    assert all(gap < 1e-8 for gap, _ in distance(values, expected))
    codes = {c["code"] for c in result["cautions"]}
    assert "eigenvalue-near-axis" in codes
    assert "eigenvalue-right" not in codes
