"""The operating point: found, shown to be one, or shown why there is none.

Not the count of conditions decides but rank and consistency of the whole system at the point
found (or at the closest approach): conditions that agree are redundant, conditions that
contradict block each other, directions left free are undetermined.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from itertools import islice
from typing import TYPE_CHECKING

import numpy as np
from flint import arb, ctx

from tangentbook.analysis import rank
from tangentbook.analysis.conditions import Conditions, PointText, understand_point
from tangentbook.analysis.constants import Constants
from tangentbook.analysis.newton import Attempt, descend, solve
from tangentbook.analysis.refine import Refined, refine
from tangentbook.analysis.settings import (
    OTHER_POINTS,
    PRECISION,
    REFINED_RESIDUAL_LIMIT,
    RESIDUAL_LIMIT,
    RUN_OFF,
    SAME_POINT,
    SLOW_STARTS,
    WORST_MOVE,
    WORST_RADIUS,
)
from tangentbook.analysis.starts import start_points
from tangentbook.analysis.system import System
from tangentbook.calculus.evaluate import DomainError

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping, Sequence

    import numpy.typing as npt

    from tangentbook.plant.model import Plant

    Vector = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class OperatingPoint:
    """A point of the equations, SI, in the order of `conditions.columns`.

    `values` are balls whose radius is the estimated error; `first` the same values from the
    double-precision iteration alone (the other route).
    """

    plant: Plant
    constants: Constants
    conditions: Conditions
    values: dict[str, arb]
    first: dict[str, float]
    residual: float
    settled: bool
    conditioning: float
    redundant: tuple[str, ...]
    others: tuple[dict[str, float], ...]
    singular: bool


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class NoPoint:
    """Why there is no operating point, with the closest approach."""

    plant: Plant
    constants: Constants
    conditions: Conditions
    reason: str
    why: str
    blocking: tuple[str, ...] = ()
    undetermined: tuple[str, ...] = ()
    closest: dict[str, float] = field(default_factory=dict[str, float])
    residual: float | None = None


def find_point(plant: Plant, text: PointText) -> OperatingPoint | NoPoint:
    """Find the operating point that a request describes.

    Raises:
        PointError: the request itself cannot be understood.
    """
    ctx.prec = PRECISION  # whatever the caller left: the same numbers in every process
    constants = Constants(plant, text.set)
    conditions = understand_point(plant, text)
    with np.errstate(all="ignore"):  # far-off starts may overflow; they are judged by the outcome
        return _found(plant, constants, conditions)


def _found(plant: Plant, constants: Constants, conditions: Conditions) -> OperatingPoint | NoPoint:
    if "t" in plant.graph.leaves([row.residual for row in conditions.rows]):
        return NoPoint(
            plant=plant,
            constants=constants,
            conditions=conditions,
            reason="depends on time",
            why="the equations contain the time t explicitly, so no values stay at rest",
        )
    system = System(plant, constants, conditions)
    search = _Search(system)
    attempts = search.run()
    solved = [a for a in attempts if a.solved]
    if not solved:
        return _no_point(search, attempts)
    for chosen in search.by_nearness(solved):
        refined = refine(system, chosen.q, search.typical)
        if _holds(system, refined, chosen.q, search.typical):
            return _point(search, chosen, refined, solved)
    return _no_point(search, attempts)


def _holds(system: System, refined: Refined, q: Vector, typical: Vector) -> bool:
    """Whether the refinement ran onto the candidate and its conditions are met to all digits."""
    if refined.residual > (REFINED_RESIDUAL_LIMIT if refined.settled else RESIDUAL_LIMIT):
        return False
    if not system.met(refined.values):
        return False
    sizes = np.maximum(np.abs(q), typical)
    if np.any(np.abs(q) > RUN_OFF * typical):
        return False
    known = [float(v.rad()) <= WORST_RADIUS * s for v, s in zip(refined.values, sizes, strict=True)]
    moved = [abs(float(v.mid()) - x) for v, x in zip(refined.values, q, strict=True)]
    return all(known) and bool(np.all(np.array(moved) <= WORST_MOVE * sizes))


class _Search:
    """The starts of one point and what came of them."""

    def __init__(self, system: System) -> None:
        self.system = system
        plant, conditions = system.plant, system.conditions
        value = system.constants.value
        self.typical = np.ones(len(system.free))
        self.declared = np.zeros(len(system.free), dtype=np.bool_)
        self.period = np.full(len(system.free), np.inf)
        self.guess = np.full(len(system.free), np.nan)
        self.origin = np.zeros(len(system.free))
        self.low = np.full(len(system.free), -np.inf)
        self.high = np.full(len(system.free), np.inf)
        for k, name in enumerate(system.free):
            variable = plant.variables.get(name)
            unit = plant.unit_of(name)
            if variable is not None and variable.typical is not None:
                self.typical[k] = abs(float(value(variable.typical).mid())) or 1.0
                self.declared[k] = True
            elif unit is not None:
                self.typical[k] = float(unit.factor.p) / float(unit.factor.q) * np.pi**unit.pi_power
                self.origin[k] = float(unit.offset.p) / float(unit.offset.q)
            if variable is not None and variable.period is not None:
                self.period[k] = abs(float(value(variable.period).mid()))
            elif unit is None or not unit.dimension:
                # may be an angle: whole turns apart is no other point worth a caution
                self.period[k] = 2 * np.pi
            if name in conditions.guess:
                self.guess[k] = float(value(conditions.guess[name]).mid())
            low, high = conditions.bounds.get(name, (None, None))
            self.low[k] = -np.inf if low is None else float(value(low).mid())
            self.high[k] = np.inf if high is None else float(value(high).mid())

    def run(self) -> list[Attempt]:
        """All starts, in their fixed order."""
        found: list[Attempt] = []
        for start in self._starts():
            attempt = solve(self.system, start, self.typical, self.low, self.high)
            if attempt is not None:
                found.append(attempt)
            if not len(self.system.free):
                return found
        if any(a.solved for a in found):
            return found
        starts = self._starts()
        slow = (
            descend(self.system, start, self.typical, self.low, self.high)
            for start in islice(starts, SLOW_STARTS)
        )
        return found + [attempt for attempt in slow if attempt is not None]

    def _starts(self) -> Iterator[Vector]:
        return start_points(
            self.typical, self.declared, self.origin, self.guess, (self.low, self.high)
        )

    def by_nearness(self, solved: Sequence[Attempt]) -> Sequence[Attempt]:
        """The solutions by their distance from the guess, else in the order of the starts."""
        guessed = ~np.isnan(self.guess)
        if not guessed.any():
            return solved
        return sorted(
            solved,
            key=lambda a: float(np.linalg.norm(((a.q - self.guess) / self.typical)[guessed])),
        )

    def unwound(self, q: Vector) -> Vector:
        """The same point with whole turns taken off, where that is one."""
        turning = np.isfinite(self.period)
        period = np.where(turning, self.period, 1.0)
        turns = np.where(turning, np.round(q / period), 0.0)
        nearer = q - turns * np.where(turning, self.period, 0.0)
        try:
            residual = self.system.residual(nearer) / self.system.sizes(nearer, self.typical)
        except DomainError:
            return q
        return nearer if np.max(np.abs(residual), initial=0.0) <= RESIDUAL_LIMIT else q

    def same(self, a: Vector, b: Vector) -> bool:
        """Whether two solutions are one point (angles up to their period)."""
        difference = np.abs(a - b)
        turning = np.isfinite(self.period)
        period = np.where(turning, self.period, 1.0)
        difference -= np.where(turning, np.round(difference / period) * period, 0.0)
        difference = np.abs(difference)
        scale = np.maximum(self.typical * 1e-3, np.maximum(np.abs(a), np.abs(b)))
        return bool(np.all(difference <= SAME_POINT * scale))


def _point(
    search: _Search, chosen: Attempt, refined: Refined, solved: Sequence[Attempt]
) -> OperatingPoint | NoPoint:
    system = search.system
    q = np.array([float(v.mid()) for v in refined.values])
    bounds = (search.low, search.high)
    freedom = rank.freedom(system, q, search.typical, *bounds)
    if freedom.loose:
        # at a special point some quantities seem fixed; the union over a few points names them all
        more = [rank.freedom(system, a.q, search.typical, *bounds).loose for a in solved[:4]]
        every = {name for names in (freedom.loose, *more) for name in names}
        return _undetermined(search, chosen, tuple(n for n in system.free if n in every))
    values = _values(search, refined.values)
    return OperatingPoint(
        plant=system.plant,
        constants=system.constants,
        conditions=system.conditions,
        values=values,
        first=_named(search, chosen.q),
        residual=residual_at(system, values, search.typical),
        settled=refined.settled,
        conditioning=freedom.conditioning,
        redundant=() if freedom.singular else rank.redundant(system, chosen.q),
        others=_others(search, q, solved),
        singular=freedom.singular,
    )


def residual_at(system: System, values: Mapping[str, arb], typical: Vector) -> float:
    """The largest residual at the values that are given out, each against the size of its row."""
    free = [values[name].mid() for name in system.free]
    sizes = system.sizes(np.array([float(v) for v in free]), typical)
    residual = system.ball_residual(free)
    return max(
        (float(abs(r).upper() / s) for r, s in zip(residual, sizes, strict=True)), default=0.0
    )


def _others(search: _Search, q: Vector, solved: Sequence[Attempt]) -> tuple[dict[str, float], ...]:
    """Other points that some start reached; refined, so that a poor copy of one is not two."""
    found = [q]
    for attempt in solved:
        if len(found) > OTHER_POINTS:
            break
        if any(search.same(attempt.q, other) for other in found):
            continue
        refined = refine(search.system, attempt.q, search.typical)
        if not refined.settled or refined.residual > REFINED_RESIDUAL_LIMIT:
            continue
        other = search.unwound(np.array([float(v.mid()) for v in refined.values]))
        if not any(search.same(other, known) for known in found):
            found.append(other)
    return tuple(_named(search, other) for other in found[1:])


def _undetermined(search: _Search, attempt: Attempt, loose: tuple[str, ...]) -> NoPoint:
    return NoPoint(
        plant=search.system.plant,
        constants=search.system.constants,
        conditions=search.system.conditions,
        reason="undetermined",
        why=f"the conditions leave {', '.join(loose)} undetermined; hold one of them (or another "
        "quantity that fixes it)",
        undetermined=loose,
        closest=_named(search, attempt.q),
        residual=attempt.residual,
    )


def _assumed(search: _Search, name: str) -> arb:
    guess = search.system.conditions.guess.get(name)
    unit = search.system.plant.unit_of(name)
    nothing = arb(0) if unit is None else arb(unit.offset)  # 0 degC, not 0 K
    return nothing if guess is None else search.system.constants.value(guess)


def _values(search: _Search, free: Sequence[arb]) -> dict[str, arb]:
    """All quantities of the point in the order of the columns."""
    system, conditions = search.system, search.system.conditions
    found = dict(zip(system.free, free, strict=True))
    for name in conditions.assumed:
        found[name] = _assumed(search, name)
    for name, node in conditions.fixed.items():
        found[name] = system.constants.value(node)
    return {name: found[name] for name in conditions.columns}


def _named(search: _Search, q: Vector) -> dict[str, float]:
    values = _values(search, [arb(float(v)) for v in q])
    return {name: float(value.mid()) for name, value in values.items()}


def _no_point(search: _Search, attempts: Sequence[Attempt]) -> NoPoint:
    system = search.system
    conditions = system.conditions
    if not attempts:
        start = np.clip(search.typical, search.low, search.high)
        blame = system.blame(start)
        where = f": {blame[0]} has no value there ({blame[1]})" if blame else ""
        return NoPoint(
            plant=system.plant,
            constants=system.constants,
            conditions=conditions,
            reason="outside domain",
            why=f"every start lies where an equation has no value{where}; give a guess inside the "
            "domain, or typical sizes",
            blocking=(blame[0],) if blame else (),
        )
    closest = min(attempts, key=lambda a: a.residual)
    blocking, contradiction = rank.blocking(system, closest.q)
    bounded = [
        name
        for name, value, low, high in zip(
            system.free, closest.q, search.low, search.high, strict=True
        )
        if value in (low, high)
    ]
    conflict = contradiction and closest.converged and not bounded
    shown = ", ".join(blocking) or "the equations"
    if conflict:
        why = f"these conditions contradict each other: {shown}; drop or change one of the holds"
    else:
        limits = f"; at its bound: {', '.join(bounded)}" if bounded else ""
        why = (
            "no start reached a point that meets all conditions (that none exists is not shown); "
            f"at the closest approach these block each other: {shown}{limits}; try a guess, "
            "typical sizes or other values"
        )
    return NoPoint(
        plant=system.plant,
        constants=system.constants,
        conditions=conditions,
        reason="conflict" if conflict else "not found",
        why=why,
        blocking=blocking,
        closest=_named(search, closest.q),
        residual=closest.residual,
    )
