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
from flint import arb, arb_mat
from scipy.sparse.linalg import splu

from tangentbook.analysis.settings import (
    DENSE_UP_TO,
    RANK_TOLERANCE,
    REFINE_STEPS,
    REFINED_DIGITS_BITS,
    SLOW_REFINE_STEPS,
    SLOW_REFINE_UP_TO,
)

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    import numpy.typing as npt

    from tangentbook.analysis.system import System

    Vector = npt.NDArray[np.float64]

_GOAL = arb(2) ** -REFINED_DIGITS_BITS
_HALF = arb(2) ** -110


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
            c <= abs(v) * _GOAL or c <= f for c, v, f in zip(best, values, floors, strict=True)
        )
    if not settled and len(q) <= SLOW_REFINE_UP_TO:
        values, best, settled = _crawl(system, values, floors)
        # half the bits of the arithmetic is all that a multiple root gives
        best = [
            c.max((abs(v) + f / _GOAL) * _HALF)
            for c, v, f in zip(best, values, floors, strict=True)
        ]
    balls = [_ball(v, c, f) for v, c, f in zip(values, best, floors, strict=True)]
    return Refined(values=balls, residual=_relative(system, values, q, typical), settled=settled)


def _crawl(
    system: System, values: list[arb], floors: Sequence[arb]
) -> tuple[list[arb], list[arb], bool]:
    """Newton with a fresh Jacobian in every pass: a multiple root still gains a bit a pass."""
    rows, columns = system.shape
    change = [abs(v) + f for v, f in zip(values, floors, strict=True)]
    if rows != columns:
        return values, change, False
    for _ in range(SLOW_REFINE_STEPS):
        matrix = arb_mat(rows, columns)
        entries = zip(system.entries, system.ball_jacobian(values), strict=True)
        for (i, j, _), entry in entries:
            matrix[i, j] = entry.mid()
        residual = arb_mat(rows, 1, [r.mid() for r in system.ball_residual(values)])
        try:
            step = matrix.solve(residual).mid()
        except ZeroDivisionError:
            # the Jacobian has become singular to all bits: nothing more to gain
            break
        values = [(v - step[k, 0]).mid() for k, v in enumerate(values)]
        change = [arb(abs(step[k, 0]).upper()) for k in range(columns)]
        if not all(c.is_finite() for c in change):
            break
        if all(
            c <= abs(v) * _GOAL or c <= f for c, v, f in zip(change, values, floors, strict=True)
        ):
            return values, change, True
    return values, change, False


def _ball(value: arb, change: arb, floor: arb) -> arb:
    if abs(value) <= floor:
        value = arb(0)
        if change <= floor:
            return value
    radius = arb(change.upper()) * 8
    return value + arb(0, radius)


def _relative(system: System, values: Sequence[arb], q: Vector, typical: Vector) -> float:
    """The largest residual at the refined values, each against the size of its row."""
    residual = system.ball_residual(values)
    sizes = system.sizes(q, typical)
    return max(
        (float((abs(r).upper()) / s) for r, s in zip(residual, sizes, strict=True)), default=0.0
    )


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
