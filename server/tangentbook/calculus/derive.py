"""Exact sparse derivatives, as nodes of the same graph.

Forward accumulation: every node carries the dictionary {variable: derivative node} of the
variables it really depends on, so structural zeros never appear. Chain rule per operation
(`_LOCAL`); where a function has a kink the derivative of the branch in force is given
(d|a| = sign(a) da, d max(a, b) = if(a > b, da, db)), and `analysis.kinks` decides whether
that is single-valued at the point.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from flint import fmpq

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable

    from tangentbook.calculus.graph import Graph, Node

Gradient = dict[str, int]

# conditions are piecewise constant; what they switch is handled where the choice is made
_TRUTHS = frozenset(("lt", "le", "eq", "ne", "and", "or", "not"))


def gradients(graph: Graph, roots: Iterable[Node], names: Iterable[str]) -> list[Gradient]:
    """For each root the derivatives with respect to those `names` it depends on."""
    wanted = set(names)
    roots = list(roots)
    found: dict[Node, Gradient] = {}
    for node in graph.reachable(roots):
        found[node] = _gradient(graph, node, found, wanted)
    return [found[root] for root in roots]


def rate(graph: Graph, node: Node, rate_of: Callable[[str], Node]) -> Node:
    """The time derivative of an expression; `rate_of(name)` is the rate of a variable."""
    names = sorted(graph.leaves([node]))
    (gradient,) = gradients(graph, [node], names)
    total = graph.const(0)
    for name in names:
        if name in gradient:
            total = graph.add(total, graph.times(gradient[name], rate_of(name)))
    return total


def _gradient(graph: Graph, node: Node, found: dict[Node, Gradient], wanted: set[str]) -> Gradient:
    op = graph.op[node]
    if op == "var":
        name = str(graph.args[node][0])
        return {name: graph.const(1)} if name in wanted else {}
    children = graph.children(node)
    if op in _TRUTHS or not any(found[child] for child in children):
        return {}
    if op in ("if", "min", "max"):
        return _selected(graph, node, found)
    if len(children) == 1:
        return _one_place(graph, node, found[children[0]])
    if op in ("add", "sub"):
        return _sum(graph, op, found[children[0]], found[children[1]])
    return _two_place(graph, node, found)


def _one_place(graph: Graph, node: Node, inner: Gradient) -> Gradient:
    if graph.op[node] == "neg":
        return {name: graph.neg(d) for name, d in inner.items()}
    return _scaled(graph, _slope(graph, node), inner)


def _sum(graph: Graph, op: str, left: Gradient, right: Gradient) -> Gradient:
    result = dict(left)
    for name, d in right.items():
        if name in result:
            total = graph.binary(op, result[name], d)
            if graph.is_zero(total):
                del result[name]
            else:
                result[name] = total
        else:
            result[name] = d if op == "add" else graph.neg(d)
    return result


def _scaled(graph: Graph, factor: Node, gradient: Gradient) -> Gradient:
    if graph.is_zero(factor):
        return {}
    return {name: _product(graph, factor, d) for name, d in gradient.items()}


def _product(graph: Graph, factor: Node, slope: Node) -> Node:
    """Factor * slope with a number in front, as people write it."""
    if graph.value_of(slope) is not None:
        return graph.mul(slope, factor)
    if graph.op[slope] == "mul":
        first, rest = graph.children(slope)
        if graph.value_of(first) is not None:
            return graph.mul(first, graph.mul(factor, rest))
    return graph.mul(factor, slope)


def _selected(graph: Graph, node: Node, found: dict[Node, Gradient]) -> Gradient:
    """if, min, max: the derivative of the branch in force."""
    children = graph.children(node)
    if graph.op[node] == "if":
        condition, a, b = children
    else:
        a, b = children
        first, second = (a, b) if graph.op[node] == "min" else (b, a)
        condition = graph.binary("le", first, second)
    zero = graph.const(0)
    return {
        name: graph.choose(condition, found[a].get(name, zero), found[b].get(name, zero))
        for name in {**found[a], **found[b]}
    }


def _two_place(graph: Graph, node: Node, found: dict[Node, Gradient]) -> Gradient:
    a, b = graph.children(node)
    da, db = found[a], found[b]
    left, right = _PARTIALS[graph.op[node]](graph, node, a, b, bool(db))
    parts: list[Gradient] = []
    if da:
        parts.append(_scaled(graph, left, da))
    if db:
        parts.append(_scaled(graph, right, db))
    return parts[0] if len(parts) == 1 else _sum(graph, "add", parts[0], parts[1])


Partials = tuple[int, int]


# one signature for all rules: graph, node, its two arguments, whether the second one varies
def _factors(_g: Graph, _node: Node, a: Node, b: Node, _moves: bool) -> Partials:  # noqa: FBT001 - as said above
    return b, a


def _quotient(g: Graph, node: Node, _a: Node, b: Node, moves: bool) -> Partials:  # noqa: FBT001 - as said above
    return g.div(g.const(1), b), g.neg(g.div(node, b)) if moves else g.const(0)


def _general_power(g: Graph, node: Node, a: Node, b: Node, moves: bool) -> Partials:  # noqa: FBT001 - as said above
    left = g.mul(b, g.power(a, g.sub(b, g.const(1))))
    return left, g.mul(node, g.unary("log", a)) if moves else g.const(0)


def _angle(g: Graph, _node: Node, y: Node, x: Node, _moves: bool) -> Partials:  # noqa: FBT001 - as said above
    square = g.add(g.ipow(x, 2), g.ipow(y, 2))
    return g.div(x, square), g.neg(g.div(y, square))


_PARTIALS: dict[str, Callable[[Graph, int, int, int, bool], Partials]] = {
    "mul": _factors,
    "div": _quotient,
    "pow": _general_power,
    "atan2": _angle,
}


def _slope(graph: Graph, node: Node) -> Node:
    """The derivative of a one-place operation with respect to its argument."""
    op = graph.op[node]
    (a,) = graph.children(node)
    if op == "ipow":
        n = graph.exponent(node)
        return graph.mul(graph.const(n), graph.ipow(a, n - 1))
    return _LOCAL[op](graph, node, a)


def _one_minus_square(g: Graph, a: Node) -> Node:
    return g.sub(g.const(1), g.ipow(a, 2))


_LOCAL: dict[str, Callable[[Graph, int, int], int]] = {
    "sin": lambda g, _n, a: g.unary("cos", a),
    "cos": lambda g, _n, a: g.neg(g.unary("sin", a)),
    "tan": lambda g, n, _a: g.add(g.const(1), g.ipow(n, 2)),
    "asin": lambda g, _n, a: g.div(g.const(1), g.unary("sqrt", _one_minus_square(g, a))),
    "acos": lambda g, _n, a: g.neg(g.div(g.const(1), g.unary("sqrt", _one_minus_square(g, a)))),
    "atan": lambda g, _n, a: g.div(g.const(1), g.add(g.const(1), g.ipow(a, 2))),
    "sinh": lambda g, _n, a: g.unary("cosh", a),
    "cosh": lambda g, _n, a: g.unary("sinh", a),
    "tanh": lambda g, n, _a: _one_minus_square(g, n),
    "exp": lambda _g, n, _a: n,
    "log": lambda g, _n, a: g.div(g.const(1), a),
    "log10": lambda g, _n, a: g.div(g.const(1), g.mul(a, g.unary("log", g.const(10)))),
    "sqrt": lambda g, n, _a: g.div(g.const(fmpq(1, 2)), n),
    "abs": lambda g, _n, a: g.unary("sign", a),
    "sign": lambda g, _n, _a: g.const(0),
}
