"""Typesetting: plain text reads back to the same value, LaTeX is well formed and inert."""

from __future__ import annotations

import re

import pytest
from flint import arb, ctx, fmpq
from hypothesis import assume, given
from hypothesis import strategies as st

from tangentbook.calculus import Function, Graph, Node, decimal_text, latex, latex_name, plain_text
from tangentbook.plant.grammar import parse_expression
from tangentbook.plant.lower import Lowering, no_rate
from unit.calculus.expressions import (
    NAMES,
    Recipe,
    balls_at,
    build,
    recipes,
    steady,
    usable_point,
)


def read(graph: Graph, text: str) -> Node:
    """The node of a text in the plant's language; every name is a variable."""
    lowering = Lowering(graph, lambda name, primes, _: graph.var(name + "'" * primes), no_rate("x"))
    return lowering.node(parse_expression(text, "text"), "text")


@steady
@given(recipe=recipes)
def test_plain_text_reads_back_to_the_same_value(recipe: Recipe) -> None:
    """What is printed, read by the plant's own grammar, has the same 200-bit value."""
    graph = Graph()
    try:
        node = build(graph, recipe)
    except ZeroDivisionError:
        return
    assume(graph.op[node] not in ("lt", "le", "eq", "ne", "and", "or", "not"))
    text = plain_text(graph, node)
    again = read(graph, text)
    point = usable_point(graph, node)
    assume(point is not None)
    assert point is not None
    with ctx.workprec(256):
        first, second = Function(graph, NAMES, [node, again]).balls(balls_at(point))
    size = max(1.0, abs(float(first.mid())))
    assert abs(first - second) < arb(1e-60) * size, text


@pytest.mark.parametrize(
    "text",
    [
        "x + y - z",
        "x - (y - z)",
        "x/(y*z)",
        "x/y/z",
        "x/(y/z)",
        "x*y/z",
        "-x^2",
        "(-x)^2",
        "(x^y)^z",
        "x^(y^2)",
        "x^-y",
        "2*x - 3.5*y + 1e-9",
        "-(x + y)*z",
        "abs(x)*x",
        "atan2(y, x)",
        "min(x, y, z)",
        "clip(x, -1, 1)",
        "if(x < 0 and not y >= 1 or z == 2, x, y/z)",
        "if((x < 0 or y > 1) and z != 2, x, y)",
        "sqrt(x^2 + y^2)",
        "log(x)^0",
        "1.23456789e12*x + 1e-30",
        "x''*y' + x",
        "x^3/3 + 0.1*x",
        "x/(-y)",
        "x - -2",
        "x*(-2)",
    ],
)
def test_a_text_is_stable(text: str) -> None:
    """Reading, printing and reading again gives the very same node."""
    graph = Graph()
    node = read(graph, text)
    printed = plain_text(graph, node)
    assert read(graph, printed) == node, printed


PLAIN = {
    "J*theta'' + b*theta'": "J*theta'' + b*theta'",
    "m*g*sin( theta )": "m*g*sin(theta)",
    "a-(b-c)": "a - (b - c)",
    "a-(b+c)": "a - (b + c)",
    "a*(b+c)": "a*(b + c)",
    "-(a*b)": "-a*b",
    "(a+b)^2": "(a + b)^2",
    "a^(b+1)": "a^(b + 1)",
    "a/(b*c)": "a/(b*c)",
    "0.000001*a": "1e-6*a",
    "12345678901*a": "1.2345678901e10*a",
    "a/3": "a/3",
    "x**2": "x^2",
}


@pytest.mark.parametrize(("text", "printed"), PLAIN.items())
def test_plain_text(text: str, printed: str) -> None:
    """Brackets only where they are needed."""
    graph = Graph()
    assert plain_text(graph, read(graph, text)) == printed


LATEX = {
    "J*theta''": r"J \cdot \ddot{\theta}",
    "a/b": r"\frac{a}{b}",
    "sqrt(a)": r"\sqrt{a}",
    "abs(v)*v": r"\left|v\right| \cdot v",
    "a^2": r"{a}^{2}",
    "2.5e-9*a": r"2.5 \cdot 10^{-9} \cdot a",
    "a*pi": r"a \cdot \pi",
    "log(a)": r"\ln\left(a\right)",
    "log10(a)": r"\log_{10}\left(a\right)",
    "asin(a)": r"\arcsin\left(a\right)",
    "atan2(a, b)": r"\operatorname{atan2}\left(a, b\right)",
    "a - (b - c)": r"a - \left(b - c\right)",
    "(a + b)*c": r"\left(a + b\right) \cdot c",
    "if(a < b, a, b)": (
        r"\begin{cases} a & \text{if } a \lt b \cr b & \text{otherwise} \end{cases}"
    ),
}


@pytest.mark.parametrize(("text", "typeset"), LATEX.items())
def test_latex(text: str, typeset: str) -> None:
    """Products, quotients, roots and functions as books set them."""
    graph = Graph()
    assert latex(graph, read(graph, text)) == typeset


TYPESET_NAMES = {
    "x": "x",
    "theta": r"\theta",
    "Omega": r"\Omega",
    "theta'": r"\dot{\theta}",
    "theta''": r"\ddot{\theta}",
    "x'''": r"\dddot{x}",
    "x'''''": r"x^{(5)}",
    "h1": r"h_{1}",
    "x_12": r"x_{12}",
    "theta_1'": r"\dot{\theta}_{1}",
    "theta1": r"\theta_{1}",
    "Tm": r"T_{\mathrm{m}}",
    "omega_ref": r"\omega_{\mathrm{ref}}",
    "x_a_b": r"x_{\mathrm{a\_b}}",
    "speed": r"\mathrm{speed}",
    "lambda": r"\lambda",
    "_a": r"\mathrm{\_a}",
}


@pytest.mark.parametrize(("name", "typeset"), TYPESET_NAMES.items())
def test_names(name: str, typeset: str) -> None:
    """Greek letters, indices and dots for primes."""
    assert latex_name(name) == typeset


def balanced(text: str) -> bool:
    """Whether braces open and close in order."""
    depth = 0
    for character in re.sub(r"\\.", "", text):
        depth += (character == "{") - (character == "}")
        if depth < 0:
            return False
    return depth == 0


@steady
@given(recipe=recipes)
def test_latex_is_balanced(recipe: Recipe) -> None:
    r"""Braces, \left and \right pair up in any expression."""
    graph = Graph()
    try:
        node = build(graph, recipe)
    except ZeroDivisionError:
        return
    text = latex(graph, node)
    assert balanced(text), text
    assert text.count(r"\left") - text.count(r"\left|") == len(re.findall(r"\\right\)", text))
    assert text.count(r"\left|") == text.count(r"\right|")


# what a name may become: letters and digits, our own commands, braces, indices
COMMANDS = r"\\(?:mathrm|d{1,4}ot|_|[A-Za-z]+)"
INERT = re.compile(rf"(?:{COMMANDS}|\w|[{{}}^()])*")


@steady
@given(name=st.from_regex(r"[^\W\d]\w{0,8}'{0,6}", fullmatch=True))
def test_no_name_becomes_markup(name: str) -> None:
    """Any legal name comes out as letters and our own commands, balanced, and never empty."""
    base = name.rstrip("'")
    assume(base.isidentifier())
    text = latex_name(name)
    assert text
    assert INERT.fullmatch(text), text
    assert balanced(text), text
    known = {"mathrm", "dot", "ddot", "dddot", "ddddot"}
    commands = set(re.findall(r"\\([A-Za-z]+)", text)) - known
    assert all(base.startswith(command) for command in commands)


def test_no_name_becomes_a_command() -> None:
    """A quantity called frac, end or input is letters, not a command."""
    for name in ("frac", "end", "input", "left", "text", "over", "def"):
        assert "\\" + name not in latex_name(name)


def test_named_intermediates_stand_for_themselves() -> None:
    """A node with a name of its own is shown by it, except where it is what is being shown."""
    graph = Graph()
    inner = graph.mul(graph.var("a"), graph.var("b"))
    node = graph.unary("sin", inner)
    assert latex(graph, node, {inner: "w_{1}"}) == r"\sin\left(w_{1}\right)"
    assert latex(graph, inner, {inner: "w_{1}"}) == r"a \cdot b"


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (fmpq(0), "0"),
        (fmpq(981, 100), "9.81"),
        (fmpq(-1, 8), "-0.125"),
        (fmpq(1200), "1200"),
        (fmpq(10**7), "1e7"),
        (fmpq(10**300), "1e300"),
        (fmpq(1, 10**9), "1e-9"),
        (fmpq(123, 10**12), "1.23e-10"),
        (fmpq(1, 3), None),
        (fmpq(1, 2**60), None),
        (fmpq(12345678901234567), "1.2345678901234567e16"),
        (fmpq(123456789012345678), None),
    ],
)
def test_decimals(value: fmpq, text: str | None) -> None:
    """Terminating decimals of at most 17 digits are written out, others are fractions."""
    assert decimal_text(value) == text


@steady
@given(
    digits=st.integers(-(10**17) + 1, 10**17 - 1),
    decade=st.integers(-40, 40),
)
def test_decimals_read_back_exactly(digits: int, decade: int) -> None:
    """A decimal of 17 digits is printed so that it is the same rational when read."""
    value = fmpq(digits) * fmpq(10) ** decade
    text = decimal_text(value)
    assert text is not None
    graph = Graph()
    assert graph.value_of(read(graph, text)) == value
