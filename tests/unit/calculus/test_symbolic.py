"""The symbolic library as a second route: it confirms what is right and shows what is wrong."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest
from flint import arb, ctx, fmpq

from tangentbook.calculus import Function, Gradient, Graph, Node, gradients
from tangentbook.calculus.graph import BINARY, UNARY
from tangentbook.calculus.symbolic import differ, expressions_of

if TYPE_CHECKING:
    from collections.abc import Iterator

POINT = {"x": arb(fmpq(5, 8)), "y": arb(fmpq(3, 4))}


@pytest.fixture(autouse=True)
def _precise() -> Iterator[None]:
    with ctx.workprec(200):
        yield


def compared(graph: Graph, node: Node, row: Gradient) -> tuple[float, str]:
    """What the second route says of these derivatives at the point."""
    nodes = list(row.values())
    values = Function(graph, list(POINT), nodes).balls(list(POINT.values()))
    return differ(graph, [node], [row], POINT, dict(zip(nodes, values, strict=True)))


def _of_both(graph: Graph, op: str) -> Node:
    x, y = graph.var("x"), graph.var("y")
    if op in UNARY:
        return graph.mul(graph.unary(op, x), y)
    if op in ("lt", "le", "eq", "ne"):
        return graph.choose(graph.binary(op, x, y), graph.mul(x, y), graph.ipow(x, 2))
    if op in ("and", "or"):
        both = graph.binary(op, graph.binary("lt", x, y), graph.binary("le", y, x))
        return graph.choose(both, graph.mul(x, y), graph.ipow(x, 2))
    return graph.binary(op, graph.mul(x, x), y)


@pytest.mark.parametrize("op", [op for op in (*UNARY, *BINARY) if op != "not"])
def test_right_derivatives_are_confirmed(op: str) -> None:
    """Every operation crosses to the library, and 30 digits of its derivatives agree."""
    graph = Graph()
    node = _of_both(graph, op)
    (row,) = gradients(graph, [node], ["x", "y"])
    error, _ = compared(graph, node, row)
    assert error < 1e-30


@pytest.mark.parametrize("op", ["sin", "mul", "atan2", "pow", "tanh"])
def test_a_wrong_derivative_is_found_and_named(op: str) -> None:
    """An entry that is off by one part in a million shows, with its variable."""
    graph = Graph()
    node = _of_both(graph, op)
    (row,) = gradients(graph, [node], ["x", "y"])
    wrong = {**row, "y": graph.mul(row["y"], graph.const(fmpq(1_000_001, 1_000_000)))}
    error, where = compared(graph, node, wrong)
    assert where == "y"
    assert error == pytest.approx(1e-6, rel=1e-3)


def test_a_place_without_a_value_is_no_confirmation() -> None:
    """Where the library finds no number the derivatives count as wholly different."""
    graph = Graph()
    x = graph.var("x")
    node = graph.unary("log", graph.sub(x, graph.const(fmpq(5, 8))))
    error, where = differ(graph, [node], [{"x": x}], POINT, {x: POINT["x"]})
    assert (error, where) == (1.0, "x")


def test_names_stay_names() -> None:
    """Quantities called like objects of the library, or with primes, are symbols there."""
    graph = Graph()
    names = ["I", "E", "S", "lambda", "theta''", "pi_", "beta"]
    node = graph.const(0)
    for name in names:
        node = graph.add(node, graph.var(name))
    _, symbols = expressions_of(graph, [node])
    assert sorted(symbols) == sorted(names)
    assert {str(symbol) for symbol in symbols.values()} == set(names)
    row = dict.fromkeys(names, graph.const(1))
    point = dict.fromkeys(names, arb(1))
    assert differ(graph, [node], [row], point, {graph.const(1): arb(1)}) == (0.0, "")
