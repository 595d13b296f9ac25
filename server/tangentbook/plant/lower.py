"""Programs of the grammar -> nodes of the graph, once the roles of names are known."""

from __future__ import annotations

from typing import TYPE_CHECKING

from flint import fmpq

from tangentbook.calculus.derive import rate
from tangentbook.errors import DeclarationError, ExpressionError
from tangentbook.plant.program import FUNCTIONS, unknown_function
from tangentbook.plant.units import Unit, parse_unit

if TYPE_CHECKING:
    from collections.abc import Callable

    from tangentbook.calculus.graph import Graph, Node
    from tangentbook.plant.program import Program, Step

Resolve = "Callable[[str, int, str], Node]"
"""(name, primes, place) -> node; raises where the name has no meaning."""


def exact_number(text: str) -> fmpq:
    """A decimal literal as the rational it denotes ("9.81" is 981/100)."""
    mantissa, _, exponent = text.lower().partition("e")
    whole, _, fraction = mantissa.partition(".")
    scale = int(exponent or 0) - len(fraction)
    digits = int((whole + fraction) or "0")
    return fmpq(digits * 10**scale) if scale >= 0 else fmpq(digits, 10**-scale)


def unit_factor(graph: Graph, unit: Unit) -> Node:
    """The size of a unit in SI as a node: a rational times a power of pi."""
    node = graph.const(unit.factor)
    if unit.pi_power:
        node = graph.mul(node, graph.ipow(graph.pi(), unit.pi_power))
    return node


def in_si(graph: Graph, value: Node, unit: Unit | None) -> Node:
    """A number of units as a quantity; a level (degC) counts from its own zero."""
    if unit is None:
        return value
    scaled = graph.mul(value, unit_factor(graph, unit))
    return graph.add(scaled, graph.const(unit.offset)) if unit.offset != 0 else scaled


class Lowering:
    """Lowers programs of one text; `rate_of` gives the rate of a variable by name."""

    def __init__(
        self,
        graph: Graph,
        resolve: Callable[[str, int, str], Node],
        rate_of: Callable[[str, str], Node],
    ) -> None:
        self.graph = graph
        self.resolve = resolve
        self.rate_of = rate_of

    def node(self, program: Program, where: str) -> Node:
        """The node of a program.

        Raises:
            ExpressionError: unknown function, division by zero, exponent beyond the limit.
        """
        stack: list[Node] = []
        for step in program:
            self._apply(step, stack, where)
        (result,) = stack
        return result

    def _apply(self, step: Step, stack: list[Node], where: str) -> None:
        if step.op == "number":
            stack.append(self.graph.const(exact_number(step.text)))
            return
        place = f"{where}, column {step.at + 1}"
        if step.op == "unit":
            stack.append(in_si(self.graph, stack.pop(), parse_unit(step.text, where=place)))
        elif step.op == "pi":
            stack.append(self.graph.pi())
        elif step.op == "name":
            stack.append(self.resolve(step.text, step.count, place))
        elif step.op == "rate":
            self._rates(step, stack, place)
        elif step.op in ("neg", "not"):
            stack.append(self.graph.unary(step.op, stack.pop()))
        else:
            self._combine(step, stack, where, place)

    def _rates(self, step: Step, stack: list[Node], place: str) -> None:
        node = stack.pop()
        for _ in range(step.count):
            node = rate(self.graph, node, lambda name: self.rate_of(name, place))
        stack.append(node)

    def _combine(self, step: Step, stack: list[Node], where: str, place: str) -> None:
        args = stack[len(stack) - step.count :]
        del stack[len(stack) - step.count :]
        if step.op == "if":
            stack.append(self.graph.choose(args[0], args[1], args[2]))
        elif step.op == "call":
            stack.append(self._call(step, args, where))
        else:
            stack.append(self._binary(step.text, args[0], args[1], place))

    def _binary(self, name: str, a: Node, b: Node, place: str) -> Node:
        if name in ("gt", "ge"):
            return self.graph.binary("lt" if name == "gt" else "le", b, a)
        try:
            return self.graph.binary(name, a, b)
        except ZeroDivisionError:
            raise ExpressionError(
                "expression.division-by-zero",
                "division by zero, whatever the point",
                where=place,
                hint="mend the divisor",
            ) from None
        except OverflowError:
            raise ExpressionError(
                "expression.exponent",
                "a whole exponent is at most 400 in size",
                where=place,
                hint="use exp(…) or another unit",
            ) from None

    def _call(self, step: Step, args: list[Node], where: str) -> Node:
        name = step.text
        if name not in FUNCTIONS:
            raise unknown_function(name, [], where, step.at)
        if name in ("min", "max"):
            result = args[0]
            for other in args[1:]:
                result = self.graph.binary(name, result, other)
            return result
        if name == "clip":
            value, low, high = args
            return self.graph.binary("min", self.graph.binary("max", value, low), high)
        if len(args) == 1:
            return self.graph.unary(name, args[0])
        return self.graph.binary(name, args[0], args[1])


def no_rate(what: str) -> Callable[[str, str], Node]:
    """A `rate_of` for places where rates have no meaning."""

    def refuse(name: str, place: str) -> Node:
        raise DeclarationError(
            "expression.rate", f"{what} has no rate of {name}", where=place, hint="remove the prime"
        )

    return refuse
