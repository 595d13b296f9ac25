"""Seeded starting points: what is guessed or typical first, then a reproducible spread."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from tangentbook.analysis.settings import START_SPREAD, STARTS

if TYPE_CHECKING:
    from collections.abc import Iterator

    import numpy.typing as npt

    Vector = npt.NDArray[np.float64]


def start_points(
    typical: Vector,
    declared: npt.NDArray[np.bool_],
    origin: Vector,
    guess: Vector,
    bounds: tuple[Vector, Vector],
) -> Iterator[Vector]:
    """Starts in a fixed order.

    Args:
        typical: (n,) typical sizes, SI.
        declared: (n,) whether the typical size was declared.
        origin: (n,) where the declared unit has its zero (273.15 K for degC).
        guess: (n,) guessed values, NaN where there is none.
        bounds: (n,) lower bounds, -inf for none, and upper bounds, inf for none.
    """
    low, high = bounds
    n = len(typical)
    guessed = ~np.isnan(guess)
    both = np.isfinite(low) & np.isfinite(high)
    bottom, width = np.where(both, low, 0.0), np.where(both, high, 0.0) - np.where(both, low, 0.0)

    def placed(values: Vector) -> Vector:
        inside = np.where(both, bottom + width / 2, values)
        values = np.where((values < low) | (values > high), inside, values)
        return np.where(guessed, guess, np.clip(values, low, high))

    yield placed(np.where(declared, typical, origin))
    yield placed(np.where(declared, 0.0, origin) + typical)
    random = np.random.default_rng(20240229)  # any constant: the starts must be the same everywhere
    for k in range(_count(n) - 2):
        # every quantity on its own, or all of one magnitude; all positive every third time, as
        # levels, temperatures and masses are
        spread = random.uniform(*START_SPREAD, n)
        common = random.uniform(*START_SPREAD) + random.uniform(-0.5, 0.5, n)
        size = typical * 10.0 ** (common if k % 3 else spread)
        sign = np.where((random.uniform(size=n) < 0.6) | (k % 3 == 2), 1.0, -1.0)
        start = np.where(both, bottom + width * random.uniform(size=n), origin + size * sign)
        # a guess is loosened: it may be a singular spot, and points near it are worth knowing
        reach = 0.1 * np.maximum(np.abs(guess), typical) * random.standard_normal(n)
        near = np.clip(guess + reach, low, high)
        yield np.where(guessed, near, placed(start))


def _count(n: int) -> int:
    return next(count for limit, count in STARTS if n <= limit)
