"""Second routes for every entry of A, B, C, D, and the remainder of the linear model.

*Differences.* The original equations are solved again at points displaced by 2^-40 typical sizes
in 256-bit arithmetic, columns that no row shares together (Curtis, Powell, Reid, 1974). The
central difference is exact to about 2^-80, and it never sees a derivative node.

*Remainder.* For a displacement d of each column, in ball arithmetic,

    |f(x0 + d) - f(x0) - A d|  <=  sup over the segment of |f''| / 2

where the right side is the second Taylor coefficient enclosed over the whole segment. With steps
this small the bound is far below any error that matters, so a wrong entry of A must show.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from flint import arb, arb_series

from tangentbook.analysis.rates import NoBranchError, Rates
from tangentbook.analysis.settings import DIFFERENCE_BITS
from tangentbook.calculus.balls import largest_size

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from tangentbook.analysis.linear import LinearModel, Row

_STEP = arb(2) ** -DIFFERENCE_BITS
_TINY = arb(2) ** -400


@dataclass(frozen=True, slots=True, kw_only=True)
class Confirmation:
    """Largest relative disagreement of a route, and the entry where it occurred."""

    value: float | None
    entry: str = ""
    why: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Surroundings:
    """The point for the second routes: values in SI, unknowns, and typical sizes of the columns."""

    rates: Rates
    base: Sequence[arb]
    unknowns: Mapping[str, arb]
    columns: tuple[str, ...]
    typical: Mapping[str, arb]

    def displaced(self, group: Sequence[str], factor: int) -> list[arb]:
        """The base values with the columns of a group moved by `factor` steps."""
        moved = list(self.base)
        offset = len(moved) - len(self.columns)
        for column in group:
            place = offset + self.columns.index(column)
            moved[place] = (moved[place] + factor * self.step(column)).mid()
        return moved

    def step(self, column: str) -> arb:
        """The displacement of one column."""
        return self.typical[column] * _STEP


def column_groups(model: LinearModel, columns: Sequence[str]) -> list[list[str]]:
    """Columns that share no row, greedily: they may be displaced together."""
    rows_of: dict[str, set[str]] = {column: set() for column in columns}
    for kind, rows in (("x", model.unknowns), ("y", model.output_rows)):
        for name, row in rows.items():
            for column in row:
                rows_of[column].add(kind + name)
    groups: list[tuple[list[str], set[str]]] = []
    for column in columns:
        for members, taken in groups:
            if not taken & rows_of[column]:
                members.append(column)
                taken.update(rows_of[column])
                break
        else:
            groups.append(([column], set(rows_of[column])))
    return [members for members, _ in groups]


def by_differences(at: Surroundings, model: LinearModel) -> Confirmation:
    """Compare every entry with central differences of the original equations."""
    worst = _Worst(model, at)
    for group in column_groups(model, at.columns):
        try:
            ahead = at.rates.values(at.displaced(group, 1), at.unknowns)
            back = at.rates.values(at.displaced(group, -1), at.unknowns)
        except NoBranchError:
            return Confirmation(value=None, why=f"no values beside the point along {group[0]}")
        if not _solves(at.rates, ahead) or not _solves(at.rates, back):
            return Confirmation(
                value=None, why="the original equations are not met beside the point"
            )
        here = [*at.base, *(at.unknowns[name] for name in at.rates.plant.unknowns)]
        offset = len(at.base)
        for k, name in enumerate(at.rates.plant.unknowns, start=offset):
            bend = abs(ahead[k] + back[k] - 2 * here[k]) / 2
            worst.add(name, group, (ahead[k] - back[k]) / 2, bend=bend)
        rows = zip(
            model.outputs,
            at.rates.outputs(ahead),
            at.rates.outputs(back),
            at.rates.outputs(here),
            strict=True,
        )
        for output, high, low, middle in rows:
            bend = abs(high + low - 2 * middle) / 2
            worst.add_output(output, group, (high - low) / 2, bend=bend)
        worst.add_chain(group)
    return worst.result()


def _solves(rates: Rates, values: Sequence[arb]) -> bool:
    """Whether the values satisfy the original equations, as far as 256 bits can tell."""
    limit = arb(2) ** -100 * (1 + largest_size(values))
    return all(abs(r) < limit for r in rates.residuals(values))


def by_remainder(at: Surroundings, model: LinearModel) -> Confirmation:
    """Compare the remainder of every entry with half the bound of the second derivative."""
    worst = _Worst(model, at)
    unit = arb("0.5", "0.5")  # the segment [0, 1]
    for group in column_groups(model, at.columns):
        offset = len(at.base) - len(at.columns)
        base: list[object] = list(at.base)
        for column in group:
            place = offset + at.columns.index(column)
            step = at.step(column)
            base[place] = arb_series([at.base[place] + step * unit, step, 0], 3)
        steps = {column: at.step(column) for column in group}
        reach = {name: _reach(row, steps) for name, row in model.unknowns.items()}
        try:
            ahead = at.rates.values(at.displaced(group, 1), at.unknowns)
            series = at.rates.series(base, at.unknowns, reach)
        except NoBranchError:
            return Confirmation(value=None, why=f"no enclosure of the unknowns along {group[0]}")
        bounds = [_second(s) for s in series[len(at.base) :]]
        here = [at.unknowns[name] for name in at.rates.plant.unknowns]
        for k, name in enumerate(at.rates.plant.unknowns):
            worst.add(name, group, ahead[len(at.base) + k] - here[k], slack=bounds[k])
        outputs = at.rates.output_series(series)
        start = at.rates.outputs([*at.base, *here])
        end = at.rates.outputs(ahead)
        for k, output in enumerate(model.outputs):
            worst.add_output(output, group, end[k] - start[k], slack=_second(outputs[k]))
        worst.add_chain(group)
    return worst.result()


def _reach(row: Row, steps: Mapping[str, arb]) -> arb:
    """How far an unknown is expected to move: what the model says, generously, and a little."""
    total = _TINY + max(steps.values(), key=float) * arb(2) ** -60
    for column in row.keys() & steps.keys():
        total += 4 * abs(row[column]) * steps[column]
    return total


def _second(series: object) -> arb:
    if isinstance(series, arb_series):
        return arb(abs(series[2]).upper())
    return arb(0)


class _Worst:
    """Collects the largest relative disagreement over all entries.

    `slack` is what a change may differ by (the remainder's bound), `bend` the size of the second
    difference; both tell how curved a row is where it has no slope to be judged against.
    """

    def __init__(self, model: LinearModel, at: Surroundings) -> None:
        self.model = model
        self.at = at
        self.value = arb(0)
        self.entry = ""
        # algebraic unknowns have rows of their own; the rates stand in A and B
        self.rows = {**model.unknowns, **{s + "'": model.rates[s] for s in model.states}}

    def add(
        self,
        name: str,
        group: Sequence[str],
        change: arb,
        *,
        slack: arb | None = None,
        bend: arb | None = None,
    ) -> None:
        """One row of a group: the change of an unknown against what the model says."""
        self._compare(name, self.rows.get(name, {}), group, change, (slack, bend))

    def add_output(
        self,
        name: str,
        group: Sequence[str],
        change: arb,
        *,
        slack: arb | None = None,
        bend: arb | None = None,
    ) -> None:
        """The same for an output."""
        row = self.model.output_rows[name]
        self._compare(f"output {name}", row, group, change, (slack, bend))

    def add_chain(self, group: Sequence[str]) -> None:
        """Rows of states whose rate is itself a state: it moves by its own step, exactly."""
        for state in self.model.states:
            rate = state + "'"
            if rate in self.at.columns:
                change = self.at.step(rate) if rate in group else arb(0)
                self._compare(rate, self.rows[rate], group, change, (None, None))

    def _compare(
        self,
        name: str,
        row: Row,
        group: Sequence[str],
        change: arb,
        tolerance: tuple[arb | None, arb | None],
    ) -> None:
        slack, bend = tolerance
        predicted = arb(0)
        own: str | None = None
        for column in group:
            if column in row:
                predicted += row[column] * self.at.step(column)
                own = column
        error = abs(change - predicted)
        if slack is not None:
            error = (error - slack).max(arb(0))
        scale = self._scale(row, own, slack if bend is None else bend)
        relative = arb(error.upper()) / scale
        if relative > self.value or not relative.is_finite():
            self.value = relative
            self.entry = f"{name} / {own or group[0]}"

    def _scale(self, row: Row, own: str | None, bend: arb | None) -> arb:
        """The entry's own effect; the row's largest where the entry is zero."""
        effects = {
            column: arb(abs(value).upper()) * self.at.step(column)
            for column, value in row.items()
            if not value.contains(0)
        }
        largest = arb(0)
        for effect in effects.values():
            largest = largest.max(effect)
        if own in effects:
            # an entry a million million times smaller than its row is judged as that much smaller
            return effects[own].max(largest * arb("1e-12"))
        if effects:
            return largest
        # a flat row: what its slope becomes a typical size away
        curved = arb(0) if bend is None else bend / _STEP
        return curved.max(_STEP * arb("1e-12"))

    def result(self) -> Confirmation:
        """The finding; None where a disagreement could not be computed."""
        if not self.value.is_finite():
            return Confirmation(value=None, why=f"no finite difference at {self.entry}")
        return Confirmation(value=float(self.value.upper()), entry=self.entry)
