# pyright: reportUnknownMemberType=false, reportUnknownVariableType=false
# pyright: reportUnknownArgumentType=false, reportUnknownLambdaType=false
"""Published numbers from the general literature beyond the case files, each with its source.

Every check stands beside its source ("from memory": taken down without the book at hand), and
every plant is also computed by `published.independent`.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import mpmath as mp
import pytest

from published.calling import JSON, codes, eigenvalues, kept
from published.independent import OwnPlant
from published.matching import NOTHING, PRINTED, about, differences, distance, same_spectrum

if TYPE_CHECKING:
    from collections.abc import Sequence


def plant(*equations: str, **more: object) -> JSON:
    """A plant in pure numbers unless `more` says otherwise."""
    return {"name": "published", "time": "1", "equations": list(equations), **more}


def entry(raw: JSON, point: JSON) -> JSON:
    """The linear model at the one point asked for, agreeing with the independent computation."""
    result = kept("linearize", raw, point)
    (found,) = result["points"]
    assert found["outcome"] == "done", found
    assert all(check["holds"] for check in result["checks"])
    own = OwnPlant(raw, point.get("set", {}))
    near = {n: v["value"] for n, v in found["values"].items()}
    assumed = {n: v["value"] for n, v in found["values"].items() if v["known"] == "assumed"}
    model = own.model(near, {**assumed, **point.get("hold", {})})
    for matrix in "ABCD":
        wrong = differences(found["model"][matrix], getattr(model, matrix), absolute=NOTHING)
        assert not wrong, matrix
    assert same_spectrum(eigenvalues(found), [complex(v) for v in model.eigenvalues])
    return found


def assert_spectrum(found: JSON, expected: Sequence[complex], tolerance: float) -> None:
    """Eigenvalues within an absolute tolerance, without order."""
    gaps = distance(eigenvalues(found), expected)
    assert all(gap <= tolerance for gap, _ in gaps), (eigenvalues(found), expected)


SPIN = plant(
    "I1*w1' = (I2-I3)*w2*w3",
    "I2*w2' = (I3-I1)*w3*w1",
    "I3*w3' = (I1-I2)*w1*w2",
    parameters={"I1": 1, "I2": 2, "I3": 3},
)


@pytest.mark.parametrize(
    ("axis", "squared"),
    [
        # H. Goldstein, Classical Mechanics (2nd ed. 1980), sec. 5-6, from memory: small motions
        # about axis k have lambda^2 = w^2 (Ik-Ii)(Ij-Ik)/(Ii Ij): only the middle axis diverges
        ("w1", -3.0),
        ("w2", 3.0),
        ("w3", -9.0),
    ],
)
def test_a_body_spinning_about_its_principal_axes(axis: str, squared: float) -> None:
    """Euler's equations, inertias 1, 2, 3, spin 3: only the middle axis has a growing motion."""
    hold = {name: (3 if name == axis else 0) for name in ("w1", "w2", "w3")}
    found = entry(SPIN, {"hold": hold})
    rate = complex(squared) ** 0.5
    assert_spectrum(found, [rate, -rate, 0], 1e-8)
    result = kept("linearize", SPIN, {"hold": hold})
    assert ("eigenvalue-right" in codes(result)) == (axis == "w2")
    assert "eigenvalue-near-axis" in codes(result)


ROSSLER = plant(
    "x' = -y - z",
    "y' = x + a*y",
    "z' = b + z*(x - c)",
    parameters={"a": "0.2", "b": "0.2", "c": "5.7"},
)


@pytest.mark.parametrize(
    ("guess", "expected"),
    [
        # O. E. Rössler, Phys. Lett. A 57 (1976) 397, at a = b = 0.2, c = 5.7; the eigenvalues as
        # commonly listed, from memory: inner 0.0971028 +- 0.995786i and -5.68718, of which three
        # digits hold (the 80-digit computation beside gives 0.0970009 +- 0.9951935i, -5.6869755)
        (
            {"x": 0.007, "y": -0.035, "z": 0.035},
            [0.0971028 + 0.995786j, 0.0971028 - 0.995786j, -5.68718],
        ),
        # outer: 0.192983 and -0.0000045962 +- 5.428i (from memory)
        (
            {"x": 5.7, "y": -28.5, "z": 28.5},
            [0.192983, -0.0000045962 + 5.428j, -0.0000045962 - 5.428j],
        ),
    ],
)
def test_the_two_fixed_points_of_rosslers_equations(
    guess: JSON, expected: Sequence[complex]
) -> None:
    """Fixed points (c +- sqrt(c^2 - 4ab))/2 and their published eigenvalues."""
    found = entry(ROSSLER, {"guess": guess})
    assert_spectrum(found, expected, 1e-3)
    root = math.sqrt(5.7**2 - 4 * 0.04)
    x = (5.7 + (root if guess["x"] > 1 else -root)) / 2
    assert found["values"]["x"]["value"] == about(x, rel=1e-9)
    assert found["values"]["z"]["value"] == about(x / 0.2, rel=1e-9)


def test_the_barely_damped_pair_of_rosslers_outer_point() -> None:
    """Real part -4.5962e-6 beside 5.428 (from memory): its sign is kept, four digits agree."""
    found = entry(ROSSLER, {"guess": {"x": 5.7, "y": -28.5, "z": 28.5}})
    pair = [v for v in eigenvalues(found) if v.imag > 0]
    assert pair[0].real == about(-4.5962e-6, rel=2e-4)


FITZHUGH = plant(
    "v' = v - v^3/3 - w + I",
    "tau*w' = v + a - b*w",
    inputs=["I"],
    parameters={"a": "0.7", "b": "0.8", "tau": "12.5"},
)


def test_the_rest_point_of_the_nerve_model() -> None:
    """R. FitzHugh, Biophys. J. 1 (1961) 445: rest at (1.1994, -0.6243) in his signs, from memory.

    With a = 0.7, b = 0.8 and the membrane equation in the sign convention used now, the rest point
    is v = -1.1994, w = -0.6243.
    """
    found = entry(FITZHUGH, {"hold": {"I": 0}})
    assert found["values"]["v"]["value"] == about(-1.1994, absolute=5e-5)
    assert found["values"]["w"]["value"] == about(-0.6243, absolute=6e-5)
    assert all(value.real < 0 for value in eigenvalues(found))


def test_the_nerve_model_with_current_has_lost_its_rest() -> None:
    """At I = 0.5 the published model fires: two growing eigenvalues at rest (from memory)."""
    found = entry(FITZHUGH, {"hold": {"I": "0.5"}})
    v = found["values"]["v"]["value"]
    assert sum(value.real > 0 for value in eigenvalues(found)) == 2
    # trace 1 - v^2 - b/tau of the published Jacobian
    assert sum(value.real for value in eigenvalues(found)) == about(1 - v**2 - 0.8 / 12.5, rel=1e-8)


BRUSSELATOR = plant(
    "x' = a + x^2*y - (b + 1)*x",
    "y' = b*x - x^2*y",
    parameters={"a": 2, "b": 5},
)


@pytest.mark.parametrize("b", ["5", "4.999", "5.001"])
def test_the_brusselator_turns_at_b_equal_to_one_plus_a_squared(b: str) -> None:
    """I. Prigogine, R. Lefever, J. Chem. Phys. 48 (1968) 1695: point (a, b/a), Hopf at b = 1 + a^2.

    There trace A = 0 and the frequency is a; beside it the trace has the sign of b - 1 - a^2.
    """
    point = {"guess": {"x": 1.8, "y": 2.4}, "set": {"b": b}}
    found = entry(BRUSSELATOR, point)
    assert found["values"]["x"]["value"] == 2
    assert found["values"]["y"]["value"] == about(float(b) / 2, rel=PRINTED)
    values = eigenvalues(found)
    trace = found["model"]["A"][0][0] + found["model"]["A"][1][1]
    assert trace == about(float(b) - 5, absolute=1e-9)
    right = "eigenvalue-right" in codes(kept("linearize", BRUSSELATOR, point))
    near = "eigenvalue-near-axis" in codes(kept("linearize", BRUSSELATOR, point))
    assert (right, near) == {"5": (False, True), "4.999": (False, False), "5.001": (True, False)}[b]
    if b == "5":
        assert [v.real for v in values] == [0, 0]
        assert abs(values[0].imag) == 2


def _chain(count: int) -> JSON:
    equations: list[str] = []
    for k in range(1, count + 1):
        left = f"q{k - 1}" if k > 1 else "0"
        right = f"q{k + 1}" if k < count else "0"
        ahead, back = f"({right} - q{k})", f"(q{k} - {left})"
        equations.append(f"m*q{k}'' = k*({ahead} - {back}) + al*({ahead}^2 - {back}^2)")
    return plant(*equations, parameters={"m": 2, "k": 3, "al": "0.25"})


@pytest.mark.parametrize("count", [3, 8])
def test_normal_modes_of_a_chain_with_fixed_ends(count: int) -> None:
    """E. Fermi, J. Pasta, S. Ulam (Los Alamos report LA-1940, 1955): alpha chain at rest.

    omega_j = 2 sqrt(k/m) sin(j pi/(2(N+1))), the quadratic terms do not act (from memory; the
    formula stands in every text on lattice vibrations).
    """
    raw = _chain(count)
    states = [f"q{k}{prime}" for k in range(1, count + 1) for prime in ("", "'")]
    found = entry(raw, {"guess": {s: 0 for s in states if "'" not in s}})
    assert found["model"]["states"] == states
    angles = [j * math.pi / (2 * (count + 1)) for j in range(1, count + 1)]
    omegas = [2 * math.sqrt(1.5) * math.sin(angle) for angle in angles]
    assert_spectrum(found, [s * 1j * w for w in omegas for s in (1, -1)], 5e-9)
    assert all(e["re"] == 0 for e in found["stability"]["eigenvalues"])


GOVERNOR = plant(
    # I. A. Vyshnegradskii, C. R. Acad. Sci. Paris 83 (1876) 318, as in L. S. Pontryagin,
    # Ordinary Differential Equations (1962), sec. 27, from memory
    "m*phi'' = m*n^2*omega^2*sin(phi)*cos(phi) - m*g*sin(phi) - b*phi'",
    "J*omega' = k*cos(phi) - F",
    parameters={"m": 1, "n": 1, "g": "9.81", "b": "8", "J": "2", "k": "10", "F": "5"},
)


@pytest.mark.parametrize(("margin", "grows"), [(1.01, False), (0.99, True)])
def test_the_governor_hunts_unless_friction_suffices(margin: float, *, grows: bool) -> None:
    """Vyshnegradskii's condition: too little friction at the sleeve, and the engine hunts.

    At cos(phi) = F/k and omega^2 = g/(n^2 cos(phi)) the characteristic polynomial is
    s^3 + (b/m) s^2 + (g sin^2/cos) s + 2 k g sin^2/(J omega), so by Routh b/m > 2 k cos/(J omega).
    """
    cosine, square = 0.5, 0.75
    omega = math.sqrt(9.81 / cosine)
    friction = margin * 2 * 10 * cosine / (2 * omega)
    point = {"guess": {"phi": 1, "omega": 4.4}, "set": {"b": repr(friction)}}
    found = entry(GOVERNOR, point)
    assert found["values"]["phi"]["value"] == about(math.pi / 3, rel=1e-9)
    assert found["values"]["omega"]["value"] == about(omega, rel=1e-9)
    expected = [1, friction, 9.81 * square / cosine, 2 * 10 * 9.81 * square / (2 * omega)]
    with mp.workdps(30):
        roots = [complex(r) for r in mp.polyroots(expected, maxsteps=200, extraprec=60)]
    assert_spectrum(found, roots, 1e-8)
    assert any(value.real > 0 for value in eigenvalues(found)) == grows


TANKS = {
    "name": "two tanks in a row",
    "time": "s",
    "equations": ["A1*h1' = q - R1*sqrt(h1)", "A2*h2' = R1*sqrt(h1) - R2*sqrt(h2)"],
    "states": {"h1": "m", "h2": "m"},
    "inputs": {"q": "m^3/s"},
    "outputs": {"level": "h2"},
    "parameters": {"A1": "2 m^2", "A2": "3 m^2", "R1": "0.04", "R2": "0.05"},
}


def test_two_tanks_have_the_textbook_time_constants() -> None:
    """Time constants 2 A h/q (Stephanopoulos, Chemical Process Control, 1984, from memory)."""
    found = entry(TANKS, {"hold": {"q": "0.02 m^3/s"}})
    h1, h2 = (0.02 / 0.04) ** 2, (0.02 / 0.05) ** 2
    assert found["values"]["h1"]["value"] == about(h1, rel=PRINTED)
    assert found["values"]["h2"]["value"] == about(h2, rel=PRINTED)
    assert_spectrum(found, [-1 / (2 * 2 * h1 / 0.02), -1 / (2 * 3 * h2 / 0.02)], 1e-11)


EPIDEMIC = {
    "name": "endemic epidemic",
    "time": "yr",
    "equations": ["S' = mu*(1 - S) - beta*S*I", "I' = beta*S*I - (gamma + mu)*I"],
    "parameters": {
        "mu": "0.02 1/yr",
        "gamma": "24 1/yr",
        "beta": {"is": "17*(gamma + mu)", "unit": "1/yr"},
    },
}


def test_measles_oscillates_every_two_years() -> None:
    """R. M. Anderson, R. M. May, Infectious Diseases of Humans (1991), ch. 6, from memory.

    R0 = 17: S* = 1/R0, I* = mu (R0 - 1)/beta,
    lambda^2 + mu R0 lambda + mu (gamma + mu)(R0 - 1) = 0: a period near two years.
    """
    beta = 17 * 24.02
    hold = {"guess": {"S": 0.06, "I": 0.0008}}
    found = entry(EPIDEMIC, hold)
    assert found["values"]["S"]["value"] == about(1 / 17, rel=1e-9)
    assert found["values"]["I"]["value"] == about(0.02 * 16 / beta, rel=1e-9)
    half = 0.02 * 17 / 2
    omega = math.sqrt(0.02 * 24.02 * 16 - half**2)
    assert_spectrum(found, [complex(-half, omega), complex(-half, -omega)], 1e-8)
    assert 2.2 < 2 * math.pi / omega < 2.4


def test_the_uninfected_population_is_a_saddle() -> None:
    """Without infection: eigenvalues -mu and (gamma + mu)(R0 - 1) (Anderson & May, from memory)."""
    found = entry(EPIDEMIC, {"hold": {"I": 0}})
    assert found["values"]["S"]["value"] == 1
    assert_spectrum(found, [-0.02, 24.02 * 16], 1e-6)


CHEMOSTAT = {
    "name": "chemostat with inhibition",
    "time": "h",
    "equations": ["X' = (mu - D)*X", "S' = D*(Sf - S) - mu*X/Y"],
    "definitions": {"mu": "mumax*S/(Km + S + k1*S^2)"},
    "states": {"X": "g/l", "S": "g/l"},
    "inputs": {"D": "1/h"},
    "parameters": {
        "mumax": "0.53 1/h",
        "Km": "0.12 g/l",
        "k1": "0.4545 l/g",
        "Y": "0.4",
        "Sf": "4 g/l",
    },
}


@pytest.mark.parametrize(
    ("point", "expected"),
    [
        ((0, 4), (-0.3, -0.1139)),
        ((0.9951, 1.5123), (-0.3, 0.1698)),
        ((1.5301, 0.1746), (-0.3, -2.2624)),
    ],
)
def test_the_chemostat_with_substrate_inhibition(
    point: tuple[float, float], expected: tuple[float, float]
) -> None:
    """Bequette, Process Dynamics (1998), Module 10, D = 0.3 1/h: three states (from memory)."""
    X, S = point
    asked: JSON = {"hold": {"D": "0.3 1/h"}, "guess": {"X": round(X, 1), "S": round(S, 1)}}
    found = entry(CHEMOSTAT, asked)
    assert found["values"]["S"]["value"] == about(S, absolute=1e-4)
    assert found["values"]["X"]["value"] == about(X, absolute=1e-4)
    # the book evaluates at its rounded steady state
    assert_spectrum(found, expected, 5e-4)


MOTOR = {
    "name": "direct-current motor",
    "time": "s",
    "equations": ["J*w' = K*i - b*w", "L*i' = V - R*i - K*w"],
    "states": {"w": "rad/s", "i": "A"},
    "inputs": {"V": "V"},
    "outputs": {"speed": "w"},
    "parameters": {
        "J": "0.01 kg m^2",
        "b": "0.1 N m s",
        "K": "0.01 N m/A",
        "R": "1 ohm",
        "L": "0.5 H",
    },
}


def test_the_motor_of_the_course_pages() -> None:
    """University of Michigan control tutorials, "DC Motor Speed", from memory: -2.0025, -9.9975.

    K/((J s + b)(L s + R) + K^2): gain at rest 0.01/(0.1 + 0.0001) = 0.0999.
    """
    found = entry(MOTOR, {"hold": {"V": "1 V"}})
    assert_spectrum(found, [-2.0025, -9.9975], 6e-5)
    result = kept("linearize", MOTOR, {"hold": {"V": "1 V"}}, also=["dc gain"])
    assert result["points"][0]["model"]["dc_gain"] == [[about(0.0999, absolute=5e-5)]]
