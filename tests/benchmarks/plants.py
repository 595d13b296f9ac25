"""Plants to measure with: each comes with a point at which it is known to be at rest.

- `network(n)`: n states, about four entries a row, terms of tanh, sin and exp, every decimal drawn
  anew. Each term vanishes at the chosen rest, and the damping exceeds the sum of the slopes there,
  so the rest is an equilibrium and a regular one.
- `pendulum()`: two states.
- `balloon()`: a moored balloon in a steady wind, 12 states of a rigid body, 4 inputs; angles of the
  flow by atan and asin, the cable by a root, the density by exp.
- `chain(n)`: n pendulums in a row. The mass matrix depends on the angles and couples all highest
  rates, so they form one block.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np

from tangentbook.analysis.conditions import PointText
from tangentbook.plant.source import DeclaredText, EquationText, ParameterText, PlantText

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

NEIGHBOURS = 3
INPUTS = 4


@dataclass(frozen=True, slots=True, kw_only=True)
class Case:
    """A plant as written, a point as asked for, and values near it for single evaluations."""

    text: PlantText
    point: PointText
    near: dict[str, float] = field(default_factory=dict[str, float])


def case_of_size(n: int) -> Case:
    """The plant that stands for n states."""
    if n == 2:
        return pendulum()
    return balloon() if n == 12 else network(n)


def _plant(
    name: str,
    equations: Sequence[str],
    *,
    states: Sequence[str],
    inputs: Sequence[str],
    parameters: Mapping[str, float] | None = None,
) -> PlantText:
    return PlantText(
        name=name,
        equations=tuple(EquationText(text=text) for text in equations),
        states=tuple(DeclaredText(name=x) for x in states),
        inputs=tuple(DeclaredText(name=u) for u in inputs),
        parameters=tuple(ParameterText(name=p, value=v) for p, v in (parameters or {}).items()),
    )


class _Decimals:
    """Decimals from a seeded generator, no two alike."""

    def __init__(self, seed: int) -> None:
        self._random = np.random.default_rng(seed)
        self._taken: set[str] = set()

    def next(self, low: float, high: float) -> str:
        """A decimal of six places between the bounds."""
        while True:
            text = f"{self._random.uniform(low, high):.6f}"
            if text not in self._taken:
                self._taken.add(text)
                return text

    def others(self, n: int, k: int) -> list[int]:
        """Distinct indices below n, none of them k."""
        drawn = self._random.choice(n - 1, size=min(NEIGHBOURS, n - 1), replace=False)
        return [int(j) + (int(j) >= k) for j in drawn]


_TERMS = (
    "{c}*tanh({w}*({x} - {e}))",
    "{c}*sin({w}*({x} - {e}))",
    "{c}*(exp({w}*({x} - {e})) - 1)",
)


def network(n: int) -> Case:
    """A network of n states with a known regular equilibrium at zero input."""
    decimals = _Decimals(seed=n)
    rest = [decimals.next(0.2, 1.8) for _ in range(n)]
    equations: list[str] = []
    for k in range(n):
        terms = [f"-{decimals.next(2.0, 3.0)}*(x{k} - {rest[k]})"]
        for kind, j in enumerate(decimals.others(n, k)):
            c, w = decimals.next(0.2, 0.8), decimals.next(0.2, 0.8)
            terms.append(_TERMS[kind].format(c=c, w=w, x=f"x{j}", e=rest[j]))
        terms.append(f"{decimals.next(0.5, 1.5)}*u{k % INPUTS}")
        equations.append(f"x{k}' = " + " + ".join(terms))
    states = [f"x{k}" for k in range(n)]
    inputs = [f"u{k}" for k in range(INPUTS)]
    near = {x: float(e) + 0.01 for x, e in zip(states, rest, strict=True)}
    return Case(
        text=_plant(f"Network of {n}", equations, states=states, inputs=inputs),
        point=PointText(hold=tuple((u, 0) for u in inputs)),
        near={**near, **dict.fromkeys(inputs, 0.0)},
    )


def pendulum() -> Case:
    """A damped pendulum under a torque."""
    text = _plant(
        "Pendulum",
        ["m*l^2*th'' + c*th' + m*g*l*sin(th) = M"],
        states=["th", "th'"],
        inputs=["M"],
        parameters={"m": 0.35, "l": 0.62, "c": 0.018, "g": 9.81},
    )
    return Case(
        text=text, point=PointText(hold=(("th", "0.7"),)), near={"th": 0.7, "th'": 0.0, "M": 1.4}
    )


_BALLOON = """
cf = cos(phi); sf = sin(phi); ct = cos(th); st = sin(th); cp = cos(psi); sp = sin(psi)
R11 = ct*cp; R12 = sf*st*cp - cf*sp; R13 = cf*st*cp + sf*sp
R21 = ct*sp; R22 = sf*st*sp + cf*cp; R23 = cf*st*sp - sf*cp
R31 = -st; R32 = sf*ct; R33 = cf*ct
ua = u + R11*W; va = v + R12*W; wa = w + R13*W
V = sqrt(ua^2 + va^2 + wa^2); alpha = atan(wa/ua); beta = asin(va/V)
Q = 0.5*rho0*exp(z/8434.7)*V^2*S
CL = CLa*alpha + CL3*alpha^3 + CLe*de
CD = CD0 + kD*CL^2 + kb*beta^2 - CT*dT
CY = -CYb*beta + CYr*dr
Fx = Q*(CL*sin(alpha) - CD*cos(alpha)); Fy = Q*CY; Fz = -Q*(CL*cos(alpha) + CD*sin(alpha))
ax = x + R11*xc + R13*zc; ay = y + R21*xc + R23*zc; az = z + R31*xc + R33*zc
L = sqrt(ax^2 + ay^2 + az^2); T = kc*(L - L0)/L
Tx = -T*(R11*ax + R21*ay + R31*az)
Ty = -T*(R12*ax + R22*ay + R32*az)
Tz = -T*(R13*ax + R23*ay + R33*az)
Ml = Q*span*(-Clb*beta + Cla*da - Clp*p*span/(2*V))
Mm = Q*cbar*(Cm0 - Cma*alpha + Cme*de - Cmq*q*cbar/(2*V))
Mn = Q*span*(Cnb*beta - Cnr*r*span/(2*V) - Cnd*dr)
x' = R11*u + R12*v + R13*w
y' = R21*u + R22*v + R23*w
z' = R31*u + R32*v + R33*w
phi' = p + (q*sf + r*cf)*st/ct
th' = q*cf - r*sf
psi' = (q*sf + r*cf)/ct
u' = r*v - q*w + (Fx + Tx + (B - m*g)*st)/m
v' = p*w - r*u + (Fy + Ty - (B - m*g)*sf*ct)/m
w' = q*u - p*v + (Fz + Tz - (B - m*g)*cf*ct)/m
p' = ((Iy - Iz)*q*r + Ml - zc*Ty - zb*B*sf*ct)/Ix
q' = ((Iz - Ix)*p*r + Mm + zc*Tx - xc*Tz - zb*B*st)/Iy
r' = ((Ix - Iy)*p*q + Mn + xc*Ty)/Iz
"""

_BALLOON_PARAMETERS = {
    "W": 9.5, "rho0": 1.225, "S": 11.2, "m": 58.4, "g": 9.80665, "B": 812.5,
    "Ix": 96.1, "Iy": 213.7, "Iz": 198.3, "xc": 0.84, "zc": 1.92, "zb": 0.31,
    "kc": 5120.0, "L0": 148.5, "span": 4.31, "cbar": 9.6,
    "CLa": 1.37, "CL3": -0.82, "CLe": 0.21, "CD0": 0.071, "kD": 0.19, "kb": 0.44, "CT": 0.05,
    "CYb": 1.12, "CYr": 0.17, "Clb": 0.013, "Cla": 0.048, "Clp": 0.36,
    "Cm0": 0.021, "Cma": 0.29, "Cme": 0.14, "Cmq": 2.7, "Cnb": 0.33, "Cnr": 0.61, "Cnd": 0.11,
}  # fmt: skip


def balloon() -> Case:
    """A moored balloon in a steady wind; at rest with all controls neutral."""
    lines = _BALLOON.strip().replace("; ", "\n").splitlines()
    states = ["x", "y", "z", "phi", "th", "psi", "u", "v", "w", "p", "q", "r"]
    inputs = ["de", "dr", "da", "dT"]
    text = _plant(
        "Moored balloon", lines, states=states, inputs=inputs, parameters=_BALLOON_PARAMETERS
    )
    guess = {"x": -60.0, "z": -135.0, "th": 0.05}
    return Case(
        text=text,
        point=PointText(
            hold=tuple((name, 0) for name in inputs),
            guess={**dict.fromkeys(states, 0.0), **guess},
        ),
        near={name: 0.01 + 0.003 * k for k, name in enumerate((*states, *inputs))} | guess,
    )


def chain(n: int) -> Case:
    """A row of n hanging pendulums, held at an inclination each by its own torque."""
    decimals = _Decimals(seed=1000 + n)
    mass = [decimals.next(0.5, 1.5) for _ in range(n)]
    length = [decimals.next(0.4, 0.9) for _ in range(n)]
    parameters = {
        **{f"m{k}": float(v) for k, v in enumerate(mass)},
        **{f"l{k}": float(v) for k, v in enumerate(length)},
        "g": 9.81,
        "c": 0.02,
    }
    equations = [_link(n, k) for k in range(n)]
    states = [f"q{k}{prime}" for k in range(n) for prime in ("", "'")]
    inputs = [f"M{k}" for k in range(n)]
    angles = [decimals.next(0.1, 0.6) for _ in range(n)]
    return Case(
        text=_plant(
            f"Chain of {n}", equations, states=states, inputs=inputs, parameters=parameters
        ),
        point=PointText(hold=tuple((f"q{k}", a) for k, a in enumerate(angles))),
    )


def _link(n: int, k: int) -> str:
    def below(j: int) -> str:
        return "(" + " + ".join(f"m{i}" for i in range(max(j, k), n)) + ")"

    inertia = [f"{below(j)}*l{k}*l{j}*cos(q{k} - q{j})*q{j}''" for j in range(n)]
    spin = [f"{below(j)}*l{k}*l{j}*sin(q{k} - q{j})*q{j}'^2" for j in range(n) if j != k]
    weight = f"{below(k)}*g*l{k}*sin(q{k})"
    return " + ".join([*inertia, *spin, f"c*q{k}'", weight]) + f" = M{k}"
