"""The unknowns w (highest rates and algebraic) as functions of states and inputs.

    F(w, x, u) = 0  ->  w(x, u)

in the solving order of the plant: runs of blocks that were solved symbolically are evaluated
directly, every other block by Newton's iteration on its own few equations, starting from known
values near by. Works on numbers of high precision and on truncated power series over balls
(where an enclosure of the block's solution over the segment is proved first, by Krawczyk's test).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from flint import arb, arb_mat, arb_series

from tangentbook.calculus.balls import largest_size
from tangentbook.calculus.derive import gradients
from tangentbook.calculus.evaluate import Function

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from tangentbook.calculus.graph import Node
    from tangentbook.plant.model import Block, Plant

NEWTON_PASSES = 40
WIDENINGS = 8
_SETTLED = arb(2) ** -200


class NoBranchError(ArithmeticError):
    """The unknowns cannot be followed to these values (singular, or outside a domain)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class _Explicit:
    """Unknowns given as expressions over states, inputs and earlier unknowns."""

    unknowns: tuple[str, ...]
    function: Function


@dataclass(frozen=True, slots=True, kw_only=True)
class _Implicit:
    """Unknowns to be solved for together: residuals, and their Jacobian row by row."""

    unknowns: tuple[str, ...]
    residual: Function
    jacobian: Function


class Rates:
    """Evaluates w and then outputs at given states, inputs and parameters."""

    def __init__(self, plant: Plant, parameters: Sequence[str]) -> None:
        self.plant = plant
        self.base = (*parameters, *plant.states, *plant.inputs)
        self.names = (*self.base, *plant.unknowns)
        self._position = {name: k for k, name in enumerate(self.names)}
        self._stages = self._make_stages()
        self._outputs = Function(plant.graph, self.names, [o.node for o in plant.outputs])
        self._residuals = Function(plant.graph, self.names, [e.residual for e in plant.equations])

    def _make_stages(self) -> list[_Explicit | _Implicit]:
        stages: list[_Explicit | _Implicit] = []
        run: list[Block] = []
        for block in self.plant.blocks:
            if block.solved is not None:
                run.append(block)
                continue
            if run:
                stages.append(self._explicit(run))
                run = []
            stages.append(self._implicit(block))
        if run:
            stages.append(self._explicit(run))
        return stages

    def _explicit(self, run: Sequence[Block]) -> _Explicit:
        graph = self.plant.graph
        known: dict[Node, Node] = {}
        names: list[str] = []
        for block in run:
            assert block.solved is not None  # noqa: S101 - only solved blocks are collected
            nodes = graph.substitute(block.solved, known) if known else list(block.solved)
            for name, node in zip(block.unknowns, nodes, strict=True):
                known[graph.var(name)] = node
                names.append(name)
        return _Explicit(
            unknowns=tuple(names), function=Function(graph, self.names, list(known.values()))
        )

    def _implicit(self, block: Block) -> _Implicit:
        graph = self.plant.graph
        rows = [self.plant.equations[k].residual for k in block.equations]
        zero = graph.const(0)
        entries = [
            row.get(name, zero)
            for row in gradients(graph, rows, block.unknowns)
            for name in block.unknowns
        ]
        return _Implicit(
            unknowns=block.unknowns,
            residual=Function(graph, self.names, rows),
            jacobian=Function(graph, self.names, entries),
        )

    def values(self, base: Sequence[arb], near: Mapping[str, arb]) -> list[arb]:
        """All values in the order of `names`; `near` holds unknowns of a point close by.

        Raises:
            NoBranchError: a block could not be solved from there.
        """
        values = [*base, *(near[name] for name in self.plant.unknowns)]
        for stage in self._stages:
            if isinstance(stage, _Explicit):
                found = stage.function.balls(values)
            else:
                found = self._newton(stage, values)
            self._store(values, stage.unknowns, [v.mid() for v in found])
        return values

    def _store(self, values: list[Any], names: Sequence[str], found: Sequence[Any]) -> None:
        for name, value in zip(names, found, strict=True):
            values[self._position[name]] = value

    def _newton(self, stage: _Implicit, values: list[arb]) -> list[arb]:
        size = len(stage.unknowns)
        places = [self._position[name] for name in stage.unknowns]
        inverse = _inverse(stage, [v.mid() for v in values])
        for _ in range(NEWTON_PASSES):
            left = stage.residual.balls(values)
            if all(r.contains(0) for r in left):  # nothing but rounding is left
                return [values[place] for place in places]
            residual = arb_mat(size, 1, left)
            step = (inverse * residual).mid()
            for k, place in enumerate(places):
                values[place] = (values[place] - step[k, 0]).mid()
            moved = largest_size(step[k, 0] for k in range(size))
            size_now = largest_size(values[place] for place in places)
            if not moved.is_finite():  # the iteration left the domain
                raise NoBranchError
            if moved <= size_now * _SETTLED:
                return [values[place] for place in places]
        raise NoBranchError

    def outputs(self, values: Sequence[arb]) -> list[arb]:
        """Outputs at values from `values`."""
        return self._outputs.balls(values)

    def residuals(self, values: Sequence[arb]) -> list[arb]:
        """What is left of the original equations at values from `values`."""
        return self._residuals.balls(values)

    def series(
        self, base: Sequence[Any], center: Mapping[str, arb], reach: Mapping[str, arb]
    ) -> list[Any]:
        """W along a straight segment as power series of length 3 over balls.

        Args:
            base: parameters, states, inputs; a ball, or a series whose head covers the segment.
            center: unknowns at one point of the segment.
            reach: how far each unknown is expected to move along it.

        Raises:
            NoBranchError: no enclosure of an implicit block over the segment was proved.
        """
        values: list[Any] = [*base, *(center[name] for name in self.plant.unknowns)]
        for stage in self._stages:
            if isinstance(stage, _Explicit):
                found = stage.function.series(values)
            else:
                found = self._implicit_series(stage, values, center, reach)
            self._store(values, stage.unknowns, found)
        return values

    def output_series(self, values: Sequence[Any]) -> list[Any]:
        """Output series at values from `series`."""
        return self._outputs.series(values)

    def _implicit_series(
        self,
        stage: _Implicit,
        values: list[Any],
        center: Mapping[str, arb],
        reach: Mapping[str, arb],
    ) -> list[Any]:
        heads = [_head(v) for v in values]
        box = self._enclosure(stage, heads, center, reach)
        self._store(heads, stage.unknowns, box)
        size = len(stage.unknowns)
        matrix = arb_mat(size, size, stage.jacobian.balls(heads))
        coefficients: list[list[Any]] = [[b] for b in box]
        for order in (1, 2):
            padded = [arb_series([*c, 0], 3) for c in coefficients]
            self._store(values, stage.unknowns, padded)
            residual = [_coefficient(r, order) for r in stage.residual.series(values)]
            try:
                solution = matrix.solve(arb_mat(size, 1, residual))
            except ZeroDivisionError:
                raise NoBranchError from None
            for k, c in enumerate(coefficients):
                c.append(-solution[k, 0])
        return [arb_series(c, 3) for c in coefficients]

    def _enclosure(
        self,
        stage: _Implicit,
        heads: list[Any],
        center: Mapping[str, arb],
        reach: Mapping[str, arb],
    ) -> list[arb]:
        """A box that contains the block's one solution for every point of the segment."""
        middle = [center[name].mid() for name in stage.unknowns]
        radius = [reach[name] for name in stage.unknowns]
        at_center = list(heads)
        self._store(at_center, stage.unknowns, middle)
        inverse = _inverse(stage, [h.mid() for h in at_center])
        size = len(middle)
        unit = arb_mat(size, size, [int(i == j) for i in range(size) for j in range(size)])
        for _ in range(WIDENINGS):
            box = [m + arb(0, arb(r.upper())) for m, r in zip(middle, radius, strict=True)]
            over = list(heads)
            self._store(over, stage.unknowns, box)
            residual = arb_mat(size, 1, stage.residual.balls(at_center))
            slopes = arb_mat(size, size, stage.jacobian.balls(over))
            spread = arb_mat(size, 1, [b - m for b, m in zip(box, middle, strict=True)])
            image = -(inverse * residual) + (unit - inverse * slopes) * spread
            krawczyk = [m + image[k, 0] for k, m in enumerate(middle)]
            if all(b.contains_interior(k) for b, k in zip(box, krawczyk, strict=True)):
                return krawczyk
            radius = [r * 4 + abs(image[k, 0]) * 2 for k, r in enumerate(radius)]
            if not all(r.is_finite() for r in radius):
                break
        raise NoBranchError


def _inverse(stage: _Implicit, values: Sequence[arb]) -> arb_mat:
    size = len(stage.unknowns)
    try:
        return arb_mat(size, size, stage.jacobian.balls(values)).inv().mid()
    except ZeroDivisionError:
        raise NoBranchError from None


def _head(value: Any) -> arb:  # noqa: ANN401 - ball or series
    return value[0] if isinstance(value, arb_series) else value


def _coefficient(value: Any, order: int) -> arb:  # noqa: ANN401 - ball or series
    return value[order] if isinstance(value, arb_series) else arb(0)
