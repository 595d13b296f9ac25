# pyright: reportUnknownMemberType=false, reportUnknownVariableType=false
# pyright: reportUnknownArgumentType=false, reportUnknownLambdaType=false
"""A, B, C, D, the point and the eigenvalues of whole plants against two other roads.

`published.independent` parses the equations anew and differentiates by differences at 80 digits;
numpy and mpmath find the eigenvalues of the matrices as printed.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import mpmath as mp
import numpy as np
import pytest

from published.calling import JSON, eigenvalues, kept, read_plant
from published.independent import OwnPlant, spectrum
from published.matching import PRINTED, about, differences, distance, same_spectrum
from tangentbook.contract.plant import BRIDGE

PLANTS = Path(__file__).parents[2] / "scenarios" / "plants"

POINTS: dict[str, tuple[JSON, JSON]] = {
    # plant -> what is held, what is guessed
    "blade-yard-boom": ({"fold": "70 deg", "slew": "25 deg"}, {}),
    "cable-tender": ({"T": "30 kN", "Fw": "2 kN", "psi": 0}, {"u": 3, "v": 0.1}),
    "fish-digester": ({"Q": "20 m^3/d"}, {"P": 8, "S": 0.2, "X": 1.6}),
    "ice-works-exchanger": ({"wh": "10 kg/s", "wc": "12 kg/s"}, {}),
    "light-mast": ({"theta": "20 deg"}, {}),
    "town-water": (
        {"h1": "2 m", "h2": "3 m"},
        {"n": 0.9, "Qp": 220, "Hj": 66, "nc": 0.9, "y": 0.5},
    ),
}

INLINE: dict[str, tuple[JSON, JSON, JSON]] = {
    "bridge": (BRIDGE, {"theta": "60 deg"}, {}),
    "primed bracket and rates in definitions": (
        {
            "name": "leaking cart",
            "time": "1",
            "equations": ["(m*v)' = F - c*p*v", "m' = q - k*m", "0 = z^3 + z - m*v"],
            "algebraic": ["z"],
            "inputs": ["F", "q"],
            "outputs": {"power": "F*v + p", "z": "z"},
            "definitions": {"p": "m*v' + z^2"},
            "parameters": {"c": "0.7", "k": "0.3"},
        },
        {"F": 2, "q": 1},
        {"v": 1, "m": 3, "z": 1},
    ),
    "coupled highest rates, third order": (
        {
            "name": "coupled",
            "time": "1",
            "equations": [
                "2*x''' + y'' + tanh(x)*y' = u - sin(x)",
                "x'''*y + 3*y'' + y = exp(-x)*u + x'",
            ],
            "inputs": ["u"],
            "outputs": {"mixed": "x'''*y + u^2"},
        },
        {"u": "0.4"},
        {"x": 0.4, "y": 0.3},
    ),
}


def _cases() -> list[Any]:
    listed = [
        pytest.param(
            read_plant((PLANTS / f"{name}.toml").read_text("utf-8"), suffix=".toml"),
            hold,
            guess,
            id=name,
        )
        for name, (hold, guess) in POINTS.items()
    ]
    return listed + [pytest.param(*case, id=name) for name, case in INLINE.items()]


CASES = pytest.mark.parametrize(("plant", "hold", "guess"), _cases())


def _entry(plant: JSON, hold: JSON, guess: JSON) -> JSON:
    result = kept("linearize", plant, {"hold": hold, "guess": guess})
    (entry,) = result["points"]
    assert entry["outcome"] == "done", entry
    assert all(check["holds"] for check in result["checks"])
    return entry


def test_every_plant_of_the_demo_is_covered() -> None:
    """A plant added to the demo is added here."""
    assert sorted(POINTS) == sorted(path.stem for path in PLANTS.glob("*.toml"))


@CASES
def test_every_entry_agrees_with_differences_at_eighty_digits(
    plant: JSON, hold: JSON, guess: JSON
) -> None:
    """Point, matrices in declared units, eigenvalues per declared time."""
    entry = _entry(plant, hold, guess)
    resting = (
        {
            name: item.get("rest", 0)
            for name, item in plant["inputs"].items()
            if isinstance(item, dict) and item.get("role") == "disturbance"
        }
        if isinstance(plant["inputs"], dict)
        else {}
    )
    near = {n: v["value"] for n, v in entry["values"].items()}
    model = OwnPlant(plant).model(near, {**resting, **hold})
    for name, value in model.values.items():
        found = entry["values"][name]["value"]
        # values that are zero here are zero to the accuracy of the differences
        assert found == about(float(value), rel=PRINTED, absolute=1e-25), name
    for matrix in "ABCD":
        assert not differences(entry["model"][matrix], getattr(model, matrix), absolute=1e-18), (
            matrix
        )
    assert same_spectrum(eigenvalues(entry), [complex(v) for v in model.eigenvalues])


@CASES
def test_the_eigenvalues_are_those_of_the_printed_matrix(
    plant: JSON, hold: JSON, guess: JSON
) -> None:
    """Numpy in double precision and mpmath at 50 digits on A as printed."""
    entry = _entry(plant, hold, guess)
    A = entry["model"]["A"]
    found = eigenvalues(entry)
    # A is printed to 10 digits: what that moves eigenvalues by is its condition, below 100 here
    scale = max(abs(v) for v in found)
    with mp.workdps(50):
        exact = [complex(v) for v in spectrum(A)]
    for expected in (exact, [complex(v) for v in np.linalg.eigvals(np.array(A, dtype=float))]):
        assert all(gap <= 1e-8 * scale for gap, _ in distance(found, expected))


def test_a_large_plant_agrees_with_two_numpy_routes() -> None:
    """41 states: sparse entries; a row of diffusing cells has eigenvalues in closed form."""
    n = 41
    equations = [
        f"c{k}' = {left} - 2*c{k} + {right} - c{k}^3"
        for k in range(1, n + 1)
        for left in [f"c{k - 1}" if k > 1 else "0"]
        for right in [f"c{k + 1}" if k < n else "0"]
    ]
    plant: JSON = {"name": "cells", "time": "1", "equations": equations, "outputs": {"c1": "c1"}}
    entry = _entry(plant, {f"c{k}": 0 for k in range(1, n + 1)}, {})
    sparse = entry["model"]["A"]
    assert sparse["shape"] == [n, n]
    A = np.zeros((n, n))
    for i, j, value in sparse["entries"]:
        A[i, j] = value
    assert np.array_equal(A, np.diag([-2.0] * n) + np.eye(n, k=1) + np.eye(n, k=-1))
    expected = [complex(-4 * np.sin(k * np.pi / (2 * (n + 1))) ** 2) for k in range(1, n + 1)]
    assert all(gap < 4 * PRINTED for gap, _ in distance(eigenvalues(entry), expected))
