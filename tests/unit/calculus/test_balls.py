"""Functions on balls: they enclose every value of the ball, and not much more."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import pytest
from flint import arb, arb_series, ctx
from hypothesis import given
from hypothesis import strategies as st

from tangentbook.calculus import Function, Graph
from tangentbook.calculus.balls import FUNCTIONS
from unit.calculus.expressions import mp, steady

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

BITS = 128
# radii of balls have 30 bits: an enclosure is as wide as the range, plus roundings of this size
LOOSE = 1e-7


@pytest.fixture(autouse=True)
def _precise() -> Iterator[None]:
    with ctx.workprec(BITS), mp.workdps(50):
        yield


def ball(low: float, high: float) -> arb:
    """The ball between two doubles (radius rounded upwards)."""
    return arb((low + high) / 2, (high - low) / 2)


# name, function of mpmath, a ball inside the domain, the exact range there
MONOTONE: list[tuple[str, float, float]] = [
    ("tanh", -5, 5),
    ("tanh", -0.5, 0.25),
    ("tanh", 19, 21),
    ("tanh", -800, 800),
    ("sinh", -5, 5),
    ("sinh", 1, 4),
    ("exp", -5, 5),
    ("log", 0.125, 8),
    ("log10", 0.125, 8),
    ("sqrt", 0.25, 9),
    ("asin", -0.875, 0.96875),
    ("asin", 0.9375, 0.99999),
    ("acos", -0.875, 0.96875),
    ("acos", 0.9375, 0.99999),
    ("atan", -5, 5),
    ("atan", 10, 1000),
    ("tan", -1.25, 1.25),
]


@pytest.mark.parametrize(("name", "low", "high"), MONOTONE)
def test_a_monotone_function_of_a_wide_ball(name: str, low: float, high: float) -> None:
    """The enclosure holds the values at the ends and is hardly wider than they are apart."""
    found = FUNCTIONS[name](ball(low, high))
    assert isinstance(found, arb)
    exact: Callable[[float], Any] = getattr(mp, name)
    ends = sorted((exact(low), exact(high)))
    lowest, highest = float(found.lower()), float(found.upper())
    width = float(ends[1] - ends[0])
    assert found.contains(arb(mp.nstr(ends[0], 40)))
    assert found.contains(arb(mp.nstr(ends[1], 40)))
    assert lowest >= float(ends[0]) - LOOSE * max(width, 1)
    assert highest <= float(ends[1]) + LOOSE * max(width, 1)


EVEN: list[tuple[str, tuple[int, ...], float, float, float, float]] = [
    ("cosh", (), -5, 5, 1.0, 74.20994852478785),
    ("cosh", (), -1, 2, 1.0, 3.7621956910836314),
    ("cosh", (), 1, 2, 1.5430806348152437, 3.7621956910836314),
    ("abs", (), -1, 2, 0, 2),
    ("abs", (), -3, -2, 2, 3),
    ("ipow", (2,), -2, 2, 0, 4),
    ("ipow", (2,), 1, 3, 1, 9),
    ("ipow", (4,), -3, 1, 0, 81),
    ("ipow", (3,), -2, 2, -8, 8),
    ("ipow", (3,), -1, 3, -1, 27),
    ("ipow", (5,), 1, 3, 1, 243),
]


@pytest.mark.parametrize(("name", "more", "low", "high", "least", "greatest"), EVEN)
def test_powers_and_even_functions_of_a_wide_ball(
    name: str, more: tuple[int, ...], low: float, high: float, least: float, greatest: float
) -> None:
    """(0 ± r)^3 is ± r^3, x^2 is never negative by more than rounding, cosh never below 1."""
    found = FUNCTIONS[name](ball(low, high), *more)
    assert isinstance(found, arb)
    assert float(found.lower()) == pytest.approx(least, abs=LOOSE * greatest)
    assert float(found.upper()) == pytest.approx(greatest, abs=LOOSE * greatest)


OUTSIDE: list[tuple[str, float, float]] = [
    ("sqrt", -0.5, 0.5),
    ("sqrt", -2, -1),
    ("log", -0.5, 0.5),
    ("log10", -0.5, 0.5),
    ("asin", 0.5, 1.5),
    ("acos", -1.5, 0.5),
    ("tan", 1.5, 1.625),
]


@pytest.mark.parametrize(("name", "low", "high"), OUTSIDE)
def test_across_the_edge_of_the_domain_nothing_is_claimed(
    name: str, low: float, high: float
) -> None:
    """A ball that reaches where there is no value has no finite enclosure."""
    found = FUNCTIONS[name](ball(low, high))
    assert isinstance(found, arb)
    assert not found.is_finite()


@pytest.mark.parametrize(
    ("name", "args", "value"),
    [
        ("sqrt", (0,), 0),
        ("pow", (0, 1.5), 0),
        ("asin", (1,), "1.5707963267948966192313216916397514421"),
        ("acos", (-1,), "3.1415926535897932384626433832795028842"),
        ("acos", (1,), 0),
        ("sign", (0,), 0),
        ("atan2", (0, -1), "3.1415926535897932384626433832795028842"),
    ],
)
def test_at_the_edge_of_the_domain(name: str, args: tuple[float, ...], value: float | str) -> None:
    """The end points of the domain themselves have their values."""
    found = FUNCTIONS[name](*(arb(a) for a in args))
    assert isinstance(found, arb)
    assert abs(found - arb(value)) < 1e-35


names = st.sampled_from(
    [
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
)


@steady
@given(
    name=names,
    center=st.integers(-640, 640),
    radius=st.integers(0, 128),
    inside=st.integers(-128, 128),
)
def test_every_value_in_the_ball_is_enclosed(
    name: str, center: int, radius: int, inside: int
) -> None:
    """Whatever point of a ball is taken, the function's value there lies in the enclosure."""
    with ctx.workprec(BITS), mp.workdps(50):
        around, spread = center / 128, radius / 128
        x = around + spread * inside / 128
        found = FUNCTIONS[name](arb(around, spread))
        assert isinstance(found, arb)
        exact = {"abs": mp.fabs}.get(name, getattr(mp, name, None))
        if name in ("log", "log10") and x <= 0:
            assert not found.is_finite()
            return
        value = exact(mp.mpf(x)) if exact is not None else mp.mpf(0)
        if isinstance(value, mp.mpc):
            assert not found.is_finite() or value.imag == 0
            return
        # 45 digits of the value, with the last one's uncertainty
        assert not found.is_finite() or found.overlaps(arb(mp.nstr(value, 45), "1e-40"))


def _speed() -> Function:
    graph = Graph()
    squares = graph.add(graph.ipow(graph.var("u"), 2), graph.ipow(graph.var("w"), 2))
    return Function(graph, ["u", "w"], [graph.unary("sqrt", squares)])


def test_inside_the_domain_a_wide_box_has_a_finite_range() -> None:
    """sqrt(u^2 + w^2) over u in [20, 80], w in [-60, 60] is within [20, 100], not NaN."""
    (found,) = _speed().balls([ball(20, 80), ball(-60, 60)])
    assert found.is_finite()
    assert float(found.lower()) == pytest.approx(20, abs=1e-4)
    assert float(found.upper()) == pytest.approx(100, abs=1e-4)


def test_choices_that_cannot_be_told_are_unions() -> None:
    """if, min, max and sign over a ball across the switch hold what either side gives."""
    graph = Graph()
    x, zero, one = graph.var("x"), graph.const(0), graph.const(1)
    below = graph.binary("lt", x, zero)
    nodes = [
        graph.choose(below, graph.neg(x), graph.const(7)),
        graph.binary("max", x, zero),
        graph.binary("min", x, zero),
        graph.unary("sign", x),
        graph.choose(graph.unary("not", graph.binary("eq", x, one)), zero, one),
    ]
    found = Function(graph, ["x"], nodes).balls([ball(-1, 2)])
    ranges = [(float(v.lower()), float(v.upper())) for v in found]
    expected = [(-2, 7), (0, 2), (-1, 0), (-1, 1), (0, 1)]
    for (low, high), (least, greatest) in zip(ranges, expected, strict=True):
        assert low == pytest.approx(least, abs=1e-6)
        assert high == pytest.approx(greatest, abs=1e-6)
    (away,) = Function(graph, ["x"], nodes[:1]).balls([ball(-2, -1)])
    assert float(away.upper()) == pytest.approx(2, abs=1e-6)


@pytest.mark.parametrize("name", ["lt", "le", "eq", "ne"])
def test_comparisons_have_three_answers(name: str) -> None:
    """True and False only where every pair of points says so; else None."""
    compare = FUNCTIONS[name]
    one, two, around = arb(1), arb(2), ball(0, 3)
    assert compare(one, two) is (name in ("lt", "le", "ne"))
    assert compare(two, one) is (name == "ne")
    assert compare(one, one) is (name in ("le", "eq"))
    assert compare(around, one) is None
    assert compare(around, around) is None


def test_logic_with_three_answers() -> None:
    """and, or, not follow from what is known whatever the unknown turns out to be."""
    both, either, negation = FUNCTIONS["and"], FUNCTIONS["or"], FUNCTIONS["not"]
    yes, no, unknown = True, False, None
    assert [both(no, unknown), both(unknown, no), both(yes, unknown)] == [no, no, unknown]
    assert [either(yes, unknown), either(unknown, yes)] == [yes, yes]
    assert either(no, unknown) is unknown
    assert [negation(unknown), negation(yes), negation(no)] == [unknown, no, yes]


def test_a_series_of_the_root_at_zero_is_not_a_number() -> None:
    """sqrt(x) has no Taylor series at 0, and no coefficient pretends otherwise."""
    found = FUNCTIONS["sqrt"](arb_series([0, 1], 3))
    assert isinstance(found, arb_series)
    assert all(found[k].is_nan() for k in range(3))


def test_a_series_at_a_kink_holds_both_branches() -> None:
    """|x| across 0 has the slopes of both its branches, so x*|x| has the curvature of both."""
    across = arb_series([arb("0.5", "0.5"), 1], 3)
    found = FUNCTIONS["abs"](across)
    assert isinstance(found, arb_series)
    assert all(found[1].contains(slope) for slope in (-1, 1))
    product = across * found
    assert all(product[2].contains(half) for half in (-1, 1))
    assert float(abs(product[2]).upper()) < 1.001
    sign = FUNCTIONS["sign"](across)
    assert isinstance(sign, arb)
    assert all(sign.contains(value) for value in (-1, 0, 1))
