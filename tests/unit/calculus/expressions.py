# pyright: reportUnknownLambdaType=false, reportUnknownArgumentType=false
# (tables of one-line operations on numbers of libraries without annotations)
"""Random expressions as recipes, built three ways: graph, high-precision numbers, symbols.

A recipe is a nested tuple: ("var", "x"), ("const", Fraction), ("pi",), ("ipow", recipe, n),
("if", condition, recipe, recipe) or (operation, recipes…).
"""

from __future__ import annotations

from fractions import Fraction
from typing import TYPE_CHECKING, Any

import mpmath
import sympy
from flint import arb, fmpq
from hypothesis import HealthCheck, settings
from hypothesis import strategies as st

from tangentbook.calculus import DomainError, Function, Graph, Node

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping

# neither library is annotated
mp: Any = mpmath
sp: Any = sympy

Recipe = tuple[Any, ...]
Point = tuple[Fraction, ...]

NAMES = ("x", "y", "z")
# dyadic, so that the same point is exact for doubles, balls and rationals
POINTS: tuple[Point, ...] = (
    (Fraction(11, 16), Fraction(-7, 8), Fraction(5, 4)),
    (Fraction(3, 8), Fraction(9, 16), Fraction(21, 32)),
    (Fraction(-5, 4), Fraction(13, 8), Fraction(-3, 16)),
    (Fraction(19, 8), Fraction(1, 4), Fraction(17, 16)),
)

steady = settings(
    derandomize=True,
    database=None,
    deadline=None,
    max_examples=120,
    suppress_health_check=[HealthCheck.filter_too_much, HealthCheck.too_slow],
)

UNARY = [
    "neg",
    "sin",
    "cos",
    "tan",
    "asin",
    "acos",
    "atan",
    "sinh",
    "cosh",
    "tanh",
    "exp",
    "log",
    "log10",
    "sqrt",
    "abs",
    "sign",
]
BINARY = ["add", "sub", "mul", "div", "pow", "atan2", "min", "max"]
COMPARED = ["lt", "le", "eq", "ne"]

_leaves = st.one_of(
    st.sampled_from([("var", name) for name in NAMES]),
    st.builds(
        lambda p, q: ("const", Fraction(p, q)), st.integers(-9, 9), st.sampled_from([1, 2, 3, 10])
    ),
    st.just(("pi",)),
)


def _conditions(parts: st.SearchStrategy[Recipe]) -> st.SearchStrategy[Recipe]:
    compared = st.tuples(st.sampled_from(COMPARED), parts, parts)
    return st.one_of(
        compared,
        st.tuples(st.just("not"), compared),
        st.tuples(st.sampled_from(["and", "or"]), compared, compared),
    )


def _larger(parts: st.SearchStrategy[Recipe]) -> st.SearchStrategy[Recipe]:
    return st.one_of(
        st.tuples(st.sampled_from(UNARY), parts),
        st.tuples(st.sampled_from(BINARY), parts, parts),
        st.tuples(st.just("ipow"), parts, st.integers(-3, 6)),
        st.tuples(st.just("if"), _conditions(parts), parts, parts),
    )


recipes: st.SearchStrategy[Recipe] = st.recursive(_leaves, _larger, max_leaves=7)


def build(graph: Graph, recipe: Recipe) -> Node:
    """The node of a recipe; ZeroDivisionError where it divides by the constant 0."""
    op = recipe[0]
    if op == "var":
        return graph.var(recipe[1])
    if op == "const":
        return graph.const(fmpq(recipe[1].numerator, recipe[1].denominator))
    if op == "pi":
        return graph.pi()
    if op == "ipow":
        return graph.ipow(build(graph, recipe[1]), recipe[2])
    args = [build(graph, part) for part in recipe[1:]]
    if op == "if":
        return graph.choose(args[0], args[1], args[2])
    return graph.unary(op, *args) if len(args) == 1 else graph.binary(op, *args)


def _ordered(test: Callable[[Any, Any], bool]) -> Callable[[Any, Any], bool]:
    return lambda a, b: bool(test(a, b))


_PRECISE: dict[str, Callable[..., Any]] = {
    **{name: getattr(mp, name) for name in UNARY if hasattr(mp, name)},
    "neg": lambda a: -a,
    "abs": abs,
    "add": lambda a, b: a + b,
    "sub": lambda a, b: a - b,
    "mul": lambda a, b: a * b,
    "div": lambda a, b: a / b,
    "pow": lambda a, b: a**b,
    "atan2": mp.atan2,
    "min": min,
    "max": max,
    "lt": _ordered(lambda a, b: a < b),
    "le": _ordered(lambda a, b: a <= b),
    "eq": _ordered(lambda a, b: a == b),
    "ne": _ordered(lambda a, b: a != b),
    "not": lambda a: not a,
    "and": lambda a, b: a and b,
    "or": lambda a, b: a or b,
}


def precise(recipe: Recipe, point: Mapping[str, Any]) -> Any:  # noqa: ANN401 - mpmath has no types
    """The value of a recipe in mpmath's current precision; only the branch in force is taken."""
    op = recipe[0]
    if op == "var":
        return point[recipe[1]]
    if op == "const":
        return mp.mpf(recipe[1].numerator) / recipe[1].denominator
    if op == "pi":
        return +mp.pi
    if op == "ipow":
        return precise(recipe[1], point) ** recipe[2]
    if op == "if":
        return precise(recipe[2 if precise(recipe[1], point) else 3], point)
    return _PRECISE[op](*(precise(part, point) for part in recipe[1:]))


SYMBOLS = {name: sp.Symbol(name, real=True) for name in NAMES}

_SYMBOLIC: dict[str, Callable[..., Any]] = {
    **_PRECISE,
    **{name: getattr(sp, name) for name in UNARY if hasattr(sp, name)},
    "log10": lambda a: sp.log(a) / sp.log(10),
    "abs": sp.Abs,
    "atan2": sp.atan2,
    "min": sp.Min,
    "max": sp.Max,
    "lt": sp.Lt,
    "le": sp.Le,
    "eq": sp.Eq,
    "ne": sp.Ne,
    "not": sp.Not,
    "and": sp.And,
    "or": sp.Or,
    "if": lambda c, a, b: sp.Piecewise((a, c), (b, True)),
}


def symbolic(recipe: Recipe) -> Any:  # noqa: ANN401 - the library's own types
    """The recipe as an expression of the symbolic library."""
    op = recipe[0]
    if op == "var":
        return SYMBOLS[recipe[1]]
    if op == "const":
        return sp.Rational(recipe[1].numerator, recipe[1].denominator)
    if op == "pi":
        return sp.pi
    if op == "ipow":
        return symbolic(recipe[1]) ** recipe[2]
    return _SYMBOLIC[op](*(symbolic(part) for part in recipe[1:]))


def exact(value: Fraction) -> arb:
    """A dyadic rational as an exact ball."""
    return arb(fmpq(value.numerator, value.denominator))


def balls_at(point: Point) -> list[arb]:
    """The point as exact balls."""
    return [exact(value) for value in point]


def usable_point(graph: Graph, node: Node) -> Point | None:
    """A point in the domain, of moderate size throughout, and clear of every switch."""
    inner = [n for n in graph.reachable([node]) if graph.op[n] not in _TRUTHS]
    gaps = [graph.sub(*_switch(graph, n)) for n in graph.reachable([node]) if _switches(graph, n)]
    roots = [*inner, *gaps]
    for point in POINTS:
        try:
            values = Function(graph, NAMES, roots).floats([float(v) for v in point])
        except DomainError:
            continue
        sizes = [abs(v) for v in values[: len(inner)]]
        clear = all(abs(v) > 1e-3 for v in values[len(inner) :])
        if clear and max(sizes) < 1e6:
            return point
    return None


_TRUTHS = ("lt", "le", "eq", "ne", "and", "or", "not")
_SWITCHES = ("lt", "le", "eq", "ne", "min", "max", "abs", "sign", "atan2")


def _switches(graph: Graph, node: Node) -> bool:
    return graph.op[node] in _SWITCHES


def _switch(graph: Graph, node: Node) -> tuple[Node, Node]:
    children = graph.children(node)
    if graph.op[node] == "atan2":  # the branch cut, approached from y = 0
        return children[0], graph.const(0)
    return (children[0], children[1]) if len(children) == 2 else (children[0], graph.const(0))
