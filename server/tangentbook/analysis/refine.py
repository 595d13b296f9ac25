"""From the double-precision point to 45 digits: simplified Newton in ball arithmetic.

    q <- mid(q - Y r(q)),  Y a double-precision (pseudo-)inverse of J

Each pass gains about as many digits as Y is good for; where J is singular at the point the passes
use J anew and gain less. What comes back is a ball around the last iterate whose radius is
several times the last change: an estimate, not an enclosure.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from flint import arb
from scipy.sparse.linalg import splu

from tangentbook.analysis.settings import (
    DENSE_UP_TO,
    RANK_TOLERANCE,
    REFINE_STEPS,
    REFINED_DIGITS_BITS,
)

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    import numpy.typing as npt

    from tangentbook.analysis.system import System

    Vector = npt.NDArray[np.float64]

_GOAL = arb(2) ** -REFINED_DIGITS_BITS


@dataclass(frozen=True, slots=True, kw_only=True)
class Refined:
    """Values as balls (radius: estimated error), and the largest residual over its terms."""

    values: list[arb]
    residual: float
    settled: bool


def refine(system: System, q: Vector, typical: Vector) -> Refined:
    """Refine a solution; `settled` says whether the digits stopped moving at the aim.

    Args:
        system: the rows.
        q: (n,) the double-precision solution, SI.
        typical: (n,) typical sizes, which bound the accuracy of values near zero.
    """
    values = [arb(float(v)) for v in q]
    floors = [arb(float(t)) * _GOAL for t in typical]
    inverse = _inverse(system, q)
    best = [arb(float(abs(v)) + float(t)) for v, t in zip(q, typical, strict=True)]
    settled = not len(q)
    for _ in range(REFINE_STEPS):
        if settled:
            break
        residual = system.ball_residual(values)
        if not all(r.is_finite() for r in residual):
            break
        step = _correction(inverse, residual)
        values = [(v - d).mid() for v, d in zip(values, step, strict=True)]
        change = [abs(d).upper() for d in step]
        best = [arb(c) for c in change]
        settled = all(
            c <= abs(v) * _GOAL or c <= f
            for c, v, f in zip(best, values, floors, strict=True)
        )
    balls = [_ball(v, c, f) for v, c, f in zip(values, best, floors, strict=True)]
    return Refined(values=balls, residual=_relative(system, values), settled=settled)


def _ball(value: arb, change: arb, floor: arb) -> arb:
    if abs(value) <= floor:
        value = arb(0)
        if change <= floor:
            return value
    radius = arb(change.upper()) * 8
    return value + arb(0, radius)


def _relative(system: System, values: Sequence[arb]) -> float:
    sizes = system.ball_term_sizes(values)
    residual = system.ball_residual(values)
    worst = 0.0
    for r, size in zip(residual, sizes, strict=True):
        top = abs(r).upper()
        if float(top) == 0.0:
            continue
        bottom = float(size.mid())
        worst = max(worst, float(top) / bottom if bottom > 0 else float("inf"))
    return worst


Solve = "Callable[[list[arb]], list[arb]]"


def _inverse(system: System, q: Vector) -> Callable[[list[float]], Vector]:
    _, entries = system.both(q)
    rows, columns = system.shape
    if rows == columns and columns > DENSE_UP_TO:
        try:
            factor = splu(system.sparse(entries))
        except RuntimeError:
            pass
        else:
            return lambda right: factor.solve(np.array(right))
    matrix = system.dense(entries)
    col = 1.0 / np.where((c := np.max(np.abs(matrix), axis=0, initial=0.0)) > 0, c, 1.0)
    row = 1.0 / np.where((r := np.max(np.abs(matrix * col), axis=1, initial=0.0)) > 0, r, 1.0)
    inverse = np.linalg.pinv(matrix * col * row[:, None], rcond=RANK_TOLERANCE)
    return lambda right: col * (inverse @ (row * np.array(right)))


def _correction(inverse: Callable[[list[float]], Vector], residual: list[arb]) -> list[arb]:
    """Y r in double precision, with r scaled to the range of doubles first."""
    largest = max((abs(r).upper() for r in residual), default=arb(0))
    if not largest > 0:
        return [arb(0)] * len(inverse([0.0] * len(residual)))
    scale = arb(largest)
    step = inverse([float((r / scale).mid()) for r in residual])
    return [arb(float(s)) * scale for s in step]
