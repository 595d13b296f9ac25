"""A plant as understood: names with roles, equations as nodes of one expression graph.

All quantities are in coherent SI (time in seconds, or in the plant's `time` where no unit of the
plant contains time: then nothing ties its rates to the second). A rate carries its primes in its
name. `unknowns` are what the equations are solved for: the highest rates and the algebraic ones.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from tangentbook.plant.grammar import parse_expression
from tangentbook.plant.units import ONE, Unit, product

if TYPE_CHECKING:
    from collections.abc import Mapping

    from flint import fmpq

    from tangentbook.calculus.graph import Graph, Node
    from tangentbook.plant.scope import Scope


@dataclass(frozen=True, slots=True, kw_only=True)
class Variable:
    """A state, input or algebraic unknown; expressions are nodes in SI, None where not given."""

    name: str
    role: str
    unit: Unit | None = None
    about: str = ""
    positive: str = ""
    source: str = ""
    typical: Node | None = None
    period: Node | None = None
    lower: Node | None = None
    upper: Node | None = None
    disturbance: bool = False
    rest: Node | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Parameter:
    """A constant: `value` is a node over parameters and pi, in SI."""

    name: str
    value: Node
    unit: Unit | None
    text: str
    about: str = ""
    tolerance: str = ""
    source: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Definition:
    """A named expression, from `definitions` or from an equation with one new name at its left."""

    name: str
    node: Node
    text: str
    unit: Unit | None = None
    about: str = ""
    source: str = ""
    equation: int | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Output:
    """An output y = g(x, z, u)."""

    name: str
    node: Node
    text: str
    unit: Unit | None
    about: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Equation:
    """left = right; `where` is how messages and reports call it."""

    where: str
    text: str
    left: Node
    right: Node
    residual: Node
    label: str = ""
    source: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Plant:
    """The plant as understood; see the module docstring."""

    name: str
    graph: Graph
    time: Unit
    clock: Unit
    variables: Mapping[str, Variable]
    parameters: Mapping[str, Parameter]
    definitions: Mapping[str, Definition]
    outputs: tuple[Output, ...]
    equations: tuple[Equation, ...]
    orders: Mapping[str, int]
    states: tuple[str, ...]
    inputs: tuple[str, ...]
    algebraic: tuple[str, ...]
    unknowns: tuple[str, ...]
    blocks: tuple[Block, ...]
    roles: Mapping[str, str]
    unused: tuple[str, ...]
    undeclared: tuple[str, ...]
    explicit_time: bool
    scope: Scope

    def expression(self, text: str, where: str) -> Node:
        """The node of an expression over the plant's names, outputs included.

        Raises:
            ExpressionError: not an expression, or a name the plant does not have.
        """
        for output in self.outputs:
            if output.name == text.strip():
                return output.node
        node = self.scope.lower(parse_expression(text, where), where)
        named = {o.name: o.node for o in self.outputs}
        swap = {
            self.graph.var(n): named[n]
            for n in self.graph.leaves([node])
            if n in named and n not in self.variables and n not in self.states
        }
        (node,) = self.graph.substitute([node], swap) if swap else [node]
        known = {*self.states, *self.inputs, *self.algebraic, *self.parameters, *self.unknowns, "t"}
        for leaf in sorted(self.graph.leaves([node]) - known):
            raise self.scope.undeclared(leaf, where, also=named)
        return node

    def unit_of(self, name: str) -> Unit | None:
        """The declared unit of a variable, rate, parameter, definition or output."""
        variable = self.variables.get(name)
        base = name.rstrip("'")
        if variable is not None and (variable.unit is not None or base == name):
            return variable.unit
        if base != name and base in self.variables:
            return self.rate_unit(base, len(name) - len(base))
        for group in (self.parameters, self.definitions):
            if name in group:
                return group[name].unit
        return next((o.unit for o in self.outputs if o.name == name), None)

    def rate_unit(self, base: str, order: int) -> Unit:
        """unit(x) per time^order; the factor counts time as the equations do (per clock)."""
        declared = self.variables[base].unit
        unit = declared or ONE
        text = "" if declared is None else _per_text(unit.text, self.time.text, order)
        kind = product(unit, self.time, -order).dimension
        return replace(product(unit, self.clock, -order), text=text, dimension=kind)

    def per_clock(self, name: str) -> fmpq:
        """What a rate given in SI is multiplied by to count time as the equations do."""
        order = len(name) - len(name.rstrip("'"))
        return (self.time.factor / self.clock.factor) ** order

    def output_unit(self, output: Output) -> Unit | None:
        """The unit of an output; one that is just a quantity has that quantity's unit."""
        if output.unit is not None:
            return output.unit
        name = self.graph.name_of(output.node)
        return None if name is None else self.unit_of(name)

    @property
    def rates(self) -> tuple[str, ...]:
        """The highest rates, in the order of the states."""
        return tuple(name for name in self.unknowns if name.endswith("'"))


@dataclass(frozen=True, slots=True, kw_only=True)
class Block:
    """Equations and unknowns that must be solved together; blocks are in solving order.

    `solved` holds the unknowns as nodes (over states, inputs, earlier unknowns) where the block
    is linear in its unknowns and small.
    """

    equations: tuple[int, ...]
    unknowns: tuple[str, ...]
    linear: bool
    solved: tuple[Node, ...] | None = None


def _per_text(unit: str, time: str, order: int) -> str:
    if time in ("1", "-", ""):
        return unit
    power = time if order == 1 else f"{time}^{order}"
    if " " in time or "/" in time:
        power = f"({time})" if order == 1 else f"({time})^{order}"
    if unit in ("1", "-", ""):
        return f"1/{power}"
    if "/" in unit:
        head, _, tail = unit.partition("/")
        tail = tail.strip("()")
        return f"{head}/({tail} {power})"
    return f"{unit}/{power}"
