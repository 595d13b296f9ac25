"""How the point moves with the parameters: dq/dp = -J^-1 dr/dp (implicit function theorem).

Derived parameters and held values move along: they are put into the rows before differentiating.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from tangentbook.analysis.settings import SENSITIVITY_ENTRIES
from tangentbook.analysis.system import System
from tangentbook.calculus.derive import gradients
from tangentbook.calculus.evaluate import DomainError, Function

if TYPE_CHECKING:
    from tangentbook.analysis.trim import OperatingPoint
    from tangentbook.calculus.graph import Node


def sensitivities(point: OperatingPoint) -> dict[str, dict[str, float]] | None:
    """Found name -> parameter -> derivative, in SI; None where J is not square and regular."""
    plant, conditions, constants = point.plant, point.conditions, point.constants
    system = System(plant, constants, conditions)
    independent = [n for n in constants.names if not plant.graph.leaves([constants.raw[n]])]
    rows, columns = system.shape
    if rows != columns or point.singular or rows * len(independent) > SENSITIVITY_ENTRIES:
        return None
    q = np.array([point.first[n] for n in system.free])
    moving = _moving_rows(point)
    entries = [
        (i, independent.index(name), node)
        for i, row in enumerate(gradients(plant.graph, moving, independent))
        for name, node in row.items()
    ]
    function = Function(plant.graph, system.names, [node for _, _, node in entries])
    right = np.zeros((rows, len(independent)))
    try:
        values = function.floats(system.point(q))
        matrix = system.dense(system.both(q)[1])
    except DomainError:
        return None
    for (i, j, _), value in zip(entries, values, strict=True):
        right[i, j] = value
    scale = np.max(np.abs(matrix), axis=1, initial=0.0)
    scale = np.where(scale > 0, scale, 1.0)[:, None]
    try:
        moved = -np.linalg.solve(matrix / scale, right / scale)
    except np.linalg.LinAlgError:
        return None
    return {
        name: {p: float(moved[i, j]) for j, p in enumerate(independent) if moved[i, j] != 0}
        for i, name in enumerate(system.free)
    }


def _moving_rows(point: OperatingPoint) -> list[Node]:
    graph = point.plant.graph
    conditions, constants = point.conditions, point.constants
    rows = [conditions.rows[k].residual for k in conditions.open_rows]
    held = {graph.var(n): node for n, node in conditions.fixed.items()}
    rows = graph.substitute(rows, held)
    derived = {
        graph.var(n): constants.raw[n] for n in constants.names if graph.leaves([constants.raw[n]])
    }
    for _ in range(len(derived)):
        replaced = graph.substitute(rows, derived)
        if replaced == rows:
            break
        rows = replaced
    return rows
