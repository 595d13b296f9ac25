"""Plants written in one line, for tests of what is understood and what is refused."""

from __future__ import annotations

from typing import TYPE_CHECKING, TypedDict, Unpack

from flint import fmpq

from tangentbook.calculus import Graph, Node
from tangentbook.errors import TangentbookError
from tangentbook.plant import (
    DeclaredText,
    DefinitionText,
    EquationText,
    ParameterText,
    Plant,
    PlantText,
    Scalar,
    build_plant,
)
from tangentbook.plant.grammar import parse_expression
from tangentbook.plant.lower import Lowering, no_rate

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping, Sequence

Declared = "Sequence[str | DeclaredText] | Mapping[str, str]"


class Parts(TypedDict, total=False):
    """Parts of a plant: lists of names, or name -> unit (of outputs: name -> expression)."""

    states: Sequence[str | DeclaredText] | Mapping[str, str]
    inputs: Sequence[str | DeclaredText] | Mapping[str, str]
    algebraic: Sequence[str | DeclaredText] | Mapping[str, str]
    outputs: Mapping[str, str]
    parameters: Mapping[str, Scalar | ParameterText]
    definitions: Mapping[str, str | DefinitionText]
    time: str


def _declared(
    items: Sequence[str | DeclaredText] | Mapping[str, str],
) -> tuple[DeclaredText, ...]:
    # not isinstance(…, Mapping): that would import what only annotations need
    if hasattr(items, "items"):
        return tuple(DeclaredText(name=n, unit=u) for n, u in dict(items).items())  # pyright: ignore[reportArgumentType, reportCallIssue] - a mapping, as just seen
    return tuple(i if isinstance(i, DeclaredText) else DeclaredText(name=i) for i in items)


def text(*equations: str, **parts: Unpack[Parts]) -> PlantText:
    """A plant as written."""
    return PlantText(
        name="plant",
        equations=tuple(EquationText(text=e) for e in equations),
        states=_declared(parts.get("states", ())),
        inputs=_declared(parts.get("inputs", ())),
        algebraic=_declared(parts.get("algebraic", ())),
        outputs=tuple(
            DeclaredText(name=n, expression=e) for n, e in parts.get("outputs", {}).items()
        ),
        parameters=tuple(
            p if isinstance(p, ParameterText) else ParameterText(name=n, value=p)
            for n, p in parts.get("parameters", {}).items()
        ),
        definitions=tuple(
            d if isinstance(d, DefinitionText) else DefinitionText(name=n, text=d)
            for n, d in parts.get("definitions", {}).items()
        ),
        time=parts.get("time", "s"),
    )


def plant(*equations: str, **parts: Unpack[Parts]) -> Plant:
    """A plant as understood."""
    return build_plant(text(*equations, **parts))


def refused(make: Callable[[], object]) -> dict[str, str]:
    """The whole error that something raises; an empty one if it does not."""
    try:
        make()
    except TangentbookError as error:
        return {**error.as_dict(), "class": type(error).__name__}
    return {}


def node_of(graph: Graph, written: str) -> Node:
    """The node of an expression in which every name is a variable."""
    lowering = Lowering(graph, lambda name, primes, _: graph.var(name + "'" * primes), no_rate("x"))
    return lowering.node(parse_expression(written, "text"), "text")


def number(written: str) -> fmpq | None:
    """The exact value of an expression without names, None where it stays an expression."""
    graph = Graph()
    return graph.value_of(node_of(graph, written))
