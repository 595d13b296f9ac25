"""The expression graph: one node for equal expressions, exact folding, no recursion."""

from __future__ import annotations

import sys
from fractions import Fraction

import pytest
from flint import fmpq
from hypothesis import given
from hypothesis import strategies as st

from tangentbook.calculus import DomainError, Function, Graph, gradients, latex, plain_text
from tangentbook.calculus.graph import BINARY, MAX_CONSTANT_BITS, MAX_EXPONENT, UNARY
from unit.calculus.expressions import Recipe, build, recipes, steady


@pytest.fixture
def graph() -> Graph:
    """An empty graph."""
    return Graph()


@steady
@given(recipe=recipes)
def test_equal_expressions_are_one_node(recipe: Recipe) -> None:
    """Building an expression twice makes nothing new."""
    graph = Graph()
    try:
        first = build(graph, recipe)
    except ZeroDivisionError:
        return
    size = len(graph)
    assert build(graph, recipe) == first
    assert len(graph) == size


@steady
@given(recipe=recipes)
def test_children_have_smaller_numbers(recipe: Recipe) -> None:
    """Node numbers are an order of evaluation."""
    graph = Graph()
    try:
        root = build(graph, recipe)
    except ZeroDivisionError:
        return
    nodes = graph.reachable([root])
    assert nodes == sorted(nodes)
    assert nodes[-1] == root
    assert all(child < node for node in nodes for child in graph.children(node))


fractions = st.fractions(min_value=-50, max_value=50, max_denominator=60)


@steady
@given(a=fractions, b=fractions)
def test_constants_fold_as_exact_rationals(a: Fraction, b: Fraction) -> None:
    """Sums, differences, products and quotients of constants are those of exact fractions."""
    graph = Graph()
    x, y = (graph.const(fmpq(v.numerator, v.denominator)) for v in (a, b))
    expected = {"add": a + b, "sub": a - b, "mul": a * b}
    if b:
        expected["div"] = a / b
    for op, value in expected.items():
        found = graph.value_of(graph.binary(op, x, y))
        assert found == fmpq(value.numerator, value.denominator), op
    folded = graph.value_of(graph.ipow(x, 3))
    assert folded == fmpq(a.numerator, a.denominator) ** 3


def test_decimals_do_not_pass_through_floats(graph: Graph) -> None:
    """0.1 + 0.2 is 3/10, which it is not in double precision."""
    total = graph.add(graph.const(fmpq(1, 10)), graph.const(fmpq(2, 10)))
    assert total == graph.const(fmpq(3, 10))
    assert 0.1 + 0.2 != 3 / 10


def test_folding_stops_at_its_cap(graph: Graph) -> None:
    """Repeated squaring of a constant stops growing and stays a node."""
    value = graph.const(fmpq(123456789, 10**9))
    for _ in range(20):
        value = graph.mul(value, value)
    bits = [graph.value_of(k) for k in range(len(graph)) if graph.op[k] == "const"]
    assert max(v.height_bits() for v in bits if v is not None) <= MAX_CONSTANT_BITS
    assert graph.op[value] == "mul"
    assert graph.op[graph.ipow(graph.const(fmpq(10**9 + 7, 3)), MAX_EXPONENT)] == "ipow"


def _undefined(graph: Graph) -> list[int]:
    """Expressions over x that have no value at x = -1."""
    x, zero = graph.var("x"), graph.const(0)
    log = graph.unary("log", x)
    return [
        graph.mul(zero, log),
        graph.mul(log, zero),
        graph.sub(log, log),
        graph.div(log, log),
        graph.div(zero, graph.add(x, graph.const(1))),
        graph.ipow(log, 0),
        graph.power(graph.unary("sqrt", x), zero),
        graph.binary("min", graph.const(1), log),
        graph.binary("min", log, graph.const(1)),
        graph.unary("sign", log),
        graph.mul(zero, graph.binary("pow", x, graph.const(fmpq(1, 3)))),
    ]


@pytest.mark.parametrize("index", range(11))
def test_no_simplification_hides_that_there_is_no_value(graph: Graph, index: int) -> None:
    """0*log(x), log(x)^0, log(x) - log(x), sign(log(x)) … have no value at x = -1."""
    node = _undefined(graph)[index]
    function = Function(graph, ["x"], [node])
    with pytest.raises(DomainError):
        function.floats([-1.0])
    assert len(_undefined(graph)) == 11


@pytest.mark.parametrize("index", [0, 1, 2, 3, 5, 6, 7, 8, 9, 10])
def test_where_it_has_a_value_it_is_the_expected_one(graph: Graph, index: int) -> None:
    """The same expressions at x = e are 0, 0, 0, 1, 1, 1, 1, 1, 1, 0 (log e = 1)."""
    node = _undefined(graph)[index]
    expected = {0: 0, 1: 0, 2: 0, 3: 1, 5: 1, 6: 1, 7: 1, 8: 1, 9: 1, 10: 0}[index]
    (value,) = Function(graph, ["x"], [node]).floats([2.718281828459045])
    assert value == pytest.approx(expected, abs=1e-15)


def test_impossible_constants_are_refused(graph: Graph) -> None:
    """Division by the constant 0 and exponents beyond the limit raise at once."""
    x, zero = graph.var("x"), graph.const(0)
    with pytest.raises(ZeroDivisionError):
        graph.div(x, zero)
    with pytest.raises(ZeroDivisionError):
        graph.power(zero, graph.const(-1))
    with pytest.raises(OverflowError):
        graph.power(x, graph.const(MAX_EXPONENT + 1))
    with pytest.raises(OverflowError):
        graph.ipow(x, -MAX_EXPONENT - 1)


def test_powers_by_kind_of_exponent(graph: Graph) -> None:
    """Whole exponents are integer powers, 1/2 the square root, anything else a real power."""
    x = graph.var("x")
    assert graph.power(x, graph.const(3)) == graph.ipow(x, 3)
    assert graph.power(x, graph.const(fmpq(1, 2))) == graph.unary("sqrt", x)
    assert graph.op[graph.power(x, graph.const(fmpq(1, 3)))] == "pow"
    assert graph.op[graph.power(x, graph.var("y"))] == "pow"
    assert graph.power(x, graph.const(1)) == x
    assert graph.power(x, graph.const(0)) == graph.const(1)
    assert graph.power(graph.const(0), graph.const(0)) == graph.const(1)


def test_signs_move_outwards(graph: Graph) -> None:
    """A minus is pulled out of products and sums, so that equal things meet in one node."""
    x, y = graph.var("x"), graph.var("y")
    assert graph.add(x, graph.neg(y)) == graph.sub(x, y)
    assert graph.sub(x, graph.neg(y)) == graph.add(x, y)
    assert graph.mul(graph.neg(x), graph.neg(y)) == graph.mul(x, y)
    assert graph.neg(graph.sub(x, y)) == graph.sub(y, x)
    assert graph.mul(graph.const(-1), x) == graph.neg(x)
    assert graph.mul(x, graph.const(-1)) == graph.neg(x)
    assert graph.div(graph.neg(x), y) == graph.neg(graph.div(x, y))


def test_a_sum_of_20000_terms_needs_no_recursion(graph: Graph) -> None:
    """Walks, derivatives, evaluation and typesetting of a deep chain stay within the stack."""
    count = 20_000
    assert count > sys.getrecursionlimit()
    x = graph.var("x")
    node = x
    for k in range(1, count):
        node = graph.add(graph.mul(node, graph.const(fmpq(999, 1000))), graph.var(f"a{k % 7}"))
    names = ["x", *(f"a{k}" for k in range(7))]
    assert graph.leaves([node]) == set(names)
    (gradient,) = gradients(graph, [node], ["x"])
    (slope,) = Function(graph, names, [gradient["x"]]).floats([1.0] * 8)
    assert slope == pytest.approx(0.999 ** (count - 1), rel=1e-9)
    # a geometric sum: 1000 (1 - q^n) + q^n at all variables 1
    (value,) = Function(graph, names, [node]).floats([1.0] * 8)
    q = 0.999 ** (count - 1)
    assert value == pytest.approx(1000 * (1 - q) + q, rel=1e-9)
    moved = graph.substitute([node], {x: graph.var("w")})
    assert graph.leaves(moved) == {"w", *names[1:]}
    assert plain_text(graph, node) == "…"
    assert latex(graph, node) == r"\dots"


def test_terms_of_a_sum(graph: Graph) -> None:
    """Additive terms come left to right, without their signs, products unbroken."""
    a, b, c = (graph.var(n) for n in "abc")
    product = graph.mul(b, graph.add(a, c))
    node = graph.add(graph.sub(a, product), graph.neg(graph.sub(c, a)))
    assert graph.terms(node) == [a, product, a, c]
    assert graph.terms(product) == [product]


def test_substitution_rebuilds_and_folds(graph: Graph) -> None:
    """Values put in fold exactly; a factor 0 removes its product; untouched parts stay."""
    x, y = graph.var("x"), graph.var("y")
    node = graph.add(graph.mul(x, graph.unary("log", y)), graph.ipow(x, 2))
    assert graph.substitute([node], {x: graph.const(0)}) == [graph.const(0)]
    (at_three,) = graph.substitute([graph.ipow(x, 2)], {x: graph.const(3)})
    assert at_three == graph.const(9)
    assert graph.substitute([node, y], {}) == [node, y]
    (swapped,) = graph.substitute([graph.sub(x, y)], {x: y, y: x})
    assert swapped == graph.sub(y, x)
    choice = graph.choose(graph.binary("lt", x, y), x, y)
    (same,) = graph.substitute([choice], {x: y})
    assert same == y


def test_every_operation_can_be_rebuilt(graph: Graph) -> None:
    """Substitution reaches through each operation there is."""
    x, w = graph.var("x"), graph.var("w")
    for op in UNARY:
        (moved,) = graph.substitute([graph.unary(op, x)], {x: w})
        assert moved == graph.unary(op, w), op
    for op in BINARY:
        (moved,) = graph.substitute([graph.binary(op, x, graph.var("y"))], {x: w})
        assert moved == graph.binary(op, w, graph.var("y")), op
    assert graph.substitute([graph.ipow(x, -3)], {x: w}) == [graph.ipow(w, -3)]
