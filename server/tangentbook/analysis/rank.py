"""Rank decisions at a point: what is undetermined, redundant, or blocks.

All on the equilibrated Jacobian of the full system (every row, every quantity), so that neither
units nor sizes of 1e-9 beside 1e9 decide. A direction in the null space is only called
undetermined if the solution really continues along it; at a double root it does not.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from flint import arb

from tangentbook.analysis.scaling import equilibrate
from tangentbook.analysis.settings import RANK_TOLERANCE, RESIDUAL_LIMIT
from tangentbook.analysis.system import neighbours
from tangentbook.calculus.balls import largest_size
from tangentbook.calculus.derive import gradients
from tangentbook.calculus.evaluate import DomainError, Function

if TYPE_CHECKING:
    from collections.abc import Sequence

    import numpy.typing as npt

    from tangentbook.analysis.system import System
    from tangentbook.calculus.graph import Node

    Vector = npt.NDArray[np.float64]
    Matrix = npt.NDArray[np.float64]

# a direction is followed this far (in scaled quantities) to see whether the solutions go along
_FOLLOW = 1e-3
_SHARE = 1e-6


def _singular(system: System, q: Vector, typical: Vector) -> tuple[Matrix, Vector, Matrix, Vector]:
    _, entries = system.both(q)
    matrix = system.dense(entries)
    scaled, _, columns = equilibrate(matrix, _nearby(system, q, typical, matrix))
    u, s, vt = np.linalg.svd(scaled, full_matrices=True)
    return u, s, vt, columns


def _nearby(system: System, q: Vector, typical: Vector, matrix: Matrix) -> Matrix:
    """The largest size of each entry of J in a small neighbourhood.

    At a double root whole rows or columns of J vanish; measured by themselves they would look as
    good as any other.
    """
    largest = np.abs(matrix)
    for moved in neighbours(q, typical):
        try:
            largest = np.maximum(largest, np.abs(system.dense(system.both(moved)[1])))
        except DomainError:
            continue
    return largest


@dataclass(frozen=True, slots=True, kw_only=True)
class Freedom:
    """What the rows leave open at a point.

    `loose`: the quantities left open; `singular`: whether J is singular there; `conditioning`: the
    condition number of the equilibrated J.
    """

    loose: tuple[str, ...]
    singular: bool
    conditioning: float


def freedom(system: System, q: Vector, typical: Vector, low: Vector, high: Vector) -> Freedom:
    """The free quantities that the rows leave open at q, and how well they fix the others."""
    if not system.shape[1]:
        return Freedom(loose=(), singular=False, conditioning=1.0)
    try:
        _, s, vt, columns = _singular(system, q, typical)
    except DomainError:
        return Freedom(loose=(), singular=True, conditioning=float("inf"))
    full = np.zeros(system.shape[1])
    full[: len(s)] = s
    null = vt[full <= RANK_TOLERANCE * max(float(full[0]), 1e-300)]
    conditioning = float(full[0] / full[-1]) if full[-1] > 0 else float("inf")
    if not len(null):
        return Freedom(loose=(), singular=False, conditioning=conditioning)
    # back to quantities relative to their size, where shares can be compared
    directions = (null * columns) / np.maximum(typical, np.abs(q))
    directions /= np.linalg.norm(directions, axis=1, keepdims=True)
    open_ = [d for d in directions if _continues(system, q, d, typical, (low, high))]
    if not open_:
        return Freedom(loose=(), singular=True, conditioning=conditioning)
    weight = np.max(np.abs(np.array(open_)), axis=0)
    names = tuple(n for n, w in zip(system.free, weight, strict=True) if w > _SHARE)
    return Freedom(loose=names, singular=True, conditioning=conditioning)


def _continues(
    system: System,
    q: Vector,
    direction: Vector,
    typical: Vector,
    bounds: tuple[Vector, Vector],
) -> bool:
    """Whether solutions go on along a null direction (a continuum, not a double root)."""
    scale = np.maximum(typical, np.abs(q))
    for sign in (1.0, -1.0):
        trial = q + sign * _FOLLOW * scale * direction
        if np.any(trial < bounds[0]) or np.any(trial > bounds[1]):
            continue
        pinned = int(np.argmax(np.abs(direction)))
        if _lands_at(system, trial, pinned, typical):
            return True
    return False


def _lands_at(system: System, trial: Vector, pinned: int, typical: Vector) -> bool:
    """Gauss-Newton with one quantity pinned: does it reach a solution?"""
    q = trial.copy()
    scale = np.maximum(typical, np.abs(q))
    for _ in range(12):
        try:
            residual, entries = system.both(q)
        except DomainError:
            return False
        sizes = system.sizes(q, typical)
        if np.max(np.abs(residual) / sizes, initial=0.0) <= RESIDUAL_LIMIT * 1e-3:
            return True
        matrix = system.dense(entries) * scale
        matrix[:, pinned] = 0.0
        weight = np.max(np.abs(matrix), axis=1, initial=0.0)
        weight = 1.0 / np.where(weight > 0, weight, 1.0)
        step = np.linalg.lstsq(matrix * weight[:, None], -residual * weight, rcond=RANK_TOLERANCE)[
            0
        ]
        q = q + scale * step
    return False


def _full(system: System, q: Vector) -> tuple[Matrix, Vector]:
    """Jacobian of all rows over all columns, and the residuals."""
    conditions, plant = system.conditions, system.plant
    graph = plant.graph
    rows = [row.residual for row in conditions.rows]
    columns = [name for name in conditions.columns if name not in conditions.assumed]
    position = {name: k for k, name in enumerate(columns)}
    partials = gradients(graph, rows, columns)
    entries = [(i, position[n], node) for i, row in enumerate(partials) for n, node in row.items()]
    function = Function(graph, system.names, [node for _, _, node in entries])
    matrix = np.zeros((len(rows), len(columns)))
    for (i, j, _), value in zip(entries, function.floats(system.point(q)), strict=True):
        matrix[i, j] = value
    return matrix, _unit_residual(system, rows, q)


def _unit_residual(system: System, rows: Sequence[Node], q: Vector) -> Vector:
    """The residuals scaled to largest 1, from balls: doubles may not see them at all."""
    point = system.ball_point([arb(float(v)) for v in q])
    values = Function(system.plant.graph, system.names, rows).balls(point)
    values = [arb(0) if v.contains(0) else v.mid() for v in values]
    largest = largest_size(values)
    if not largest > 0:
        return np.zeros(len(rows))
    return np.array([float((v / largest).mid()) for v in values])


def redundant(system: System, q: Vector) -> tuple[str, ...]:
    """Rows implied by the rows before them: conditions that agree and add nothing."""
    conditions = system.conditions
    spare = len(conditions.rows) - (len(conditions.columns) - len(conditions.assumed))
    if spare <= 0 and len(conditions.rows) > 60:
        return ()
    try:
        matrix, _ = _full(system, q)
    except DomainError:  # a derivative is infinite here: nothing can be said of ranks
        return ()
    scaled, _, _ = equilibrate(matrix)
    # equations first, then rest, then holds: a condition is redundant against what stands before
    basis = np.zeros((0, matrix.shape[1]))
    names: list[str] = []
    for row, label in zip(scaled, (r.label for r in conditions.rows), strict=True):
        rest = row - basis.T @ (basis @ row)
        rest = rest - basis.T @ (basis @ rest)
        norm = float(np.linalg.norm(rest))
        if norm <= RANK_TOLERANCE * max(float(np.linalg.norm(row)), 1e-300):
            names.append(label)
        else:
            basis = np.vstack([basis, rest / norm])
    return tuple(names)


def blocking(system: System, q: Vector) -> tuple[tuple[str, ...], bool]:
    """The rows that contradict each other at q, and whether that is for want of rank.

    The projection of the residual on the left null space of the whole Jacobian weighs the rows: no
    change of any quantity can reduce that part.
    """
    try:
        matrix, residual = _full(system, q)
    except DomainError:
        return (), False
    scaled, rows, _ = equilibrate(matrix)
    u, s, _ = np.linalg.svd(scaled, full_matrices=True)
    full = np.zeros(matrix.shape[0])
    full[: len(s)] = s
    rankless = full <= 1e-6 * max(float(full[0]), 1e-300)
    left = u[:, rankless]
    projected = left @ (left.T @ (rows * residual)) if left.size else rows * residual
    weight = np.abs(projected)
    largest = float(np.max(weight, initial=0.0))
    if largest == 0.0:
        return (), False
    labels = [row.label for row in system.conditions.rows]
    named = [label for label, w in zip(labels, weight, strict=True) if w > 1e-3 * largest]
    # that rates are zero is what "at rest" means; naming it helps nobody
    names = tuple(label for label in named if not label.endswith("= 0 at rest")) or tuple(named)
    return names, bool(left.size) and _generic_rank(system, q) < matrix.shape[0]


def _generic_rank(system: System, q: Vector) -> int:
    """The rank of the full Jacobian at points around q (at q itself it may be lower by chance)."""
    random = np.random.default_rng(7)
    best = 0
    for spread in (0.1, 0.3, 1.0):
        moved = q + spread * np.maximum(np.abs(q), 1.0) * random.standard_normal(len(q))
        try:
            scaled, _, _ = equilibrate(_full(system, moved)[0])
        except DomainError:
            continue
        s = np.linalg.svd(scaled, compute_uv=False)
        best = max(best, int(np.sum(s > 1e-6 * max(float(s[0]), 1e-300))))
    return best
