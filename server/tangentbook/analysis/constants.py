"""Values of the parameters of one configuration: exact nodes, doubles, balls."""

from __future__ import annotations

from typing import TYPE_CHECKING

from flint import arb, ctx

from tangentbook.calculus.evaluate import Function
from tangentbook.errors import PointError, nearest
from tangentbook.plant.values import read_value

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from tangentbook.calculus.graph import Node
    from tangentbook.plant.model import Plant
    from tangentbook.plant.source import Scalar

GUARD_BITS = 64


class Constants:
    """The parameters with the overrides of a configuration; derived ones move along.

    `names` is their order in every evaluated function.
    """

    def __init__(self, plant: Plant, overrides: Mapping[str, Scalar]) -> None:
        self.plant = plant
        self.names: tuple[str, ...] = tuple(plant.parameters)
        values = {name: p.value for name, p in plant.parameters.items()}
        for name, value in overrides.items():
            values[name] = _override(plant, name, value)
        self.raw = values
        self.resolved = _resolved(plant, values)
        self._function = Function(plant.graph, (), [self.resolved[n] for n in self.names])
        self._balls: dict[int, list[arb]] = {}
        self._values: dict[tuple[Node, int], arb] = {}
        self.floats: list[float] = [float(b.mid()) for b in self.balls()]

    def balls(self) -> list[arb]:
        """Enclosures of the parameter values at the current precision.

        Raises:
            PointError: a parameter has no finite value.
        """
        precision = ctx.prec
        if precision not in self._balls:
            ctx.prec = precision + GUARD_BITS
            try:
                values = self._function.balls(())
            finally:
                ctx.prec = precision
            for name, value in zip(self.names, values, strict=True):
                if not value.is_finite():
                    raise PointError(
                        "parameter.no-value",
                        f"parameter {name} has no finite value",
                        where=f"parameter {name}",
                        hint="check its expression and the overrides in `set`",
                    )
            self._balls[precision] = values
        return self._balls[precision]

    def value(self, node: Node) -> arb:
        """The value of a constant expression over the parameters."""
        key = (node, ctx.prec)
        if key not in self._values:
            function = Function(self.plant.graph, self.names, [node])
            (self._values[key],) = function.balls(self.balls())
        return self._values[key]


def _override(plant: Plant, name: str, value: Scalar) -> Node:
    where = f"set.{name}"
    if name not in plant.parameters:
        raise PointError(
            "point.set",
            f"{name} is not a parameter of the plant",
            where=where,
            hint=nearest(name, plant.parameters) or "the plant has no parameters",
        )
    node, _ = read_value(
        plant.graph,
        value,
        unit=plant.parameters[name].unit,
        names=[other for other in plant.parameters if other != name],
        where=where,
    )
    return node


def _resolved(plant: Plant, values: Mapping[str, Node]) -> dict[str, Node]:
    """Each parameter as a node over numbers and pi only."""
    graph = plant.graph
    resolved: dict[str, Node] = {}
    waiting = dict(values)
    while waiting:
        ready = [n for n, node in waiting.items() if not graph.leaves([node]) & waiting.keys()]
        if not ready:
            raise PointError(
                "parameter.cycle",
                f"parameters are given by each other in a circle: {', '.join(waiting)}",
                where="set",
                hint="give one of them a number",
            )
        mapping = {graph.var(name): node for name, node in resolved.items()}
        nodes: Sequence[Node] = graph.substitute([waiting[n] for n in ready], mapping)
        for name, node in zip(ready, nodes, strict=True):
            resolved[name] = node
            del waiting[name]
    return resolved


def exact_text(
    plant: Plant, constants: Constants, node: Node, *, without_pi: int = 0
) -> str | None:
    """A short exact spelling of a constant (rational, or rational times pi), if it has one.

    Args:
        plant: the plant.
        constants: the configuration.
        node: the constant.
        without_pi: this power of pi is divided out first (a value in degrees).
    """
    graph = plant.graph
    mapping = {graph.var(name): value for name, value in constants.resolved.items()}
    (node,) = graph.substitute([node], mapping)
    power = _power_of_pi(plant, node)
    if power is None:
        return None
    (quotient,) = graph.substitute([node], {graph.pi(): graph.const(1)})
    factor = graph.value_of(quotient)
    if factor is None:
        return None
    if factor != 0:
        power -= without_pi
    text = _pi_text(int(factor.p), int(factor.q), power if factor != 0 else 0)
    return text if text is not None and len(text) <= 24 else None


def _power_of_pi(plant: Plant, node: Node) -> int | None:
    """The power of pi in a product or quotient of rationals and pi; None for anything else."""
    graph = plant.graph
    power = 0
    stack = [(node, 1)]
    while stack:
        current, sign = stack.pop()
        op = graph.op[current]
        if op == "pi":
            power += sign
        elif op == "mul":
            stack += [(child, sign) for child in graph.children(current)]
        elif op == "div":
            top, bottom = graph.children(current)
            stack += [(top, sign), (bottom, -sign)]
        elif op == "ipow":
            stack.append((graph.children(current)[0], sign * int(str(graph.args[current][1]))))
        elif op == "neg":
            stack.append((graph.children(current)[0], sign))
        elif op != "const":
            return None
    return power


def _pi_text(p: int, q: int, power: int) -> str | None:
    if power == 0:
        return f"{p}" if q == 1 else f"{p}/{q}"
    if power != 1:
        return None
    head = {1: "pi", -1: "-pi"}.get(p, f"{p}*pi")
    return head if q == 1 else f"{head}/{q}"
