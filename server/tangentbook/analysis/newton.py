"""Damped Gauss-Newton iteration for the equations of a point.

    step: minimise |D_r (r + J D_c s)|, q+ = q + lambda D_c s

in scaled quantities (D_c: typical sizes, D_r: row equilibration), least squares of any rank by
SVD for small systems, sparse LU for large square ones. Damping by the natural monotonicity test:
the simplified step after lambda must be shorter (Deuflhard, "Newton Methods for Nonlinear
Problems", 2004, sec. 3.3 and 4.3), which does not depend on the scaling of the rows.
"""

from __future__ import annotations

import warnings
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import csc_array, diags_array
from scipy.sparse.linalg import splu

from tangentbook.analysis.scaling import equilibrate
from tangentbook.analysis.settings import (
    DENSE_UP_TO,
    NEWTON_STEPS,
    NEWTON_TOLERANCE,
    POLISHING_STEPS,
    RANK_TOLERANCE,
    RESIDUAL_LIMIT,
    SMALLEST_DAMPING,
)
from tangentbook.calculus.evaluate import DomainError

if TYPE_CHECKING:
    from collections.abc import Callable

    import numpy.typing as npt

    from tangentbook.analysis.system import System

    Vector = npt.NDArray[np.float64]
    Solve = Callable[[Vector], Vector]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Attempt:
    """Where one start led: `solved` is judged by the residual against its terms."""

    q: Vector
    solved: bool
    residual: float
    converged: bool


def solve(
    system: System, start: Vector, typical: Vector, low: Vector, high: Vector
) -> Attempt | None:
    """Iterate from one start; None where the start lies outside the domain of an equation.

    Args:
        system: the rows.
        start: (n,) first values, SI.
        typical: (n,) typical sizes, SI, positive.
        low: (n,) hard lower bounds, -inf for none.
        high: (n,) hard upper bounds, inf for none.
    """
    q = np.clip(start, low, high)
    try:
        residual, entries = system.both(q)
    except DomainError:
        return None
    converged = False
    for _ in range(NEWTON_STEPS):
        scale = np.maximum(typical, np.abs(q))
        try:
            back = _least_squares(system, entries, scale)
        except DomainError:
            return None
        d = back(-residual)
        length = float(np.linalg.norm(d))
        if float(np.max(np.abs(d), initial=0.0)) <= NEWTON_TOLERANCE:
            q = _polished(system, q, np.clip(q + scale * d, low, high), (low, high))
            converged = True
            break
        moved = _damped(system, q, (scale, d, length), back, (low, high))
        if moved is None:
            break
        q, residual, entries = moved
    return _judged(system, q, typical, converged=converged)


def _polished(system: System, q: Vector, last: Vector, bounds: tuple[Vector, Vector]) -> Vector:
    """The last full steps, while they shrink and stay inside the domain."""
    size = _relative(last, q)
    for _ in range(POLISHING_STEPS):
        try:
            residual, entries = system.both(last)
            scale = np.maximum(np.abs(last), 1e-300)
            step = scale * _least_squares(system, entries, scale)(-residual)
        except DomainError:
            return q
        q, last = last, np.clip(last + step, *bounds)
        moved = _relative(last, q)
        if moved == 0 or moved > size:
            return q
        size = moved
    return q


def _relative(a: Vector, b: Vector) -> float:
    """The largest relative change of a value."""
    return float(np.max(np.abs(a - b) / np.maximum(np.abs(a), 1e-300), initial=0.0))


def descend(
    system: System, start: Vector, typical: Vector, low: Vector, high: Vector
) -> Attempt | None:
    """The closest approach from one start: bounded least squares (trust region).

    Used where the Newton iteration got stuck: it stops at a local minimum of the residual, which
    is a solution or shows which rows block each other.
    """
    from scipy.optimize import least_squares  # slow to import, and only needed here

    start = np.clip(start, low, high)
    try:
        weight = 1.0 / system.sizes(start, typical)
        system.both(start)
    except DomainError:
        return None

    def residual(s: Vector) -> Vector:
        try:
            return np.clip(weight * system.residual(s * typical), -1e100, 1e100)
        except DomainError:
            return np.full(system.shape[0], 1e100)

    def jacobian(s: Vector) -> Vector:
        try:
            return system.dense(system.both(s * typical)[1]) * weight[:, None] * typical
        except DomainError:
            return np.zeros(system.shape)

    wide = np.where(high > low, high, low + 1e-12 * typical)
    inside = np.clip(start / typical, low / typical, wide / typical)
    found = least_squares(
        residual,
        inside,
        jacobian,
        bounds=(low / typical, wide / typical),
        x_scale="jac",
        xtol=1e-15,
        ftol=1e-15,
        gtol=1e-15,
        max_nfev=200,
    )
    q = np.clip(found.x * typical, low, high)
    try:
        return _judged(system, q, typical, converged=found.status > 0)
    except DomainError:
        return None


def _judged(system: System, q: Vector, typical: Vector, *, converged: bool) -> Attempt:
    sizes = system.sizes(q, typical)
    residual = float(np.max(np.abs(system.residual(q)) / sizes, initial=0.0))
    return Attempt(q=q, solved=residual <= RESIDUAL_LIMIT, residual=residual, converged=converged)


def _damped(
    system: System,
    q: Vector,
    step: tuple[Vector, Vector, float],
    back: Solve,
    bounds: tuple[Vector, Vector],
) -> tuple[Vector, Vector, Vector] | None:
    scale, d, length = step
    damping = 1.0
    while damping >= SMALLEST_DAMPING:
        trial = np.clip(q + damping * scale * d, *bounds)
        try:
            residual, entries = system.both(trial)
        except DomainError:
            damping /= 4
            continue
        simplified = float(np.linalg.norm(back(-residual)))
        if simplified <= (1 - damping / 4) * length and np.any(trial != q):
            return trial, residual, entries
        damping /= 2
    return None


def _least_squares(system: System, entries: Vector, scale: Vector) -> Solve:
    """The map from a right side to the (scaled) step."""
    count, unknowns = system.shape
    if count == unknowns and unknowns > DENSE_UP_TO:
        sparse = _sparse_solve(system, entries, scale)
        if sparse is not None:
            return sparse
    matrix = system.dense(entries) * scale
    if not np.isfinite(matrix).all():  # far out, the Jacobian overflows once it is scaled
        raise DomainError
    equal, rows, columns = equilibrate(matrix)
    u, s, vt = np.linalg.svd(equal, full_matrices=False)
    keep = s > RANK_TOLERANCE * max(float(s[0]) if len(s) else 0.0, 1e-300)
    u, s, vt = u[:, keep], s[keep], vt[keep]
    return lambda right: columns * (vt.T @ ((u.T @ (rows * right)) / s))


def _sparse_solve(system: System, entries: Vector, scale: Vector) -> Solve | None:
    matrix = system.sparse(entries) @ diags_array(scale)
    weight = _row_weight(abs(matrix).max(axis=1).toarray().ravel())
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        try:
            factor = splu(csc_array(diags_array(weight) @ matrix))
        except (RuntimeError, Warning):
            return None
    if not np.isfinite(factor.solve(np.ones(len(weight)))).all():
        return None
    return lambda right: factor.solve(weight * right)


def _row_weight(largest: Vector) -> Vector:
    return 1.0 / np.where(largest > 0, largest, 1.0)
