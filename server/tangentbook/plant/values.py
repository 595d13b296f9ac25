"""Values of a plant or a call ("52 kN", "pi/3", 9.81) -> nodes in SI, exact.

A text splits where an expression ends and a unit begins ("2*pi*50 rad/s"). A bare number counts
in the declared unit of its name; a float counts as its shortest decimal.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from tangentbook.errors import DeclarationError, nearest
from tangentbook.plant.grammar import parse_leading
from tangentbook.plant.lower import Lowering, in_si, no_rate
from tangentbook.plant.units import Dimension, Unit, parse_unit

if TYPE_CHECKING:
    from collections.abc import Collection

    from tangentbook.calculus.graph import Graph, Node
    from tangentbook.plant.source import Scalar


def read_value(
    graph: Graph,
    value: Scalar,
    *,
    unit: Unit | None,
    names: Collection[str],
    where: str,
) -> tuple[Node, Unit | None]:
    """A value as a node in SI, with the unit it was written in (the declared one for a number).

    Args:
        graph: where the node is made.
        value: number, "number unit" or constant expression.
        unit: declared unit, in which a bare number or a purely numeric expression counts.
        names: parameters that an expression may name.
        where: place for messages.

    Raises:
        DeclarationError: an unknown name, or a unit behind an expression that names quantities.
        ExpressionError: the text is not an expression.
    """
    text = value if isinstance(value, str) else repr(value)
    program, rest = parse_leading(text, where)
    used: set[str] = set()

    def resolve(name: str, primes: int, place: str) -> Node:
        if primes:
            raise DeclarationError(
                "value.name",
                f"{name}{chr(39) * primes} is a rate; a value is constant",
                where=place,
                hint="remove the prime",
            )
        if name not in names:
            raise DeclarationError(
                "value.name",
                f"{name} is not a parameter, so it has no meaning in a value",
                where=place,
                hint=nearest(name, [*names]) or "a value is a number, maybe with a unit",
            )
        used.add(name)
        return graph.var(name)

    node = Lowering(graph, resolve, no_rate("a value")).node(program, where)
    if rest.strip():
        if used:
            raise DeclarationError(
                "value.unit-of-quantity",
                f"{text!r}: {', '.join(sorted(used))} already carries its unit",
                where=where,
                hint="drop the unit, or write a number before it",
            )
        written = parse_unit(rest, where=where)
        _check_kind(text, written, unit, where)
        return in_si(graph, node, written), written
    if used:
        return node, unit
    return in_si(graph, node, unit), unit


def _check_kind(text: str, written: Unit, declared: Unit | None, where: str) -> None:
    """A value must be of the kind of its name's declared unit.

    Raises:
        DeclarationError: it is not; cycles (Hz, rpm) are told apart from radians.
    """
    if declared is None or not declared.text or written.dimension == declared.dimension:
        return
    hint = f"give it in {declared.text} or another unit of that kind"
    if without_cycles(written) == without_cycles(declared):
        hint = 'Hz and rpm count cycles, rad/s does not: multiply by 2*pi, as "2*pi*50 rad/s"'
    raise DeclarationError(
        "unit.dimension",
        f"{text!r} is not of the kind of {declared.text or 1}, the declared unit",
        where=where,
        hint=hint,
    )


def without_cycles(unit: Unit) -> Dimension:
    """The dimension with cycles counted as numbers."""
    return tuple((base, power) for base, power in unit.dimension if base != "cycle")
