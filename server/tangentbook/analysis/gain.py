"""The gain at rest (s = 0): y per u once everything has settled, D - C A^-1 B.

Small plants: solved in balls. Larger ones: sparse LU in double precision, then iterative refinement
with residuals in 256-bit arithmetic (Wilkinson, "Rounding Errors in Algebraic Processes", 1963),
whose last correction is the stated radius.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from flint import arb, arb_mat
from scipy.sparse import csc_array
from scipy.sparse.linalg import splu

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    import numpy.typing as npt

    from tangentbook.analysis.linear import LinearModel

    Vector = npt.NDArray[np.float64]

DENSE_STATES = 60
CORRECTIONS = 12
_SETTLED = arb(2) ** -150
_KNOWN = (
    arb(2) ** -40
)  # an entry known to fewer digits says that A is singular to those of the point


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Gain:
    """`matrix` over outputs and inputs in SI, or None with the reason `why`."""

    matrix: arb_mat | None
    why: str = ""


def dc_gain(model: LinearModel) -> Gain:
    """The gain at rest of a linear model (balls, SI)."""
    states, inputs, outputs = model.states, model.inputs, model.outputs
    if not inputs:
        return Gain(matrix=None, why="the plant has no input")
    moved = {column for row in model.rates.values() for column in row}
    idle = [name for name in states if name not in moved]
    if idle:
        return Gain(
            matrix=None,
            why=f"no rate depends on {', '.join(idle)}: A has a zero column and no inverse "
            "(an input that is kept on makes it grow without end)",
        )
    solve = _dense if len(states) <= DENSE_STATES else _refined
    empty: list[list[arb]] = [[] for _ in inputs]
    settled = solve(model) if states else empty
    if settled is None:
        return Gain(
            matrix=None,
            why="A could not be shown to be invertible: it has an eigenvalue 0 or one too close "
            "to it",
        )
    matrix = arb_mat(len(outputs), len(inputs))
    position = {name: k for k, name in enumerate(states)}
    for i, output in enumerate(outputs):
        for j, column in enumerate(inputs):
            total = model.output_entry(output, column)
            for name, value in model.output_rows[output].items():
                if name in position:
                    total -= value * settled[j][position[name]]
            matrix[i, j] = total
    return Gain(matrix=matrix)


def _dense(model: LinearModel) -> list[list[arb]] | None:
    """A^-1 B by columns, in balls."""
    states, inputs = model.states, model.inputs
    a = model.dense()
    b = arb_mat(len(states), len(inputs), [model.rate_entry(s, u) for s in states for u in inputs])
    try:
        settled = a.solve(b)
    except ZeroDivisionError:
        return None
    entries = [settled[i, j] for i in range(len(states)) for j in range(len(inputs))]
    if any(e.rad() > abs(e.mid()) * _KNOWN and not e.contains(0) for e in entries):
        return None
    return [[settled[i, j] for i in range(len(states))] for j in range(len(inputs))]


def _refined(model: LinearModel) -> list[list[arb]] | None:
    """A^-1 B by columns: sparse LU, corrected by exact residuals until the digits settle."""
    states = model.states
    position = {name: k for k, name in enumerate(states)}
    rows = [[(position[c], v) for c, v in model.rates[s].items() if c in position] for s in states]
    solve = _sparse_lu(rows)
    if solve is None:
        return None
    columns: list[list[arb]] = []
    for name in model.inputs:
        right = [model.rate_entry(s, name) for s in states]
        column = _corrected(rows, solve, right)
        if column is None:
            return None
        columns.append(column)
    return columns


def _sparse_lu(rows: Sequence[Sequence[tuple[int, arb]]]) -> Callable[[Vector], Vector] | None:
    entries = [(i, j, float(v.mid())) for i, row in enumerate(rows) for j, v in row]
    if not entries:
        return None
    i, j, values = (np.array(part) for part in zip(*entries, strict=True))
    size = len(rows)
    scale = np.zeros(size)
    np.maximum.at(scale, i, np.abs(values))
    if not scale.all():
        return None
    matrix = csc_array((values / scale[i], (i, j)), shape=(size, size))
    try:
        factor = splu(matrix)
    except RuntimeError:  # exactly singular
        return None
    return lambda right: factor.solve(right / scale)


def _corrected(
    rows: Sequence[Sequence[tuple[int, arb]]],
    solve: Callable[[Vector], Vector],
    right: Sequence[arb],
) -> list[arb] | None:
    x = [arb(0)] * len(rows)
    change = arb(0)
    largest = arb(0)
    for _ in range(CORRECTIONS):
        residual = [
            (b - sum((v * x[j] for j, v in row), arb(0))).mid()
            for row, b in zip(rows, right, strict=True)
        ]
        size = arb(max((abs(r).upper() for r in residual), default=arb(0)))
        if not size > 0:
            return x
        step = solve(np.array([float((r / size).mid()) for r in residual]))
        if not np.isfinite(step).all():
            return None
        x = [(v + arb(float(d)) * size).mid() for v, d in zip(x, step, strict=True)]
        change = size * arb(float(np.max(np.abs(step))))
        largest = arb(max(abs(v).upper() for v in x))
        if change <= largest * _SETTLED:
            radius = change * 8 + largest * _SETTLED
            return [v + arb(0, radius.upper()) for v in x]
    return None
