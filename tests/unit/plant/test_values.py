"""Values: numbers, quantities and constant expressions become exact SI quantities."""

from __future__ import annotations

import pytest
from flint import arb, ctx, fmpq
from hypothesis import given, settings
from hypothesis import strategies as st

from tangentbook.calculus import Function, Graph, plain_text
from tangentbook.plant import Scalar, Unit, parse_unit, read_value
from unit.plant.plants import refused

NAMES = ("m", "k", "W")


def read(value: Scalar, unit: str | None = None) -> tuple[Graph, int, Unit | None]:
    """A value with the graph it lives in."""
    graph = Graph()
    declared = None if unit is None else parse_unit(unit)
    node, written = read_value(graph, value, unit=declared, names=NAMES, where="parameter p")
    return graph, node, written


@pytest.mark.parametrize(
    ("value", "unit", "exact"),
    [
        (9, None, "9"),
        (9.81, None, "981/100"),
        (0.1, None, "1/10"),
        (1e-7, None, "1/10000000"),
        (1e22, None, "10000000000000000000000"),
        (-2.5, None, "-5/2"),
        (-0.0, None, "0"),
        ("9.81", None, "981/100"),
        ("52 kN", None, "52000"),
        ("2.4e5 kg m^2", None, "240000"),
        ("-3 mm", None, "-3/1000"),
        ("1/3 bar", None, "100000/3"),
        ("20 %", None, "1/5"),
        ("(1 + 2)*2 kN", None, "6000"),
        ("20 degC", None, "5863/20"),
        ("20°C", None, "5863/20"),
        ("20 °C", None, "5863/20"),
        ("-20.5e1°C", None, "1363/20"),
        (" 20% ", None, "1/5"),
        ("3*2 m²", None, "6"),
        ("20%", None, "1/5"),
        ("3[m]*2 m²", None, "6"),
        ("-40 degF", None, "23315/100"),
        ("64.94[1/min]", None, "3247/3000"),
        (52, "kN", "52000"),
        (0.2, "mm", "1/5000"),
        ("52", "kN", "52000"),
        ("50 + 2", "kN", "52000"),
        ("52 N", "kN", "52"),
        (20, "degC", "5863/20"),
        (1.5, "1", "3/2"),
        ("3 m/s", None, "3"),
        ("36 km/h", None, "10"),
        ("1 1/s", None, "1"),
    ],
)
def test_rational_values(value: Scalar, unit: str | None, exact: str) -> None:
    """Numbers count in the declared unit, quantities in their own, floats as shortest decimals."""
    graph, node, _ = read(value, unit)
    p, _, q = exact.partition("/")
    assert graph.value_of(node) == fmpq(int(p), int(q or 1))


@pytest.mark.parametrize(
    ("value", "unit", "printed"),
    [
        ("pi/3", None, "1.0471975511965977461542144610931676280657231331250"),
        ("60 deg", None, "1.0471975511965977461542144610931676280657231331250"),
        (60, "deg", "1.0471975511965977461542144610931676280657231331250"),
        ("2*pi*50 rad/s", None, "314.15926535897932384626433832795028841971693993751"),
        ("2*pi*50", "rad/s", "314.15926535897932384626433832795028841971693993751"),
        ("sqrt(2) m", None, "1.4142135623730950488016887242096980785696718753769"),
    ],
)
def test_irrational_values(value: Scalar, unit: str | None, printed: str) -> None:
    """Pi and roots stay exact: the value is right to as many digits as are asked for."""
    graph, node, _ = read(value, unit)
    with ctx.workprec(200):
        (found,) = Function(graph, [], [node]).balls([])
        assert abs(found - arb(printed)) < arb("1e-46")


def test_the_unit_a_value_was_written_in() -> None:
    """The written unit comes back, else the declared one."""
    assert read("52 kN", "N")[2] == parse_unit("kN")
    assert read(52, "N")[2] == parse_unit("N")
    assert read(52)[2] is None


def test_an_expression_that_names_parameters_is_in_si_already() -> None:
    """m*9.81 carries the units of m: the declared unit does not scale it again."""
    graph, node, unit = read("W/(2*k)", "kN")
    assert plain_text(graph, node) == "W/(2*k)"
    assert unit == parse_unit("kN")


@settings(derandomize=True, database=None, deadline=None, max_examples=300)
@given(value=st.floats(allow_nan=False, allow_infinity=False, min_value=-1e290, max_value=1e290))
def test_a_float_is_its_shortest_decimal(value: float) -> None:
    """The rational read is the decimal that the double prints as."""
    if 0 < abs(value) < 1e-290:
        return
    graph, node, _ = read(value)
    mantissa, _, exponent = repr(value).partition("e")
    whole, _, fraction = mantissa.partition(".")
    decimal = fmpq(int(whole + fraction)) * fmpq(10) ** (int(exponent or 0) - len(fraction))
    assert graph.value_of(node) == decimal


@pytest.mark.parametrize(
    ("value", "code", "where", "message", "hint"),
    [
        (
            "mass",
            "value.name",
            "parameter p, column 1",
            "mass is not a parameter, so it has no meaning in a value",
            "known names: m, k, W",
        ),
        (
            "2*w",
            "value.name",
            "parameter p, column 3",
            "w is not a parameter, so it has no meaning in a value",
            "did you mean W?",
        ),
        (
            "m'",
            "value.name",
            "parameter p, column 1",
            "m' is a rate; a value is constant",
            "remove the prime",
        ),
        (
            "2*W kN",
            "value.unit-of-quantity",
            "parameter p",
            "'2*W kN': W already carries its unit",
            "drop the unit, or write a number before it",
        ),
        (
            "52 Nm",
            "unit.text",
            "parameter p",
            "unit 'Nm': 'Nm' is not a unit",
            "write N m",
        ),
        (
            "3,5",
            "unit.text",
            "parameter p",
            "unit ',5': ',5' is not a unit symbol",
            'write as "kg m^2/s"',
        ),
        (
            "",
            "expression.syntax",
            "parameter p, column 1",
            "the expression ends where a value is expected",
            "add a number, name or (…)",
        ),
        (
            "kN",
            "value.name",
            "parameter p, column 1",
            "kN is not a parameter, so it has no meaning in a value",
            "did you mean k?",
        ),
        (
            "1/0",
            "expression.division-by-zero",
            "parameter p, column 2",
            "division by zero, whatever the point",
            "mend the divisor",
        ),
        (
            "1e400",
            "expression.number",
            "parameter p, column 1",
            "1e400 is outside the range of numbers, about 1e-300 to 1e300",
            "use another unit or a scaled quantity",
        ),
    ],
)
def test_refusals(value: str, code: str, where: str, message: str, hint: str) -> None:
    """The whole error of each text that is no value."""
    found = refused(lambda: read(value))
    found.pop("class")
    assert found == {"code": code, "where": where, "message": message, "hint": hint}
