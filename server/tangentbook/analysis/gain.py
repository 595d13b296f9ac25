"""The gain at rest (s = 0): y per u once everything has settled, D - C A^-1 B."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from flint import arb_mat

from tangentbook.analysis.settings import RANK_TOLERANCE

if TYPE_CHECKING:
    from tangentbook.analysis.linear import LinearModel


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Gain:
    """`matrix` over outputs and inputs in SI, or None with the reason `why`."""

    matrix: arb_mat | None
    why: str = ""
    conditioning: float = 1.0


def dc_gain(model: LinearModel) -> Gain:
    """The gain at rest of a linear model (balls, SI)."""
    states, inputs, outputs = model.states, model.inputs, model.outputs
    if not inputs:
        return Gain(matrix=None, why="the plant has no input")
    idle = [name for name in states if not any(name in row for row in model.rates.values())]
    if idle:
        return Gain(
            matrix=None,
            why=f"no rate depends on {', '.join(idle)}: A has a zero column and no inverse "
            "(an input that is kept on makes it grow without end)",
        )
    a = model.dense()
    b = arb_mat(len(states), len(inputs), [model.rate_entry(s, u) for s in states for u in inputs])
    try:
        settled = a.solve(b)
    except ZeroDivisionError:
        return Gain(
            matrix=None,
            why="A could not be shown to be invertible: it has an eigenvalue 0 "
            "or one too close to it",
        )
    conditioning = _condition(a)
    if conditioning > 1 / RANK_TOLERANCE**1.5:
        return Gain(matrix=None, why="A is singular to the digits known", conditioning=conditioning)
    c = arb_mat(
        len(outputs), len(states), [model.output_entry(y, s) for y in outputs for s in states]
    )
    d = arb_mat(
        len(outputs), len(inputs), [model.output_entry(y, u) for y in outputs for u in inputs]
    )
    return Gain(matrix=d - c * settled, conditioning=conditioning)


def _condition(a: arb_mat) -> float:
    size = a.nrows()
    dense = np.array([[float(a[i, j].mid()) for j in range(size)] for i in range(size)])
    scale = np.maximum(np.max(np.abs(dense), axis=1), 1e-300)
    return float(np.linalg.cond(dense / scale[:, None]))
