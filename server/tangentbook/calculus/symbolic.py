# pyright: reportUnknownMemberType=false, reportUnknownVariableType=false
# pyright: reportUnknownArgumentType=false, reportMissingTypeStubs=false
"""The symbolic library as a second route: nothing else in the package calls it.

Expressions are rebuilt from the nodes (never from text), differentiated by the library, and its
derivatives are compared with ours at a point, in 40 digits.
"""

from __future__ import annotations

import math
import operator
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
    point = {symbol: values[name] for name, symbol in symbols.items() if name in values}
    places: list[tuple[str, Node, float]] = []
    derivatives: list[Any] = []
    for expression, row in zip(expressions, rows, strict=True):
        names = [n for n in row if n in symbols]
        largest = max((abs(float(ours[row[n]].mid())) for n in names), default=0.0)
        places += [(name, row[name], largest) for name in names]
        derivatives += [sympy.diff(expression, symbols[name]) for name in names]
    worst, where = 0.0, ""
    for (name, node, largest), theirs in zip(places, _values(derivatives, point), strict=True):
        mine = ours[node]
        scale = max(abs(float(mine.mid())), 1e-12 * largest) or 1.0
        error = abs(float((theirs - mine).mid())) / scale
        # what the library has no number for is no confirmation: wholly different
        error = 1.0 if math.isnan(error) else error
        if error > worst:
            worst, where = error, name
    return worst, where


def _values(derivatives: Sequence[sympy.Expr], point: Mapping[Any, arb]) -> list[arb]:
    """The derivatives at the point; NaN where the library finds no real number.

    Together, as one function with common parts named: putting the point into one expression after
    the other takes minutes where definitions stand within definitions.
    """
    try:
        function = sympy.lambdify([list(point)], list(derivatives), modules="mpmath", cse=True)
        with mpmath.workdps(DIGITS + 10):
            found = function([mpmath.mpf(_digits(value)) for value in point.values()])
            return [_real(value) for value in found]
    except (ArithmeticError, NameError, TypeError, ValueError):
        # an operation the evaluator does not have, or a place without a value: one at a time
        exact = {symbol: sympy.Float(_digits(v), DIGITS + 10) for symbol, v in point.items()}
        return [_value(derivative, exact) for derivative in derivatives]


def _real(value: Any) -> arb:  # noqa: ANN401 - whatever the library makes of it
    real = isinstance(value, (int, mpmath.mpf)) and mpmath.isfinite(value)
    return arb(mpmath.nstr(mpmath.mpf(value), DIGITS)) if real else arb("nan")


def _digits(value: arb) -> str:
    return value.mid().str(DIGITS + 10, radius=False)


def _value(derivative: sympy.Expr, point: Mapping[Any, Any]) -> arb:
    value = derivative.subs(point).evalf(DIGITS)
    return arb(str(value)) if isinstance(value, (sympy.Float, sympy.Integer)) else arb("nan")


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
            made[node] = made[graph.children(node)[0]] ** graph.exponent(node)
        else:
            made[node] = _OPERATIONS[op](*(made[child] for child in graph.children(node)))
    return [made[root] for root in roots], symbols


def _choice(condition: Any, a: Any, b: Any) -> Any:  # noqa: ANN401 - the library's own types
    return sympy.Piecewise((a, condition), (b, True))


def _log10(a: Any) -> Any:  # noqa: ANN401 - the library's own types
    return sympy.log(a) / sympy.log(10)


_CIRCULAR = ("sin", "cos", "tan", "asin", "acos", "atan", "atan2")
_OTHERS = ("sinh", "cosh", "tanh", "exp", "log", "sqrt", "sign")

_OPERATIONS: dict[str, Callable[..., Any]] = {
    "add": operator.add,
    "sub": operator.sub,
    "mul": operator.mul,
    "div": operator.truediv,
    "neg": operator.neg,
    "pow": operator.pow,
    "not": sympy.Not,
    "and": sympy.And,
    "or": sympy.Or,
    "lt": operator.lt,
    "le": operator.le,
    "eq": sympy.Eq,
    "ne": sympy.Ne,
    "if": _choice,
    "min": sympy.Min,
    "max": sympy.Max,
    "log10": _log10,
    "abs": sympy.Abs,
    **{name: getattr(sympy, name) for name in (*_CIRCULAR, *_OTHERS)},
}
