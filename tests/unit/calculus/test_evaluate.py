"""One expression, four kinds of numbers: doubles, many points, balls and power series agree."""

from __future__ import annotations

import math

import numpy as np
import pytest
from flint import arb, arb_series, ctx, fmpq
from hypothesis import assume, given, reject

from tangentbook.calculus import DomainError, Function, Graph, Node, gradients
from unit.calculus.expressions import (
    NAMES,
    Point,
    Recipe,
    balls_at,
    build,
    mp,
    precise,
    recipes,
    steady,
    usable_point,
)

BITS = 256
# balls of 45 bits carry the rounding of every operation 2^8 times larger than doubles round:
# room for library functions that are an ulp or two off
ROUNDING_BITS = 45


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


@steady
@given(recipe=recipes)
def test_balls_contain_the_value_and_are_narrow(recipe: Recipe) -> None:
    """At an exact point the ball holds mpmath's 100-digit value, to better than 60 digits."""
    graph, node, point = _drawn(recipe)
    with ctx.workprec(BITS):
        (ball,) = Function(graph, NAMES, [node]).balls(balls_at(point))
        with mp.workdps(100):
            at = {n: mp.mpf(v.numerator) / v.denominator for n, v in zip(NAMES, point, strict=True)}
            value = precise(recipe, at)
            assert value.imag == 0 if isinstance(value, mp.mpc) else True
            text = mp.nstr(mp.re(value), 90)
        assert abs(ball - arb(text)) < arb(1e-60) * max(1.0, abs(float(text)))
        assert float(ball.rad()) <= 1e-60 * max(1.0, abs(float(text)))


@steady
@given(recipe=recipes)
def test_doubles_lie_within_the_balls_of_their_precision(recipe: Recipe) -> None:
    """One point and many points give what 45-bit balls enclose."""
    graph, node, point = _drawn(recipe)
    function = Function(graph, NAMES, [node])
    x = [float(v) for v in point]
    with ctx.workprec(ROUNDING_BITS):
        (ball,) = function.balls(balls_at(point))
    assume(ball.is_finite())
    (single,) = function.floats(x)
    (many,) = function.batch(np.array([x, x, x]).T)
    assert many.shape == (3,)
    # both may stop at numbers below the smallest normal double
    slack = arb(0, 1e-300)
    for value in (single, *many.tolist()):
        assert (ball + slack).contains(arb(value)), value


@steady
@given(recipe=recipes)
def test_series_coefficients_are_the_derivatives(recipe: Recipe) -> None:
    """Along each variable the series starts f, f', f''/2, as the derivative nodes say."""
    graph, node, point = _drawn(recipe)
    with ctx.workprec(BITS):
        for k, name in enumerate(NAMES):
            (first,) = gradients(graph, [node], [name])
            slope = first.get(name, graph.const(0))
            (second,) = gradients(graph, [slope], [name])
            bend = second.get(name, graph.const(0))
            expected = Function(graph, NAMES, [node, slope, bend]).balls(balls_at(point))
            expected[2] = expected[2] / 2
            assume(all(v.is_finite() and abs(v) < 1e9 for v in expected))
            variables: list[arb | arb_series] = [*balls_at(point)]
            variables[k] = arb_series([balls_at(point)[k], 1], 3)
            (found,) = Function(graph, NAMES, [node]).series(variables)
            for order, value in enumerate(expected):
                coefficient = _coefficient(found, order)
                assert abs(coefficient - value) < arb(1e-40) * max(1.0, abs(float(value.mid())))


def _coefficient(series: arb | arb_series, order: int) -> arb:
    if isinstance(series, arb):
        return series if order == 0 else arb(0)
    return series[order]


def _function(make: str) -> Function:
    """A function of x: a choice, or an expression that may have no value."""
    graph = Graph()
    x, zero, one = graph.var("x"), graph.const(0), graph.const(1)
    positive = graph.binary("lt", zero, x)
    root, log = graph.unary("sqrt", x), graph.unary("log", x)
    node = {
        "untaken root": lambda: graph.choose(positive, root, zero),
        "untaken quotient": lambda: graph.choose(positive, graph.div(one, x), one),
        "untaken negative power": lambda: graph.choose(positive, graph.ipow(x, -7), one),
        "guarded condition": lambda: graph.choose(
            graph.binary("and", positive, graph.binary("lt", log, one)), log, one
        ),
        "root": lambda: root,
        "log": lambda: log,
        "quotient": lambda: graph.div(one, x),
        "power": lambda: graph.ipow(x, -7),
        "real power": lambda: graph.binary("pow", x, graph.const(fmpq(1, 3))),
        "least": lambda: graph.binary("min", one, log),
        "greatest": lambda: graph.binary("max", log, one),
        "sign": lambda: graph.unary("sign", log),
        "arc": lambda: graph.unary("asin", graph.sub(x, one)),
        "cancelled": lambda: graph.mul(zero, log),
    }[make]()
    return Function(graph, ["x"], [node])


@pytest.mark.parametrize(
    ("make", "x", "value"),
    [
        ("untaken root", -4.0, 0.0),
        ("untaken root", 4.0, 2.0),
        ("untaken quotient", 0.0, 1.0),
        ("untaken quotient", 4.0, 0.25),
        ("untaken negative power", 0.0, 1.0),
        ("guarded condition", -1.0, 1.0),
        ("guarded condition", 2.0, math.log(2)),
    ],
)
def test_an_untaken_branch_need_not_have_a_value(make: str, x: float, value: float) -> None:
    """What if(…) does not choose may be undefined, in all kinds of numbers."""
    function = _function(make)
    assert function.floats([x]) == [value]
    assert function.batch(np.array([[x]]))[0].tolist() == [value]
    (ball,) = function.balls([arb(x)])
    assert ball.contains(arb(value)) or abs(ball - arb(value)) < 1e-15


@pytest.mark.parametrize(
    ("make", "x"),
    [
        ("root", -1.0),
        ("log", 0.0),
        ("log", -1.0),
        ("quotient", 0.0),
        ("power", 0.0),
        ("real power", -8.0),
        ("least", -1.0),
        ("greatest", -1.0),
        ("sign", -1.0),
        ("arc", 3.0),
        ("cancelled", -1.0),
    ],
)
def test_outside_the_domain_nothing_is_finite(make: str, x: float) -> None:
    """No value: DomainError for one point, not finite for many and for balls."""
    function = _function(make)
    with pytest.raises(DomainError):
        function.floats([x])
    assert not np.isfinite(function.batch(np.array([[x]]))[0]).any()
    assert not function.balls([arb(x)])[0].is_finite()


@pytest.mark.parametrize(("op", "x"), [("exp", 800.0), ("sinh", -800.0), ("cosh", 800.0)])
def test_an_overflow_inside_may_still_give_a_value(op: str, x: float) -> None:
    """1/(1 + exp(800)) is 0 in double precision, not an error."""
    graph = Graph()
    grown = graph.unary(op, graph.var("x"))
    node = graph.div(graph.const(1), graph.add(graph.const(1), grown))
    function = Function(graph, ["x"], [node, graph.div(graph.const(1), graph.ipow(grown, 3))])
    assert function.floats([x]) == [0.0, 0.0]
    assert function.batch(np.array([[x]]))[0].tolist() == [0.0]
    with pytest.raises(DomainError):
        Function(graph, ["x"], [grown]).floats([x])


def test_each_output_of_many_points_has_one_value_a_point() -> None:
    """Constants and conditions are spread over the points like everything else."""
    graph = Graph()
    x = graph.var("x")
    nodes = [graph.const(fmpq(1, 3)), graph.pi(), graph.binary("lt", x, graph.const(0)), x]
    values = Function(graph, ["x"], nodes).batch(np.array([[-1.0, 2.0]]))
    assert [v.tolist() for v in values] == [[1 / 3] * 2, [math.pi] * 2, [1.0, 0.0], [-1.0, 2.0]]


def test_constants_are_correctly_rounded() -> None:
    """A rational constant becomes the double nearest to it; balls follow the precision."""
    graph = Graph()
    node = graph.const(fmpq(10**40 + 1, 3 * 10**40))
    function = Function(graph, [], [node])
    assert function.floats([]) == [(10**40 + 1) / (3 * 10**40)]
    for bits in (64, 300):
        with ctx.workprec(bits):
            (ball,) = function.balls([])
            assert ball.contains(fmpq(10**40 + 1, 3 * 10**40))
            assert ball.rel_accuracy_bits() >= bits - 4


def test_switches_are_passed_in() -> None:
    """A decided condition stands behind the variables and is not computed."""
    graph = Graph()
    x = graph.var("x")
    sign = graph.unary("sign", x)
    node = graph.mul(sign, graph.add(x, graph.const(2)))
    function = Function(graph, ["x"], [node], switches=[sign])
    assert function.floats([0.0, 1.0]) == [2.0]
    assert function.floats([0.0, -1.0]) == [-2.0]
    assert Function(graph, ["x"], [node]).floats([0.0]) == [0.0]


def test_only_numbers_of_nodes_reach_the_compiler() -> None:
    """A variable's name never becomes program text, however it is spelled."""
    graph = Graph()
    evil = "__import__('os').abort() #\n"
    node = graph.add(graph.var(evil), graph.unary("sin", graph.var("exec")))
    assert Function(graph, [evil, "exec"], [node]).floats([1.5, 0.0]) == [1.5]
