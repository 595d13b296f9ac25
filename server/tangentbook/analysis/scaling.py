"""Equilibration: what is singular must not depend on units or on sizes of 1e-9 beside 1e9."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    import numpy.typing as npt

    Vector = npt.NDArray[np.float64]
    Matrix = npt.NDArray[np.float64]


def equilibrate(matrix: Matrix, reference: Matrix | None = None) -> tuple[Matrix, Vector, Vector]:
    """Rows and columns scaled to largest entry 1 (Ruiz, 2001): scaled, row and column factors.

    With a `reference` it is that matrix which is scaled to 1, and the factors are applied.
    """
    scaled = np.abs(matrix if reference is None else reference)
    rows, columns = np.ones(matrix.shape[0]), np.ones(matrix.shape[1])
    for _ in range(12):
        r = np.sqrt(np.max(np.abs(scaled), axis=1, initial=0.0))
        c = np.sqrt(np.max(np.abs(scaled), axis=0, initial=0.0))
        r, c = np.where(r > 0, r, 1.0), np.where(c > 0, c, 1.0)
        scaled = scaled / r[:, None] / c[None, :]
        rows, columns = rows / r, columns / c
    return matrix * rows[:, None] * columns[None, :], rows, columns
