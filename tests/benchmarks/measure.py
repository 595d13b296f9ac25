"""Timing on a shared machine: candidates in turn, medians, ratios within one round.

A single time says little where other work shares the processor. So the candidates of a comparison
run one after the other in every round, and the ratio that counts is the median of the ratios of
the rounds. A growth exponent is the slope of log(time) against log(size), from the medians.
"""

from __future__ import annotations

import gc
import math
import statistics
from dataclasses import dataclass
from time import perf_counter
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping, Sequence


def seconds(job: Callable[[], object]) -> float:
    """One run. What exists before it is set aside from garbage collection.

    Otherwise a candidate would pay for walking over what another one has left in its caches.
    """
    gc.collect()
    gc.freeze()
    try:
        begin = perf_counter()
        job()
        return perf_counter() - begin
    finally:
        gc.unfreeze()


def seconds_each(job: Callable[[], object], *, at_least: float = 0.02) -> float:
    """The time of one of many runs of a job too short to be timed alone."""
    count = 1
    while True:
        begin = perf_counter()
        for _ in range(count):
            job()
        elapsed = perf_counter() - begin
        if elapsed >= at_least:
            return elapsed / count
        count *= 4


@dataclass(frozen=True, slots=True, kw_only=True)
class Comparison:
    """Times of candidates, round by round."""

    times: Mapping[str, Sequence[float]]

    def median(self, name: str) -> float:
        """The middle time of a candidate."""
        return statistics.median(self.times[name])

    def ratio(self, slow: str, fast: str) -> float:
        """How many times longer `slow` takes: the median over rounds."""
        pairs = zip(self.times[slow], self.times[fast], strict=True)
        return statistics.median(a / b for a, b in pairs)


def compare(
    jobs: Mapping[str, Callable[[], object]],
    *,
    rounds: int,
    clock: Callable[[Callable[[], object]], float] = seconds,
) -> Comparison:
    """Time the jobs in turn, `rounds` times."""
    times: dict[str, list[float]] = {name: [] for name in jobs}
    for _ in range(rounds):
        for name, job in jobs.items():
            times[name].append(clock(job))
    return Comparison(times=times)


def exponent(sizes: Sequence[int], times: Sequence[float]) -> float:
    """The power of the size with which the time grows (least squares in logarithms)."""
    x, y = [math.log(n) for n in sizes], [math.log(t) for t in times]
    return statistics.linear_regression(x, y).slope
