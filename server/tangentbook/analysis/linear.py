"""The linear model at a point, by implicit differentiation of the equations as written.

    F(w, x, u) = 0,  y = g(w, x, u)
    dw/d(x, u) = -F_w^-1 F_(x, u),  block by block in solving order
    A, B: the rows of dw for the rates (x' of a state that is itself a state is a unit row)
    C, D: g_x + g_w dw/dx, g_u + g_w dw/du

The partial derivatives are nodes of the plant's own graph, evaluated in 256-bit balls.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from flint import arb, arb_mat

from tangentbook.calculus.derive import gradients
from tangentbook.calculus.evaluate import Function

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from tangentbook.calculus.graph import Node
    from tangentbook.plant.model import Block, Plant

Row = dict[str, arb]


class SingularError(ArithmeticError):
    """The equations cannot be solved for their unknowns at this point."""

    def __init__(self, unknowns: Sequence[str], equations: Sequence[str]) -> None:
        super().__init__(", ".join(unknowns))
        self.unknowns = tuple(unknowns)
        self.equations = tuple(equations)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LinearModel:
    """A, B, C, D by rows of balls in SI: row name -> {column name: entry}; no entry is exactly 0.

    `unknowns` are the rows of all highest rates and algebraic unknowns over states and inputs.
    """

    states: tuple[str, ...]
    inputs: tuple[str, ...]
    outputs: tuple[str, ...]
    rates: Mapping[str, Row]
    output_rows: Mapping[str, Row]
    unknowns: Mapping[str, Row]

    def dense(self) -> arb_mat:
        """A as a matrix of balls."""
        n = len(self.states)
        zero = arb(0)
        return arb_mat(n, n, [self.rates[r].get(c, zero) for r in self.states for c in self.states])

    def rate_entry(self, state: str, column: str) -> arb:
        """An entry of A or B, in the row of a state."""
        return self.rates[state].get(column, arb(0))

    def output_entry(self, output: str, column: str) -> arb:
        """An entry of C or D, in the row of an output (which may be called as a state is)."""
        return self.output_rows[output].get(column, arb(0))


class Partials:
    """The partial derivatives of a plant's equations and outputs as one generated function."""

    def __init__(self, plant: Plant, parameters: Sequence[str]) -> None:
        self.plant = plant
        graph = plant.graph
        self.columns = (*plant.states, *plant.inputs)
        wanted = (*plant.unknowns, *self.columns)
        self.names = (*parameters, *self.columns, *plant.unknowns)
        roots = [*(e.residual for e in plant.equations), *(o.node for o in plant.outputs)]
        found = gradients(graph, roots, wanted)
        count = len(plant.equations)
        self.equations, self.outputs = found[:count], found[count:]
        self.nodes: list[Node] = sorted({node for row in found for node in row.values()})
        self._function = Function(graph, self.names, self.nodes)

    def evaluate(self, values: Sequence[arb]) -> dict[Node, arb]:
        """Every derivative node at the given values (order of `names`)."""
        return dict(zip(self.nodes, self._function.balls(values), strict=True))


def linear_model(partials: Partials, at: Mapping[Node, arb]) -> LinearModel:
    """Assemble the model from evaluated partial derivatives.

    Raises:
        SingularError: a block of the equations is singular in its unknowns at the point.
    """
    plant = partials.plant
    solved: dict[str, Row] = {}
    columns = set(partials.columns)
    for block in plant.blocks:
        _solve_block(partials, at, block, columns, solved)
    rates: dict[str, Row] = {}
    for name in plant.states:
        rate = name + "'"
        rates[name] = {rate: arb(1)} if rate in columns else solved[rate]
    outputs = {
        output.name: _through(row, at, solved, columns)
        for output, row in zip(plant.outputs, partials.outputs, strict=True)
    }
    return LinearModel(
        states=plant.states,
        inputs=plant.inputs,
        outputs=tuple(o.name for o in plant.outputs),
        rates=rates,
        output_rows=outputs,
        unknowns=solved,
    )


def _through(
    row: Mapping[str, Node], at: Mapping[Node, arb], solved: Mapping[str, Row], columns: set[str]
) -> Row:
    """A gradient over unknowns and columns -> over columns, by the chain rule."""
    result: Row = {}
    for name, node in row.items():
        value = at[node]
        if name in columns:
            result[name] = result[name] + value if name in result else value
        elif name in solved:
            for column, entry in solved[name].items():
                term = value * entry
                result[column] = result[column] + term if column in result else term
    return result


def _solve_block(
    partials: Partials,
    at: Mapping[Node, arb],
    block: Block,
    columns: set[str],
    solved: dict[str, Row],
) -> None:
    plant = partials.plant
    rows = [partials.equations[k] for k in block.equations]
    known = [_through(row, at, solved, columns) for row in rows]
    size = len(rows)
    zero = arb(0)
    matrix = [[at[row[name]] if name in row else zero for name in block.unknowns] for row in rows]
    if size == 1:
        pivot = matrix[0][0]
        if pivot.contains(0) or not pivot.is_finite():
            raise _singular(plant, block)
        solved[block.unknowns[0]] = {c: -v / pivot for c, v in known[0].items()}
        return
    present = list(dict.fromkeys(c for row in known for c in row))
    right = arb_mat(size, max(len(present), 1))
    for i, row in enumerate(known):
        for j, column in enumerate(present):
            right[i, j] = -row.get(column, zero)
    try:
        solution = arb_mat(size, size, [e for line in matrix for e in line]).solve(right)
    except ZeroDivisionError:
        raise _singular(plant, block) from None
    for i, name in enumerate(block.unknowns):
        solved[name] = {c: solution[i, j] for j, c in enumerate(present)}


def _singular(plant: Plant, block: Block) -> SingularError:
    return SingularError(block.unknowns, [plant.equations[k].where for k in block.equations])
