# pyright: reportUnknownMemberType=false, reportUnknownVariableType=false
# pyright: reportUnknownArgumentType=false, reportUnknownLambdaType=false
"""Comparisons with stated tolerances: what came, what was expected, and where they differ."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
import pytest
from scipy.optimize import linear_sum_assignment

if TYPE_CHECKING:
    from collections.abc import Sequence

PRINTED = 6e-10
"""Relative tolerance of a number printed with 10 significant digits: half a unit of the last one,
at worst 5e-10 of the number."""

NOTHING = 1e-15
"""Absolute tolerance of a published 0 where the case itself is rounded to 20 digits."""


def about(value: object, *, rel: float = PRINTED, absolute: float = 0.0) -> object:
    """A number, or a list of them, to compare with: equal within rel * |value| or absolute."""
    return pytest.approx(value, rel=rel, abs=absolute)


def differences(
    found: Sequence[Sequence[float]],
    expected: Sequence[Sequence[Any]],
    *,
    rel: float = PRINTED,
    absolute: float = 0.0,
) -> list[tuple[int, int, float, float]]:
    """The entries beyond rel * |expected| + absolute, as (row, column, found, expected)."""
    assert len(found) == len(expected)
    wrong: list[tuple[int, int, float, float]] = []
    for i, (row, other) in enumerate(zip(found, expected, strict=True)):
        for j, (value, wanted) in enumerate(zip(row, other, strict=True)):
            if abs(float(wanted) - value) > rel * abs(float(wanted)) + absolute:
                wrong.append((i, j, value, float(wanted)))
    return wrong


def distance(found: Sequence[complex], expected: Sequence[complex]) -> list[tuple[float, complex]]:
    """Two lists without order: for each expected value the distance of its partner."""
    assert len(found) == len(expected), (found, expected)
    table = np.abs(np.subtract.outer(np.array(expected), np.array(found)))
    rows, columns = linear_sum_assignment(table)
    return [(float(table[i, j]), expected[int(i)]) for i, j in zip(rows, columns, strict=True)]


def same_spectrum(
    found: Sequence[complex], expected: Sequence[complex], *, rel: float = PRINTED
) -> bool:
    """Whether two spectra agree; parts are judged against the size of their eigenvalue."""
    # both parts are rounded on their own, hence the factor for the distance in the plane
    return all(gap <= 1.5 * rel * abs(value) + NOTHING for gap, value in distance(found, expected))
