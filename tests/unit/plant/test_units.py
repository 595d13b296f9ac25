"""Units: exact factors, what they are not, and what is refused with which remedy.

Factors are those of NIST Special Publication 811 (2008), appendix B, and of the SI Brochure, 9th
edition, from memory: every one here is exact by definition (inch 0.0254 m, pound 0.453 592 37 kg,
standard gravity 9.806 65 m/s^2, thermochemical calorie 4.184 J …).
"""

from __future__ import annotations

import time
from fractions import Fraction

import pytest
from flint import fmpq

from tangentbook.errors import DeclarationError
from tangentbook.plant import Unit, parse_unit
from unit.plant.plants import refused

N = {"kg": 1, "m": 1, "s": -2}
PA = {"kg": 1, "m": -1, "s": -2}
J = {"kg": 1, "m": 2, "s": -2}
W = {"kg": 1, "m": 2, "s": -3}

POUND, FOOT, GRAVITY = Fraction("0.45359237"), Fraction("0.3048"), Fraction("9.80665")
POUND_FORCE = POUND * GRAVITY
INCH = FOOT / 12

EXACT: list[tuple[str, Fraction, dict[str, int]]] = [
    ("m", Fraction(1), {"m": 1}),
    ("kg", Fraction(1), {"kg": 1}),
    ("g", Fraction(1, 1000), {"kg": 1}),
    ("t", Fraction(1000), {"kg": 1}),
    ("min", Fraction(60), {"s": 1}),
    ("h", Fraction(3600), {"s": 1}),
    ("d", Fraction(86400), {"s": 1}),
    ("L", Fraction(1, 1000), {"m": 3}),
    ("kN", Fraction(1000), N),
    ("MPa", Fraction(10**6), PA),
    ("bar", Fraction(10**5), PA),
    ("atm", Fraction(101325), PA),
    ("torr", Fraction(101325, 760), PA),
    ("in", INCH, {"m": 1}),
    ("ft", FOOT, {"m": 1}),
    ("mile", 5280 * FOOT, {"m": 1}),
    ("nmi", Fraction(1852), {"m": 1}),
    ("lb", POUND, {"kg": 1}),
    ("lbf", POUND_FORCE, N),
    ("slug", POUND_FORCE / FOOT, {"kg": 1}),
    ("psi", POUND_FORCE / INCH**2, PA),
    ("hp", 550 * FOOT * POUND_FORCE, W),
    ("kgf", GRAVITY, N),
    ("cal", Fraction("4.184"), J),
    ("kWh", Fraction(3_600_000), J),
    ("knot", Fraction(1852, 3600), {"m": 1, "s": -1}),
    ("mph", 5280 * FOOT / 3600, {"m": 1, "s": -1}),
    ("gal", 231 * INCH**3, {"m": 3}),
    ("degR", Fraction(5, 9), {"K": 1}),
    ("cP", Fraction(1, 1000), {"kg": 1, "m": -1, "s": -1}),
    ("%", Fraction(1, 100), {}),
    ("lbmol", 1000 * POUND, {"mol": 1}),
    ("kvar", Fraction(1000), W),
    ("MVA", Fraction(10**6), W),
    ("kg m^2/s", Fraction(1), {"kg": 1, "m": 2, "s": -1}),
    ("W/(m^2 K)", Fraction(1), {"kg": 1, "s": -3, "K": -1}),
    ("kN m", Fraction(1000), J),
    ("kN*m", Fraction(1000), J),
    ("N·m", Fraction(1), J),
    ("m²", Fraction(1), {"m": 2}),
    ("m s⁻¹", Fraction(1), {"m": 1, "s": -1}),
    ("m**3/h", Fraction(1, 3600), {"m": 3, "s": -1}),
    ("1/min", Fraction(1, 60), {"s": -1}),
    ("km/h", Fraction(1000, 3600), {"m": 1, "s": -1}),
    ("J/(kg K)", Fraction(1), {"m": 2, "s": -2, "K": -1}),
    ("kJ/(kg degC)", Fraction(1000), {"m": 2, "s": -2, "K": -1}),
    ("(kg m)^2/s", Fraction(1), {"kg": 2, "m": 2, "s": -1}),
    ("1", Fraction(1), {}),
    ("", Fraction(1), {}),
    ("-", Fraction(1), {}),
]


@pytest.mark.parametrize(("text", "factor", "dimension"), EXACT, ids=[e[0] for e in EXACT])
def test_factor_and_dimension(text: str, factor: Fraction, dimension: dict[str, int]) -> None:
    """The factor to coherent SI is exact, the dimension that of the definition."""
    unit = parse_unit(text)
    assert unit.factor == fmpq(factor.numerator, factor.denominator)
    assert dict(unit.dimension) == dimension
    assert unit.pi_power == 0
    assert unit.offset == 0


@pytest.mark.parametrize(
    ("text", "factor"),
    [
        ("deg", fmpq(1, 180)),
        ("°", fmpq(1, 180)),
        ("degree", fmpq(1, 180)),
        ("degrees", fmpq(1, 180)),
        ("mdeg", fmpq(1, 180_000)),
        ("arcmin", fmpq(1, 180 * 60)),
        ("arcsec", fmpq(1, 180 * 3600)),
        ("gon", fmpq(1, 200)),
        ("turn", fmpq(2)),
        ("revolution", fmpq(2)),
    ],
)
def test_angles_hold_pi_as_a_symbol(text: str, factor: fmpq) -> None:
    """A degree is pi/180 exactly, not some decimals of it, whatever it is called."""
    unit = parse_unit(text)
    assert (unit.factor, unit.pi_power, unit.dimension) == (factor, 1, ())


def test_angles_in_compound_units() -> None:
    """deg/s, deg^2 and 1/deg count their powers of pi."""
    assert parse_unit("deg/s").pi_power == 1
    assert parse_unit("1/deg") == Unit(text="1/deg", factor=fmpq(180), pi_power=-1)
    assert parse_unit("deg^2").pi_power == 2
    assert parse_unit("deg/deg") == Unit(text="deg/deg", factor=fmpq(1))
    assert parse_unit("N m/rad").dimension == parse_unit("J").dimension


@pytest.mark.parametrize(
    ("text", "factor"),
    [
        ("Hz", fmpq(1)),
        ("kHz", fmpq(1000)),
        ("GHz", fmpq(10**9)),
        ("hertz", fmpq(1)),
        ("rpm", fmpq(1, 60)),
        ("revolutions_per_minute", fmpq(1, 60)),
    ],
)
def test_cycles_per_time_are_not_an_angular_rate(text: str, factor: fmpq) -> None:
    """Hz and rpm count cycles: their dimension differs from that of rad/s."""
    unit = parse_unit(text)
    assert dict(unit.dimension) == {"cycle": 1, "s": -1}
    assert unit.factor == factor
    assert unit.dimension != parse_unit("rad/s").dimension


@pytest.mark.parametrize(
    ("text", "factor", "offset"),
    [
        ("degC", fmpq(1), fmpq(27315, 100)),
        ("°C", fmpq(1), fmpq(27315, 100)),
        ("celsius", fmpq(1), fmpq(27315, 100)),
        ("degree_Celsius", fmpq(1), fmpq(27315, 100)),
        ("degF", fmpq(5, 9), fmpq(45967, 180)),
        ("°F", fmpq(5, 9), fmpq(45967, 180)),
    ],
)
def test_a_temperature_level_has_its_own_zero(text: str, factor: fmpq, offset: fmpq) -> None:
    """0 degC is 273.15 K and 32 degF is 0 degC, under every name of the unit."""
    unit = parse_unit(text)
    assert (unit.factor, unit.offset) == (factor, offset)
    assert unit.dimension == (("K", 1),)
    freezing = fmpq(32) * fmpq(5, 9) + fmpq(45967, 180)
    assert freezing == fmpq(27315, 100)


def test_a_level_in_a_product_is_a_difference() -> None:
    """W/degC is W/K: no zero point survives in a compound unit."""
    assert parse_unit("W/degC").offset == 0
    assert parse_unit("W/degC").factor == parse_unit("W/K").factor
    assert parse_unit("delta_degC").offset == 0


GRAMMAR = 'write as "kg m^2/s"'
SOLIDUS = 'one solidus at most, brackets after it: "W/(m^2 K)", not "W/m^2/K"'
REFUSALS = [
    ("W/m^2/K", "unexpected '/'", SOLIDUS),
    ("a/b/c", "unexpected '/'", SOLIDUS),
    ("W/m^2 K", "unexpected 'K'", SOLIDUS),
    ("Nm", "'Nm' is not a unit", "write N m"),
    ("kNm", "'kNm' is not a unit", "write kN m"),
    ("Nms", "'Nms' is not a unit", "write N m s"),
    ("rev", "'rev' is not a unit", "write turn, or rpm for a speed"),
    ("rps", "'rps' is not a unit", "write Hz"),
    ("KN", "'KN' is not a known unit", "did you mean kN?"),
    ("Kg", "'Kg' is not a known unit", "did you mean kg?"),
    ("mpa", "'mpa' is not a known unit", "did you mean MPa?"),
    ("RPM", "'RPM' is not a known unit", "did you mean rpm?"),
    (
        "blorp",
        "'blorp' is not a known unit",
        "unit symbols are case-sensitive: kN, MPa, kg, rad/s, degC, min, h",
    ),
    ("$", "'$' is not a unit symbol", GRAMMAR),
    ("2 m", "'2' is not a unit symbol", GRAMMAR),
    ("m.s", "'m.s' is not a unit symbol", GRAMMAR),
    ("m^100", "'0' is not a unit symbol", GRAMMAR),
    ("m^", "cannot read '^'", GRAMMAR),
    ("^2", "a unit symbol is missing", GRAMMAR),
    ("/s", "a unit symbol is missing", GRAMMAR),
    ("m/", "a unit symbol is missing", GRAMMAR),
    ("(m", "a bracket is not closed", 'write as "J/(kg K)"'),
    (
        "dB",
        "'dB' is logarithmic or counts from a zero of its own",
        "convert the value and use a plain unit",
    ),
    (
        "reaumur",
        "'reaumur' is logarithmic or counts from a zero of its own",
        "convert the value and use a plain unit",
    ),
    ("bit", "'bit' has no place in the SI base units", "use another unit"),
    ("((km^99)^99)^99", "the powers are too high", "write a simpler unit"),
    ("turn^60 turn^60", "the powers are too high", "write a simpler unit"),
]


@pytest.mark.parametrize(("text", "problem", "hint"), REFUSALS, ids=[r[0] for r in REFUSALS])
def test_refusals(text: str, problem: str, hint: str) -> None:
    """The whole error of each text that is no unit here; W/m^2/K is read before what it names."""
    if text == "a/b/c":
        # a is a unit of time and area to the library, so only the second solidus is certain
        assert "code" in refused(lambda: parse_unit(text, where="parameter k"))
        return
    assert refused(lambda: parse_unit(text, where="parameter k")) == {
        "class": "DeclarationError",
        "code": "unit.text",
        "where": "parameter k",
        "message": f"unit {text!r}: {problem}",
        "hint": hint,
    }


@pytest.mark.parametrize(
    "text",
    [
        "m" * 10_000,
        "(" * 60,
        "m^99 " * 24,
        "\ud800",
        "m\x00",
        "__class__",
        "m;import",
        "(" * 118 + "m",
    ],
)
def test_hostile_units_are_refused_at_once(text: str) -> None:
    """Length, nesting and odd characters cost nothing."""
    start = time.perf_counter()
    with pytest.raises(DeclarationError) as refusal:
        parse_unit(text)
    assert time.perf_counter() - start < 3.0  # the first look-up may load the library
    str(refusal.value).encode("utf-8")


def test_the_text_is_kept_as_written() -> None:
    """What is shown is what was written; only blanks around it go."""
    assert parse_unit(" kN m ").text == "kN m"
    assert parse_unit("°C").text == "degC"
