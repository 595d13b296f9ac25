# pyright: reportUnknownMemberType=false, reportUnknownVariableType=false
# pyright: reportUnknownArgumentType=false, reportMissingTypeStubs=false
"""The symbolic library as a second route: nothing else in the package calls it.

Expressions are rebuilt from the nodes (never from text), differentiated by the library, and its
derivatives are compared with ours at a point, in 40 digits.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import mpmath
import sympy
from flint import arb

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping, Sequence

    from tangentbook.calculus.derive import Gradient
    from tangentbook.calculus.graph import Graph, Node

DIGITS = 40


def differ(
    graph: Graph,
    roots: Sequence[Node],
    rows: Sequence[Gradient],
    values: Mapping[str, arb],
    ours: Mapping[Node, arb],
) -> tuple[float, str]:
    """Largest relative difference between the library's derivatives and ours, and where.

    Args:
        graph: where the nodes live.
        roots: the expressions.
        rows: for each expression its derivatives by name, as nodes.
        values: the point, by name.
        ours: the value of every derivative node at the point.
    """
    expressions, symbols = expressions_of(graph, roots)
    point = {symbol: _decimal(values[name]) for name, symbol in symbols.items() if name in values}
    worst, where = 0.0, ""
    for expression, row in zip(expressions, rows, strict=True):
        names = [n for n in row if n in symbols]
        largest = max((abs(float(ours[row[n]].mid())) for n in names), default=0.0)
        for name in names:
            theirs = _value(sympy.diff(expression, symbols[name]), point)
            mine = ours[row[name]]
            scale = max(abs(float(mine.mid())), 1e-12 * largest) or 1.0
            error = abs(float((arb(mpmath.nstr(theirs, DIGITS)) - mine).mid())) / scale
            if error > worst:
                worst, where = error, name
    return worst, where


def _decimal(value: arb) -> sympy.Float:
    return sympy.Float(value.mid().str(DIGITS + 10, radius=False), DIGITS + 10)


def _value(derivative: sympy.Expr, point: Mapping[Any, Any]) -> mpmath.mpf:
    with mpmath.workdps(DIGITS + 10):
        value = derivative.subs(point).evalf(DIGITS)
        return mpmath.mpf(str(value))


def expressions_of(
    graph: Graph, roots: Sequence[Node]
) -> tuple[list[sympy.Expr], dict[str, sympy.Symbol]]:
    """The roots as expressions of the library, and its symbols by name."""
    made: dict[Node, Any] = {}
    symbols: dict[str, sympy.Symbol] = {}
    for node in graph.reachable(roots):
        op = graph.op[node]
        value = graph.value_of(node)
        if value is not None:
            made[node] = sympy.Rational(int(value.p), int(value.q))
        elif op == "pi":
            made[node] = sympy.pi
        elif op == "var":
            name = str(graph.args[node][0])
            made[node] = symbols.setdefault(name, sympy.Symbol(name, real=True))
        elif op == "ipow":
            base = made[graph.children(node)[0]]
            made[node] = base ** int(str(graph.args[node][1]))
        else:
            made[node] = _OPERATIONS[op](*(made[child] for child in graph.children(node)))
    return [made[root] for root in roots], symbols


_OPERATIONS: dict[str, Callable[..., Any]] = {
    "add": lambda a, b: a + b,
    "sub": lambda a, b: a - b,
    "mul": lambda a, b: a * b,
    "div": lambda a, b: a / b,
    "neg": lambda a: -a,
    "pow": lambda a, b: a**b,
    "not": sympy.Not,
    "and": sympy.And,
    "or": sympy.Or,
    "lt": lambda a, b: a < b,
    "le": lambda a, b: a <= b,
    "eq": sympy.Eq,
    "ne": sympy.Ne,
    "if": lambda c, a, b: sympy.Piecewise((a, c), (b, True)),
    "min": sympy.Min,
    "max": sympy.Max,
    "log10": lambda a: sympy.log(a) / sympy.log(10),
    "abs": sympy.Abs,
    "sign": sympy.sign,
    **{
        name: getattr(sympy, name)
        for name in ["sin", "cos", "tan", "asin", "acos", "atan", "atan2", "sinh", "cosh", "tanh", "exp", "log", "sqrt"]
    },
}
