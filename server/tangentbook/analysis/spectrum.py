"""Eigenvalues of A by two routes.

A is split into the strongly connected components of its pattern (structural zeros are exact), so
a row of zeros or a chain of integrators gives exact zero eigenvalues and no block is larger than
it must be. Blocks up to `HIGH_PRECISION_BLOCK` states: QR iteration in high precision (flint), then
confirmed by the coefficients of the characteristic polynomial (Berkowitz/Faddeev class algorithm,
no eigenvalue solver involved), which also holds for defective eigenvalues where double precision
loses half its digits. Larger blocks: LAPACK twice, on the balanced block and on its transpose
after an orthogonal change of basis, with the difference as stated accuracy.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from flint import acb, acb_mat, acb_poly, arb, arb_mat, ctx
from scipy.linalg import eigvals
from scipy.sparse import csr_array
from scipy.sparse.csgraph import connected_components

from tangentbook.analysis.settings import PRECISION

if TYPE_CHECKING:
    from collections.abc import Sequence

    from tangentbook.analysis.linear import LinearModel

HIGH_PRECISION_BLOCK = 24
_EXTRA_BITS = 8


@dataclass(frozen=True, slots=True, kw_only=True)
class Eigenvalue:
    """One eigenvalue in SI (per second, or per `time` unit of the equations).

    `radius` is the estimated distance from the truth; `exact` holds for those that structure gives.
    """

    value: acb
    radius: float
    exact: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Spectrum:
    """All eigenvalues, rightmost first, and how far the two routes differ (relative)."""

    eigenvalues: tuple[Eigenvalue, ...]
    disagreement: float
    route: str


def spectrum(model: LinearModel) -> Spectrum:
    """The eigenvalues of A; see the module docstring."""
    found: list[Eigenvalue] = []
    worst = 0.0
    routes: set[str] = set()
    for block in _blocks(model):
        if len(block) == 1:
            found.append(_single(model.rate_entry(block[0], block[0])))
            continue
        small = len(block) <= HIGH_PRECISION_BLOCK
        values, difference = _precise(_matrix(model, block)) if small else _double(model, block)
        routes.add("characteristic polynomial" if small else "double precision twice")
        found += values
        worst = max(worst, difference)
    ordered = sorted(found, key=_order)
    return Spectrum(
        eigenvalues=tuple(ordered),
        disagreement=worst,
        route=" and ".join(sorted(routes)) or "diagonal entries",
    )


def _order(eigenvalue: Eigenvalue) -> tuple[float, float]:
    # 12 digits: the members of a pair must not be torn apart by their last bits
    value = complex(eigenvalue.value)
    real = float(f"{value.real:.11e}") if abs(value.real) > 1e-13 * abs(value) else 0.0
    return -real, -value.imag


def _single(entry: arb) -> Eigenvalue:
    exact = entry.is_exact()
    return Eigenvalue(value=acb(entry), radius=float(entry.rad()), exact=exact and entry.is_zero())


def _blocks(model: LinearModel) -> list[list[str]]:
    states = model.states
    position = {name: k for k, name in enumerate(states)}
    pairs = [(position[r], position[c]) for r in states for c in model.rates[r] if c in position]
    rows, columns = [i for i, _ in pairs], [j for _, j in pairs]
    pattern = csr_array((np.ones(len(pairs)), (rows, columns)), shape=(len(states), len(states)))
    count, labels = connected_components(pattern, directed=True, connection="strong")
    groups: list[list[str]] = [[] for _ in range(count)]
    for name, label in zip(states, labels, strict=True):
        groups[int(label)].append(name)
    return groups


def _matrix(model: LinearModel, block: Sequence[str]) -> arb_mat:
    size = len(block)
    return arb_mat(size, size, [model.rate_entry(r, c) for r in block for c in block])


def _precise(matrix: arb_mat) -> tuple[list[Eigenvalue], float]:
    """High-precision QR iteration, confirmed by the characteristic polynomial."""
    matrix.nrows()
    precision = ctx.prec
    ctx.prec = PRECISION * _EXTRA_BITS // 4
    try:
        middle = _balanced(_without_doubt(matrix))
        values: Sequence[acb] = acb_mat(middle).eig(algorithm="approx")
        values = [acb(v.real.mid(), v.imag.mid()) for v in values]
        difference = _polynomial_difference(middle, values)
        radius = _radii(values, difference, _uncertainty(matrix), _norm(middle))
    finally:
        ctx.prec = precision
    return [
        Eigenvalue(value=_real_if_tiny(v, r), radius=r) for v, r in zip(values, radius, strict=True)
    ], difference


def _balanced(matrix: arb_mat) -> arb_mat:
    """Similarity by powers of two that evens out rows and columns (exact in binary)."""
    size = matrix.nrows()
    scale = [arb(1)] * size
    entries = [[float(abs(matrix[i, j]).mid()) for j in range(size)] for i in range(size)]
    for _ in range(6):
        for k in range(size):
            row = sum(entries[k][j] for j in range(size) if j != k)
            column = sum(entries[i][k] for i in range(size) if i != k)
            if row > 0 and column > 0:
                power = round(float(np.log2(row / column)) / 2)
                factor = 2.0**power
                scale[k] = scale[k] * arb(2) ** power
                for j in range(size):
                    entries[k][j] /= factor
                    entries[j][k] *= factor
    return arb_mat(
        size,
        size,
        [matrix[i, j] / scale[i] * scale[j] for i in range(size) for j in range(size)],
    ).mid()


def _without_doubt(matrix: arb_mat) -> arb_mat:
    """The midpoints, with 0 for every entry that may be zero (its bound counts as uncertainty)."""
    size = matrix.nrows()
    return arb_mat(
        size,
        size,
        [
            arb(0) if matrix[i, j].contains(0) else matrix[i, j].mid()
            for i in range(size)
            for j in range(size)
        ],
    )


def _uncertainty(matrix: arb_mat) -> float:
    size = matrix.nrows()
    entries = [matrix[i, j] for i in range(size) for j in range(size)]
    return max(float(abs(e).upper()) if e.contains(0) else float(e.rad()) for e in entries)


def _norm(matrix: arb_mat) -> float:
    """The largest row sum of absolute entries."""
    size = matrix.nrows()
    return max(
        float(sum((abs(matrix[i, j]) for j in range(size)), arb(0)).mid()) for i in range(size)
    )


def _polynomial_difference(matrix: arb_mat, values: Sequence[acb]) -> float:
    """Largest difference of the coefficients of det(s - A) and prod(s - lambda), relative.

    Scaled by the coefficients of prod(s + |lambda|), which bound what rounding may do.
    """
    expected = matrix.charpoly()
    product = acb_poly([1])
    bound = acb_poly([1])
    for value in values:
        product = product * acb_poly([-value, 1])
        bound = bound * acb_poly([abs(value), 1])
    worst = 0.0
    for k in range(len(values) + 1):
        size = float(abs(bound[k]).mid())
        error = float(abs(acb(expected[k]) - product[k]).upper())
        if error > 0:
            worst = max(worst, error / size if size > 0 else float("inf"))
    return worst


def _radii(
    values: Sequence[acb], difference: float, uncertainty: float, norm: float
) -> list[float]:
    """Estimated error of each eigenvalue: first order where it is separate, a root otherwise.

    The error of a root of a polynomial whose coefficients are off by eps (relative) is about
    eps * bound(|lambda|) / prod |lambda - mu|; where roots nearly coincide the k-th root of that.
    Sizes are relative to the norm of the (balanced) block.
    """
    size = len(values)
    largest = norm or 1.0
    shift = max(difference, uncertainty / largest, 1e-120)
    radii: list[float] = []
    for k, value in enumerate(values):
        gaps = [float(abs(value - other).mid()) for j, other in enumerate(values) if j != k]
        near = sum(1 for gap in gaps if gap < 1e-6 * largest)
        far = 1.0
        for gap in gaps:
            far *= max(gap / largest, 1e-8) if gap >= 1e-6 * largest else 1.0
        relative = min(shift / far, 1.0)
        radii.append(min(16 * size * largest * relative ** (1.0 / (near + 1)), largest))
    return radii


def _real_if_tiny(value: acb, radius: float) -> acb:
    """Parts within the radius of zero are printed as zero (with the radius beside)."""
    real, imag = value.real, value.imag
    if abs(imag) <= radius:
        imag = arb(0)
    if abs(real) <= radius:
        real = arb(0)
    return acb(real, imag)


def _double(model: LinearModel, block: Sequence[str]) -> tuple[list[Eigenvalue], float]:
    """LAPACK on the block and on its transpose in another basis."""
    size = len(block)
    position = {name: k for k, name in enumerate(block)}
    dense = np.zeros((size, size))
    for i, row in enumerate(block):
        for column, value in model.rates[row].items():
            if column in position:
                dense[i, position[column]] = float(value.mid())
    first = eigvals(dense)
    random = np.random.default_rng(size)
    basis, _ = np.linalg.qr(random.standard_normal((size, size)))
    second = eigvals(basis.T @ dense.T @ basis)
    largest = float(np.max(np.abs(first))) or 1.0
    radii = _matched_distance(first, second)
    values = [
        Eigenvalue(
            value=_real_if_tiny(acb(float(v.real), float(v.imag)), float(r)), radius=float(r)
        )
        for v, r in zip(first, np.maximum(radii * 4, largest * 1e-15), strict=True)
    ]
    return values, float(np.max(radii)) / largest


def _matched_distance(first: np.ndarray, second: np.ndarray) -> np.ndarray:
    from scipy.optimize import linear_sum_assignment  # only for large blocks

    distance = np.abs(first[:, None] - second[None, :])
    rows, columns = linear_sum_assignment(distance)
    result = np.zeros(len(first))
    result[rows] = distance[rows, columns]
    return result
