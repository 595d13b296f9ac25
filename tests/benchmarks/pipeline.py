"""From text to f and its sparse Jacobian, ready to be called, and one call of it.

Targets: at least 100 times faster than the symbolic library at 12 states and 200 times at 200;
growth exponent at most 1.2 from 50 to 1000 states.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from statistics import median
from typing import TYPE_CHECKING

from measure import Comparison, compare, exponent, seconds_each
from plants import Case, case_of_size
from symbolic_library import prepared
from table import show, shown, times_over

from tangentbook.calculus.derive import gradients
from tangentbook.calculus.evaluate import Function
from tangentbook.plant.build import build_plant

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from tangentbook.calculus.derive import Gradient
    from tangentbook.calculus.graph import Node
    from tangentbook.plant.model import Plant

GROWTH_SIZES = (50, 200, 1000)
TARGETS = {12: "at least 100x", 200: "at least 200x"}
STAGES: tuple[str, ...] = ("parse and build", "derivatives", "generate and compile")


class Pipeline:
    """The stages one after the other, each keeping what the next one needs."""

    def __init__(self, case: Case) -> None:
        self.case = case
        self._plant: Plant | None = None
        self._function: Function | None = None
        self._rows: list[Gradient] = []

    @property
    def plant(self) -> Plant:
        """The plant of the last `build`."""
        if self._plant is None:
            self.build()
        assert self._plant is not None
        return self._plant

    @property
    def columns(self) -> tuple[str, ...]:
        """States and inputs."""
        return (*self.plant.states, *self.plant.inputs)

    @property
    def names(self) -> tuple[str, ...]:
        """The arguments of f."""
        return (*self.columns, *self.plant.parameters)

    @property
    def rates(self) -> list[Node]:
        """f: the solved rates."""
        return [node for block in self.plant.blocks for node in block.solved or ()]

    @property
    def values(self) -> list[float]:
        """Arguments at which f has a value."""
        given = {p.name: float(p.value) for p in self.case.text.parameters}
        return [{**given, **self.case.near}[name] for name in self.names]

    def build(self) -> None:
        """Text to plant."""
        self._plant = build_plant(self.case.text)

    def derive(self) -> None:
        """The sparse Jacobian as nodes."""
        self._rows = gradients(self.plant.graph, self.rates, self.columns)

    def generate(self) -> None:
        """The function, made and called once."""
        outputs = [*self.rates, *(node for row in self._rows for node in row.values())]
        self._function = Function(self.plant.graph, self.names, outputs)
        self.evaluate()

    @property
    def function(self) -> Function:
        """The function of the last `generate`."""
        assert self._function is not None
        return self._function

    def evaluate(self) -> list[float]:
        """Values of f and J at one point."""
        return self.function.floats(self.values)

    def run(self) -> None:
        """All stages."""
        self.build()
        self.derive()
        self.generate()


@dataclass(frozen=True, slots=True, kw_only=True)
class _Versus:
    n: int
    ready: Comparison
    call: Comparison


def against_the_symbolic_library(*, quick: bool) -> None:
    """The whole way and one evaluation, both in the same run."""
    sizes = (12, 50) if quick else (12, 50, 200)
    _versus(2, rounds=1)  # whatever the library sets up on first use
    found = [_versus(n, rounds=3) for n in sizes]
    show(
        "Text to f and sparse J, ready to be called",
        ["states", "own", "symbolic library", "ratio", "target"],
        [
            [
                str(v.n),
                shown(v.ready.median("own")),
                shown(v.ready.median("symbolic")),
                times_over(v.ready.ratio("symbolic", "own")),
                TARGETS.get(v.n, ""),
            ]
            for v in found
        ],
        note="The library starts from the same nodes (it does not read the text), differentiates "
        "each rate by the names in it, and names common parts once.",
    )
    show(
        "f and J at one point",
        ["states", "own", "symbolic library", "ratio"],
        [
            [
                str(v.n),
                shown(v.call.median("own")),
                shown(v.call.median("symbolic")),
                times_over(v.call.ratio("symbolic", "own")),
            ]
            for v in found
        ],
        note="Own: with the test that every value is finite.",
    )


def _versus(n: int, *, rounds: int) -> _Versus:
    own = Pipeline(case_of_size(n))
    own.run()
    graph, rates, columns, names = own.plant.graph, own.rates, own.columns, own.names

    def symbolic() -> None:
        prepared(graph, rates, columns, names)

    ready = compare({"own": own.run, "symbolic": symbolic}, rounds=rounds)
    theirs, values = prepared(graph, rates, columns, names), own.values
    _agree(own.evaluate(), list(theirs(values)))
    function = own.function
    call = compare(
        {"own": lambda: function.floats(values), "symbolic": lambda: theirs(values)},
        rounds=7,
        clock=seconds_each,
    )
    return _Versus(n=n, ready=ready, call=call)


def _agree(ours: Sequence[float], theirs: Sequence[float]) -> None:
    """A comparison of speed means something only between equal results (zeros may be left out)."""
    left, right = (sorted(v for v in values if abs(v) > 1e-12) for values in (ours, theirs))
    if len(left) != len(right) or not all(map(_close, left, right)):
        msg = f"the two routes differ: {len(left)} and {len(right)} values"
        raise ArithmeticError(msg)


def _close(a: float, b: float) -> bool:
    return math.isclose(a, b, rel_tol=1e-9, abs_tol=1e-12)


def growth(*, quick: bool) -> None:
    """How each stage grows with the size of a network."""
    times: dict[str, list[float]] = {stage: [] for stage in (*STAGES, "all")}
    for n in GROWTH_SIZES:
        rounds = 3 if quick else 7
        for stage, values in _stages(n, rounds=rounds).items():
            times[stage].append(median(values))
    show(
        "Growth of the stages, network of n states",
        ["stage", *(f"n = {n}" for n in GROWTH_SIZES), "exponent", "target"],
        [
            [
                stage,
                *map(shown, row),
                f"{exponent(GROWTH_SIZES, row):.2f}",
                "at most 1.2" if stage == "all" else "",
            ]
            for stage, row in times.items()
        ],
    )


def _stages(n: int, *, rounds: int) -> Mapping[str, list[float]]:
    own = Pipeline(case_of_size(n))
    jobs = dict(zip(STAGES, (own.build, own.derive, own.generate), strict=True))
    times = compare(jobs, rounds=rounds).times
    per_stage = {stage: list(values) for stage, values in times.items()}
    return {**per_stage, "all": [sum(t) for t in zip(*per_stage.values(), strict=True)]}
