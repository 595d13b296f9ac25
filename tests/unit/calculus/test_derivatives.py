"""Derivatives against the symbolic library and against central differences in 256-bit balls."""

from __future__ import annotations

from fractions import Fraction

import pytest
from flint import arb, ctx, fmpq
from hypothesis import assume, given, reject

from tangentbook.calculus import Function, Graph, Node, gradients, rate
from unit.calculus.expressions import (
    BINARY,
    NAMES,
    SYMBOLS,
    UNARY,
    Point,
    Recipe,
    balls_at,
    build,
    mp,
    precise,
    recipes,
    sp,
    steady,
    symbolic,
    usable_point,
)

BITS = 256
# central differences: h^2 f'''/6 with h = 2^-70 is 1e-42 f'''; cancellation 2^-256/h is 1e-56 f.
# Third derivatives of the expressions drawn stay below 1e12 of their scale, so 25 digits remain.
STEP = fmpq(1, 2**70)
DIGITS = mp.mpf(10) ** -25


@pytest.fixture(autouse=True)
def _precise() -> object:
    with ctx.workprec(BITS):
        yield


def _drawn(recipe: Recipe) -> tuple[Graph, Node, Point]:
    graph = Graph()
    try:
        node = build(graph, recipe)
    except (ZeroDivisionError, OverflowError):
        reject()
    point = usable_point(graph, node)
    assume(point is not None)
    assert point is not None
    return graph, node, point


def _slopes(graph: Graph, node: Node, point: Point) -> dict[str, arb]:
    (gradient,) = gradients(graph, [node], NAMES)
    names = list(gradient)
    values = Function(graph, NAMES, [gradient[n] for n in names]).balls(balls_at(point))
    return dict(zip(names, values, strict=True))


def _close(a: arb, b: arb, scale: float) -> bool:
    return bool(abs(a - b) < arb(1e-25) * scale)


@steady
@given(recipe=recipes)
def test_random_gradients_agree_with_central_differences(recipe: Recipe) -> None:
    """Every entry of a random expression's gradient is the limit of its difference quotient."""
    graph, node, point = _drawn(recipe)
    slopes = _slopes(graph, node, point)
    function = Function(graph, NAMES, [node])
    assume(all(abs(v) < 1e6 for v in slopes.values()))
    for k, name in enumerate(NAMES):
        ahead, behind = balls_at(point), balls_at(point)
        ahead[k], behind[k] = ahead[k] + STEP, behind[k] - STEP
        (high,), (low,) = function.balls(ahead), function.balls(behind)
        quotient = (high - low) / (2 * STEP)
        assert _close(slopes.get(name, arb(0)), quotient, 1e6), name


@steady
@given(recipe=recipes)
def test_random_gradients_agree_with_the_symbolic_library(recipe: Recipe) -> None:
    """Every entry of a random expression's gradient equals the library's derivative there."""
    graph, node, point = _drawn(recipe)
    slopes = _slopes(graph, node, point)
    expression = symbolic(recipe)
    where = {
        SYMBOLS[n]: sp.Rational(v.numerator, v.denominator)
        for n, v in zip(NAMES, point, strict=True)
    }
    for name in NAMES:
        derivative = sp.diff(expression, SYMBOLS[name])
        value = derivative.subs(where).evalf(40)
        assume(isinstance(value, (sp.Float, sp.Integer)))
        theirs = arb(str(value))
        mine = slopes.get(name, arb(0))
        size = max(1.0, abs(float(theirs.mid())))
        assert _close(mine, theirs, size), (name, derivative)


def _recipes_of_each_operation() -> list[Recipe]:
    """Each operation of a function of both variables, inside the domain at the first point."""
    x, y = ("var", "x"), ("var", "y")
    inner = ("mul", ("const", Fraction(1, 3)), ("add", x, ("mul", x, ("sin", y))))
    positive = ("add", ("const", Fraction(3, 2)), inner)
    positive_only = ("log", "log10", "sqrt")
    found: list[Recipe] = [(op, positive if op in positive_only else inner) for op in UNARY]
    found += [(op, positive, ("cos", y)) for op in BINARY]
    found += [("ipow", positive, n) for n in (-3, -1, 0, 1, 2, 5, 9)]
    found += [("if", (op, x, y), ("mul", x, y), ("ipow", x, 2)) for op in ("lt", "le", "eq", "ne")]
    both = (("lt", x, y), ("le", y, x))
    found += [("if", (op, *both), ("mul", x, y), ("ipow", x, 2)) for op in ("and", "or")]
    found += [("if", ("not", both[0]), ("mul", x, y), ("ipow", x, 2))]
    return found


@pytest.mark.parametrize(
    "recipe", _recipes_of_each_operation(), ids=lambda r: f"{r[0]}-{r[1][0]}-{r[-1]!s:.2}"
)
def test_each_operation(recipe: Recipe) -> None:
    """The chain rule of every operation, against differences of an independent evaluation."""
    graph = Graph()
    node = build(graph, recipe)
    point = (Fraction(11, 16), Fraction(-7, 8), Fraction(0))
    slopes = _slopes(graph, node, point)
    with mp.workdps(70):
        at = {n: mp.mpf(v.numerator) / v.denominator for n, v in zip(NAMES, point, strict=True)}
        h = mp.mpf(10) ** -30
        for name in ("x", "y"):
            high = precise(recipe, {**at, name: at[name] + h})
            low = precise(recipe, {**at, name: at[name] - h})
            quotient = (high - low) / (2 * h)
            mine = mp.mpf(slopes.get(name, arb(0)).mid().str(60, radius=False))
            assert abs(mine - quotient) <= DIGITS * max(1, abs(quotient)), name


def test_every_operation_is_covered() -> None:
    """The list above leaves out no operation of the graph."""
    graph = Graph()
    nodes = [build(graph, recipe) for recipe in _recipes_of_each_operation()]
    from tangentbook.calculus.graph import BINARY as TWO
    from tangentbook.calculus.graph import UNARY as ONE

    found = {graph.op[k] for k in graph.reachable(nodes)}
    assert {*ONE, *TWO, "if", "ipow", "const", "var"} - found <= set()


@steady
@given(recipe=recipes)
def test_structural_zeros_are_absent(recipe: Recipe) -> None:
    """A gradient names only variables that occur, and holds no entry that is the constant 0."""
    graph = Graph()
    try:
        node = build(graph, recipe)
    except ZeroDivisionError:
        return
    (gradient,) = gradients(graph, [node], NAMES)
    assert set(gradient) <= graph.leaves([node])
    assert not any(graph.is_zero(d) for d in gradient.values())


def test_what_cancels_or_is_constant_has_no_entry() -> None:
    """(x + 1) - (x + 1), sign(x), 0*x and a choice between constants depend on nothing."""
    graph = Graph()
    x = graph.var("x")
    shifted = graph.add(x, graph.const(1))
    nodes = [
        graph.sub(shifted, shifted),
        graph.unary("sign", x),
        graph.mul(graph.const(0), x),
        graph.choose(graph.binary("lt", x, graph.const(0)), graph.const(1), graph.const(2)),
        graph.binary("lt", x, graph.const(0)),
    ]
    assert gradients(graph, nodes, ["x"]) == [{}] * len(nodes)


def test_only_the_names_asked_for() -> None:
    """Other variables are constants."""
    graph = Graph()
    node = graph.mul(graph.var("x"), graph.var("y"))
    assert gradients(graph, [node], ["x"]) == [{"x": graph.var("y")}]
    assert gradients(graph, [node], []) == [{}]


def test_a_kink_gives_the_branch_in_force() -> None:
    """d|x| is sign(x); of max and min the larger, the smaller one's derivative."""
    graph = Graph()
    x, y = graph.var("x"), graph.var("y")
    nodes = [graph.unary("abs", x), graph.binary("max", x, y), graph.binary("min", x, y)]
    rows = gradients(graph, nodes, ["x", "y"])
    function = Function(graph, ["x", "y"], [rows[0]["x"], *rows[1].values(), *rows[2].values()])
    assert function.floats([-2.0, 3.0]) == [-1, 0, 1, 1, 0]
    assert function.floats([3.0, -2.0]) == [1, 1, 0, 0, 1]


def test_time_derivative() -> None:
    """(m V)' is m' V + m V', with rates of zero leaving nothing behind."""
    graph = Graph()
    product = graph.mul(graph.var("m"), graph.var("V"))
    both = rate(graph, product, lambda name: graph.var(name + "'"))
    expected = graph.add(
        graph.mul(graph.var("m"), graph.var("V'")), graph.mul(graph.var("V"), graph.var("m'"))
    )
    assert both == expected
    fixed = rate(graph, product, lambda n: graph.const(0) if n == "m" else graph.var(n + "'"))
    assert fixed == graph.mul(graph.var("m"), graph.var("V'"))
