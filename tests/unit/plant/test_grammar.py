"""The plant's language: what it means, and what each usual slip is told."""

from __future__ import annotations

import builtins
import time
from fractions import Fraction
from pathlib import Path

import pytest
from flint import fmpq
from hypothesis import given, settings
from hypothesis import strategies as st

from tangentbook.calculus import Graph, plain_text
from tangentbook.errors import ExpressionError
from tangentbook.plant.grammar import parse_equation, parse_expression, parse_leading
from tangentbook.plant.tokens import MAX_LENGTH
from unit.plant.plants import node_of, number, plant, refused

SLIPS = [
    tuple(case.split("\n"))
    for case in (Path(__file__).parent / "fixtures" / "slips.txt").read_text("utf-8").split("\n\n")
    if case.strip() and not case.startswith("#")
]
PARAMETERS = {"m": 1, "k": 2, "g": "9.81", "Td": 3, "theta0": 1}
# refusing must cost no more than reading; a second is what a caller would notice
SOON = 3.0  # seconds of processor time: a text that were not refused would take far longer


@pytest.mark.parametrize(("equation", "code", "message", "hint"), [s[:4] for s in SLIPS])
def test_a_slip_is_told_with_place_and_remedy(
    equation: str, code: str, message: str, hint: str
) -> None:
    """The whole error of each usual slip: code, column, message, hint."""
    name, _, column = code.partition(" ")
    found = refused(lambda: plant(equation, inputs=["u"], parameters=PARAMETERS))
    assert found.pop("class") in ("ExpressionError", "DeclarationError")
    assert found == {
        "code": name,
        "where": f"equation 1, column {column}",
        "message": message,
        "hint": hint.rstrip("\n"),
    }


def test_the_slips_are_all_there() -> None:
    """The fixture is read whole."""
    assert len(SLIPS) >= 75
    assert all(len(case) >= 4 for case in SLIPS)


HOSTILE = {
    "powers of powers": "9^9^9^9",
    "nested powers": "((((9^99)^99)^99)^99)^999",
    "10 000 brackets": "(" * 10_000 + "1" + ")" * 10_000,
    "a megabyte of +1": "+1" * 524_288,
    "64 KiB of brackets": "(" * 65_000,
    "1e400": "1e400",
    "1e-400": "1e-400",
    "a huge exponent": "1e999999999999999999",
    "401 digits": "1" * 401,
    "401 decimals": "0." + "3" * 400,
    "a chain of signs": "-" * 10_000 + "1",
    "a chain of plus and minus": "+-" * 20_000 + "1",
    "a chain of nots": "if(" + "not " * 10_000 + "1 < 2, 1, 2)",
    "a chain of powers": "^".join(["2"] * 10_000),
    "nested functions": "sin(" * 5_000 + "1" + ")" * 5_000,
    "nested choices": "if(1 < 2, " * 500 + "1" + ", 2)" * 500,
    "nested conditions": "if(" + "(" * 3_000 + "1 < 2" + ")" * 3_000 + ", 1, 2)",
    "a lone surrogate": "1 + \ud800",
    "a surrogate in a name": "x\udfff",
    "a null": "1\x00",
    "a megabyte of a name": "a" * 1_048_576,
    "a megabyte of spaces": " " * 1_048_576 + "1",
    "right-to-left override": "1 \u202e+ 2",
    "min of many": "min(" + ", ".join(["1"] * 65) + ")",
    "division by nothing": "1/(0.1 + 0.2 - 0.3)",
}


@pytest.mark.parametrize("name", HOSTILE)
def test_a_hostile_text_is_refused_at_once(name: str) -> None:
    """No size, depth, number or character gets past the limits, and none takes long."""
    start = time.process_time()
    with pytest.raises(ExpressionError) as refusal:
        number(HOSTILE[name])
    assert time.process_time() - start < SOON
    error = refusal.value
    assert error.hint
    assert len(str(error)) < 500
    assert error.where.startswith("text")
    str(error).encode("utf-8")  # what is said can be sent


@pytest.mark.parametrize(
    "text",
    [
        "+".join(["1"] * 30_000),
        "(" * 199 + "1" + ")" * 199,
        "-" * 199 + "1",
        "1" * 300,
        "0." + "3" * 399,
        "1e300",
        "2^400",
        "sin(" * 199 + "0" + ")" * 199,
    ],
    ids=["30 000 terms", "brackets", "signs", "digits", "decimals", "decade", "power", "functions"],
)
def test_what_is_within_the_limits_is_read(text: str) -> None:
    """The limits do not bite before their stated size."""
    assert len(text) <= MAX_LENGTH
    assert number(text) is not None


def _expressions() -> st.SearchStrategy[str]:
    """Arithmetic that this grammar and Python's spell alike."""
    return st.recursive(
        st.integers(0, 9).map(str),
        lambda parts: st.one_of(
            st.tuples(parts, st.sampled_from(["+", "-", "*", "/"]), parts).map("".join),
            st.tuples(parts, st.sampled_from([" + ", "  -", " * ", "/ "]), parts).map("".join),
            parts.map(lambda p: f"-{p}"),
            parts.map(lambda p: f"+{p}"),
            parts.map(lambda p: f"({p})"),
            st.tuples(parts, st.integers(0, 3).map(lambda n: f"**{n}")).map("".join),
        ),
        max_leaves=12,
    )


@settings(derandomize=True, database=None, deadline=None, max_examples=400)
@given(text=_expressions())
def test_precedence_is_that_of_python(text: str) -> None:
    """Sums, products, signs and powers group as Python groups them, exactly."""
    wrapped = "".join(f"Fraction({c})" if c.isdigit() else c for c in _spread(text))
    try:
        expected = eval(wrapped, {"Fraction": Fraction})  # noqa: S307 - digits and operators of this test's own making
    except ZeroDivisionError:
        with pytest.raises(ExpressionError) as refusal:
            number(text)
        assert refusal.value.code == "expression.division-by-zero"
        return
    value = number(text)
    assert value == fmpq(Fraction(expected).numerator, Fraction(expected).denominator)


def _spread(text: str) -> list[str]:
    """Characters, with the exponents left as whole numbers."""
    pieces: list[str] = []
    for k, character in enumerate(text):
        exponent = character.isdigit() and text[max(k - 2, 0) : k] == "**"
        pieces.append(f"int({character})" if exponent else character)
    return pieces


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("-2^2", "-4"),
        ("(-2)^2", "4"),
        ("2^-2", "1/4"),
        ("2^3^2", "512"),
        ("2**3**2", "512"),
        ("-2^-2", "-1/4"),
        ("1 - 2 - 3", "-4"),
        ("8/4/2", "1"),
        ("8/4*2", "4"),
        ("2*-3", "-6"),
        ("1 - -1", "2"),
        ("--1", "1"),
        ("9.81", "981/100"),
        (".5", "1/2"),
        ("5.", "5"),
        ("1e-3", "1/1000"),
        ("1.5E+2", "150"),
        ("0.1 + 0.2", "3/10"),
        ("1 − 2", "-1"),
        ("2·3", "6"),
        ("2×3", "6"),
        ("6÷3", "2"),
        ("abs(-3)", "3"),
        ("sign(-3)", "-1"),
        ("  1\t+\n2 ", "3"),
    ],
)
def test_arithmetic(text: str, value: str) -> None:
    """Powers bind before signs and to the right, the rest to the left; decimals are exact."""
    p, _, q = value.partition("/")
    assert number(text) == fmpq(int(p), int(q or 1))


@pytest.mark.parametrize(
    ("alias", "name"),
    [
        ("ln(x)", "log(x)"),
        ("arcsin(x)", "asin(x)"),
        ("arccos(x)", "acos(x)"),
        ("arctan(x)", "atan(x)"),
        ("arctan2(y, x)", "atan2(y, x)"),
        ("x**2", "x^2"),
        ("x′", "x'"),
        ("x’", "x'"),
        ("x″", "x''"),
        ("x′’", "x''"),
        ("d(x′)/dt", "x″"),
        ("d(x)/dt", "x'"),
        ("d(x*y)/dt", "(x*y)'"),
        ("d(x)/dt*2", "x'*2"),
        ("min(x, y, z)", "min(min(x, y), z)"),
        ("clip(x, 0, 1)", "min(max(x, 0), 1)"),
        ("if(x > y, 1, 2)", "if(y < x, 1, 2)"),
        ("if(x >= y, 1, 2)", "if(y <= x, 1, 2)"),
        (
            "if(not (x < y or y < z) and x == z, 1, 2)",
            "if((not (x < y or y < z)) and x == z, 1, 2)",
        ),
        ("if(((x + 1))*2 < y, 1, 2)", "if((x + 1)*2 < y, 1, 2)"),
    ],
)
def test_two_spellings_of_one_thing(alias: str, name: str) -> None:
    """Aliases, typographic primes and minus signs, and shorthands mean the same expression."""

    def printed(text: str) -> str:
        p = plant("x'' = u", "y' = u", "z' = u", inputs=["u"], outputs={"out": text})
        return plain_text(p.graph, p.outputs[0].node)

    assert printed(alias) == printed(name)


ORDINARY = [
    "e",
    "i",
    "j",
    "d",
    "I",
    "E",
    "S",
    "N",
    "O",
    "Q",
    "beta",
    "gamma",
    "zeta",
    "lambda",
    "re",
    "im",
    "oo",
    "nan",
    "inf",
    "Symbol",
    "None",
    "True",
    "del",
]


@pytest.mark.parametrize("name", ORDINARY)
def test_an_ordinary_name_is_a_quantity(name: str) -> None:
    """Only pi, and, or, not are reserved: e, I, S, lambda … may be states and parameters."""
    found = plant(f"{name}' = -k*{name}*{name}", parameters={"k": 2})
    assert found.states == (name,)
    assert found.roles[name] == "state"
    other = plant(f"x' = -{name}*x", parameters={name: 2})
    assert other.roles[name] == "parameter"


@pytest.mark.parametrize("name", ["pi", "and", "or", "not"])
def test_a_reserved_word_is_no_name(name: str) -> None:
    """The four reserved words cannot be declared."""
    found = refused(lambda: plant("x' = 1", parameters={name: 2}))
    assert found["code"] == "name.form"
    assert found["message"] == f"{name!r} is a reserved word"


HOST = [name for name in dir(builtins) if not name.startswith("_")]
OTHERS = ["__import__", "__builtins__", "__class__", "os", "sys", "np", "f_sin", "generated", "c"]


def test_no_name_reaches_the_host_language(monkeypatch: pytest.MonkeyPatch) -> None:
    """Names of the host language are undeclared names and unknown functions, nothing else."""

    def forbidden(*_: object) -> None:
        raise AssertionError("an evaluator was called")

    with monkeypatch.context() as patched:
        for evaluator in ("eval", "exec", "compile"):
            patched.setattr(builtins, evaluator, forbidden)
        for name in (*HOST, *OTHERS):
            if name in ("abs", "min", "max"):
                continue
            with pytest.raises(ExpressionError) as call:
                plant(f"x' = {name}(x)")
            assert call.value.code == "expression.function", name
            with pytest.raises(ExpressionError) as use:
                plant(f"x' = -x + {name}")
            assert use.value.code == "expression.undeclared", name


@pytest.mark.parametrize(
    "text",
    [
        "().__class__",
        "__import__('os').system('true')",
        "x.__class__",
        "[x for x in y]",
        "f'{x}'",
        "x := 1",
        "lambda: 0",
        "exec(x)",
        "(x,)",
        "x\n__y",
        "`x`",
    ],
)
def test_host_language_is_not_the_grammar(text: str) -> None:
    """Attribute access, strings, comprehensions and the like are refused as text."""
    with pytest.raises(ExpressionError):
        node_of(Graph(), text)


def test_columns_are_those_of_the_given_text() -> None:
    """Typographic characters and leading spaces do not shift the column."""
    with pytest.raises(ExpressionError) as refusal:
        parse_equation("  x′′ = 2 · y $", "equation 3")
    assert refusal.value.where == "equation 3, column 15"


def test_a_value_splits_before_its_unit() -> None:
    """The leading expression ends where a unit begins."""
    for text, rest in [
        ("2*pi*50 rad/s", "rad/s"),
        ("52 kN", "kN"),
        ("1.5 m^2/s", "m^2/s"),
        ("3 °C", "°C"),
        ("20 %", "%"),
        ("pi/3", ""),
        ("(1 + 2) kg", "kg"),
    ]:
        program, found = parse_leading(text, "value")
        assert found.strip() == rest, text
        assert program == parse_expression(text.removesuffix(rest), "value")


@settings(derandomize=True, database=None, deadline=None, max_examples=300)
@given(text=st.text(alphabet="xyk0159.+-*/^()<>=!'′,[] ifandortmin\ud800é²π;", max_size=40))
def test_any_text_is_read_or_refused(text: str) -> None:
    """No text whatever ends in anything but a plant or an error with code, place and hint."""
    found = refused(lambda: plant(f"x' = {text}", parameters={"k": 2, "y": 1}))
    assert all(found.values())
