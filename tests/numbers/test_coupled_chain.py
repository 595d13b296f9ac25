"""A chain of bodies with highest rates coupled through a mass matrix that depends on the angles.

The equations are those of n point masses on massless rods (Lagrange); at hanging rest the linear
model is M q'' + C q' + K q = T e1 with M and K known in closed form, so LAPACK on that form is
another road. Each check value must be made and hold: nothing may blow up or be left out.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.linalg import eigvals

from published.calling import JSON, call


def chain(bodies: int) -> JSON:
    """The plant of a hanging chain, driven at its first joint."""
    equations: list[str] = []
    for i in range(1, bodies + 1):
        terms: list[str] = []
        for j in range(1, bodies + 1):
            count = bodies + 1 - max(i, j)
            if i == j:
                terms.append(f"{count}*m*l^2*q{i}''")
            else:
                terms.append(f"{count}*m*l^2*cos(q{i} - q{j})*q{j}''")
                terms.append(f"{count}*m*l^2*sin(q{i} - q{j})*q{j}'^2")
        terms += [f"{bodies + 1 - i}*m*g*l*sin(q{i})", f"c*q{i}'"]
        equations.append(f"{' + '.join(terms)} = {'T' if i == 1 else '0'}")
    return {
        "name": f"chain of {bodies}",
        "equations": equations,
        "states": {f"q{i}": "rad" for i in range(1, bodies + 1)},
        "inputs": {"T": "N m"},
        "parameters": {"m": "1 kg", "l": "1 m", "g": "9.81 m/s^2", "c": "0.1 N m s"},
    }


@pytest.mark.parametrize("bodies", [2, 3, 4, 6])
def test_a_hanging_chain_has_the_modes_of_its_mass_and_stiffness(bodies: int) -> None:
    """Eigenvalues and B against M, C, K in closed form; every second route holds."""
    hold = {"T": 0}
    guess = {f"q{i}": 0 for i in range(1, bodies + 1)}
    result = call("linearize", chain(bodies), {"hold": hold, "guess": guess})
    count = [[bodies - max(i, j) for j in range(bodies)] for i in range(bodies)]
    mass = np.array(count, dtype=float)
    stiffness = np.diag([9.81 * (bodies - i) for i in range(bodies)])
    inverse = np.linalg.inv(mass)
    lower = np.hstack([-inverse @ stiffness, -0.1 * inverse])
    upper = np.hstack([np.zeros((bodies, bodies)), np.eye(bodies)])
    matrix = np.vstack([upper, lower])
    expected = sorted((complex(z) for z in eigvals(matrix)), key=lambda z: (z.imag, z.real))
    point = result["points"][0]
    found = sorted(
        (complex(e["re"], e["im"]) for e in point["stability"]["eigenvalues"]),
        key=lambda z: (z.imag, z.real),
    )
    # rounding of LAPACK at these sizes (condition of the mass matrix below 100)
    assert found == pytest.approx(expected, rel=1e-9, abs=1e-11)
    names = point["model"]["states"]
    column = {names[k]: row[0] for k, row in enumerate(point["model"]["B"])}
    for i in range(bodies):
        assert column[f"q{i + 1}'"] == pytest.approx(inverse[i, 0], rel=1e-9, abs=1e-12)
    made = {c["code"] for c in result["checks"] if c["holds"]}
    assert {"jacobian.second-route", "model.remainder"} <= made
    assert "every entry confirmed" in result["answer"]
