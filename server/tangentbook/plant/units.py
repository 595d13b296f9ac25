"""Unit text -> exact factor to coherent SI.

Grammar (after the SI Brochure, 9th edition, 5.4: products by a space or a raised dot, at most one
solidus unless brackets make it clear):

    unit    = product [ "/" factor ]
    product = factor { (" " | "*" | "·") factor }
    factor  = symbol [ "^" integer ] | "(" unit ")" [ "^" integer ] | "1"

SI symbols are data of `plant.si`; what any other symbol means comes from the units library, which
is loaded only then. The entries of `_OWN` are those the library gives no exact value for (angles:
pi is not a decimal) or reads otherwise than the trade does.
"""

from __future__ import annotations

import functools
import re
from dataclasses import dataclass, replace
from fractions import Fraction
from importlib.resources import files
from typing import TYPE_CHECKING, Any

from flint import fmpq

from tangentbook.errors import DeclarationError
from tangentbook.plant.si import si_symbol

if TYPE_CHECKING:
    from collections.abc import Mapping

Dimension = tuple[tuple[str, int], ...]

_NO_OFFSET = fmpq(0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Unit:
    """A unit: one of it is `factor * pi^pi_power` in coherent SI, plus `offset` for a level.

    `dimension` holds (base, exponent) pairs in SI base units, "cycle" for Hz and rpm.
    """

    text: str
    factor: fmpq
    pi_power: int = 0
    offset: fmpq = _NO_OFFSET
    dimension: Dimension = ()

    @property
    def has_time(self) -> bool:
        """Whether the unit's dimension contains time."""
        return any(base == "s" for base, _ in self.dimension)


ONE = Unit(text="1", factor=fmpq(1))

_OWN: dict[str, Unit] = {
    "1": ONE,
    "-": ONE,
    "": ONE,
    "pu": ONE,
    "rad": Unit(text="rad", factor=fmpq(1)),
    "%": Unit(text="%", factor=fmpq(1, 100)),
    "deg": Unit(text="deg", factor=fmpq(1, 180), pi_power=1),
    "°": Unit(text="deg", factor=fmpq(1, 180), pi_power=1),
    "degree": Unit(text="deg", factor=fmpq(1, 180), pi_power=1),
    "gon": Unit(text="gon", factor=fmpq(1, 200), pi_power=1),
    "arcmin": Unit(text="arcmin", factor=fmpq(1, 10800), pi_power=1),
    "arcsec": Unit(text="arcsec", factor=fmpq(1, 648000), pi_power=1),
    "turn": Unit(text="turn", factor=fmpq(2), pi_power=1),
    # cycles per time are not 1/s: 2*pi*f makes the angular frequency
    "Hz": Unit(text="Hz", factor=fmpq(1), dimension=(("cycle", 1), ("s", -1))),
    "kHz": Unit(text="kHz", factor=fmpq(1000), dimension=(("cycle", 1), ("s", -1))),
    "MHz": Unit(text="MHz", factor=fmpq(10**6), dimension=(("cycle", 1), ("s", -1))),
    "rpm": Unit(text="rpm", factor=fmpq(1, 60), dimension=(("cycle", 1), ("s", -1))),
    "degC": Unit(text="degC", factor=fmpq(1), offset=fmpq(27315, 100), dimension=(("K", 1),)),
    "°C": Unit(text="degC", factor=fmpq(1), offset=fmpq(27315, 100), dimension=(("K", 1),)),
    "degF": Unit(
        text="degF", factor=fmpq(5, 9), offset=fmpq(45967 * 5, 900), dimension=(("K", 1),)
    ),
    "°F": Unit(text="degF", factor=fmpq(5, 9), offset=fmpq(45967 * 5, 900), dimension=(("K", 1),)),
    "kgmol": Unit(text="kgmol", factor=fmpq(1000), dimension=(("mol", 1),)),
    "lbmol": Unit(text="lbmol", factor=fmpq(45359237, 100000), dimension=(("mol", 1),)),
    "var": Unit(text="var", factor=fmpq(1), dimension=(("kg", 1), ("m", 2), ("s", -3))),
    "kvar": Unit(text="kvar", factor=fmpq(1000), dimension=(("kg", 1), ("m", 2), ("s", -3))),
    "Mvar": Unit(text="Mvar", factor=fmpq(10**6), dimension=(("kg", 1), ("m", 2), ("s", -3))),
}

# texts the library reads as something no engineer means
_REFUSED = {
    "Nm": "N m",
    "kNm": "kN m",
    "MNm": "MN m",
    "Nms": "N m s",
    "Ws": "W s",
    "kgm": "kg m",
    "Ns": "N s",
    "rev": "turn, or rpm for a speed",
    "rps": "Hz",
    "cps": "Hz",
}

# names of the library for what `_OWN` gives exactly, or as cycles, or with its own zero
_OWN_BY_NAME = {
    "degree": "deg",
    "arcminute": "arcmin",
    "arcsecond": "arcsec",
    "turn": "turn",
    "grade": "gon",
    "hertz": "Hz",
    "revolutions_per_minute": "rpm",
    "revolutions_per_second": "Hz",
    "counts_per_second": "Hz",
    "degree_Celsius": "degC",
    "degree_Fahrenheit": "degF",
}

# for hints: what engineers write most, to be found in spite of wrong capitals
_USUAL = [
    "kg",
    "g",
    "t",
    "m",
    "mm",
    "cm",
    "km",
    "s",
    "ms",
    "min",
    "h",
    "d",
    "N",
    "kN",
    "MN",
    "Pa",
    "kPa",
    "MPa",
    "bar",
    "J",
    "kJ",
    "MJ",
    "W",
    "kW",
    "MW",
    "V",
    "kV",
    "A",
    "mA",
    "ohm",
    "F",
    "uF",
    "H",
    "mH",
    "T",
    "Wb",
    "K",
    "mol",
    "kmol",
    "L",
]

_BASES = {
    "gram": "kg",
    "meter": "m",
    "second": "s",
    "ampere": "A",
    "kelvin": "K",
    "mole": "mol",
    "candela": "cd",
}

_SUPERSCRIPTS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻", "0123456789-")
_TOKEN = re.compile(r"\s*(?:(\^-?\d{1,2}|\*\*-?\d{1,2})|([()/*·⋅])|([^\s()/*·⋅^]+))")
_RAISED = re.compile(r"([⁻]?[⁰¹²³⁴⁵⁶⁷⁸⁹]+)")
MAX_UNIT_TEXT = 120
# no unit of any trade comes near; nested powers would grow without end
MAX_UNIT_EXPONENT = 99
MAX_FACTOR_BITS = 4096


def parse_unit(text: str, *, where: str = "") -> Unit:
    """The unit a text means.

    Raises:
        DeclarationError: not a unit of the grammar, or an unknown symbol; `where` names the place.
    """
    try:
        return _parsed(text.strip())
    except DeclarationError as error:
        raise DeclarationError(
            error.code, error.message, where=where or error.where, hint=error.hint
        ) from None


@functools.lru_cache(maxsize=4096)
def _parsed(text: str) -> Unit:
    if len(text) > MAX_UNIT_TEXT:
        raise _bad(text[:40] + "…", "a unit has at most 120 characters", "write a shorter unit")
    own = _OWN.get(text)
    if own is not None:
        return own
    raised = _RAISED.sub(lambda m: "^" + m.group(1).translate(_SUPERSCRIPTS), text)
    parser = _UnitParser(text, raised)
    unit = parser.whole()
    return replace(unit, text=text)


def _bad(text: str, problem: str, hint: str) -> DeclarationError:
    return DeclarationError("unit.text", f"unit {text!r}: {problem}", hint=hint)


class _UnitParser:
    """Recursive descent over the grammar of the module docstring (depth bounded by the length)."""

    def __init__(self, text: str, raised: str) -> None:
        self.text = text
        self.tokens: list[str] = []
        position = 0
        while position < len(raised):
            match = _TOKEN.match(raised, position)
            if match is None or match.end() == position:
                raise _bad(text, f"cannot read {raised[position:]!r}", 'write as "kg m^2/s"')
            self.tokens.append(match.group().strip())
            position = match.end()
        self.next = 0

    def _peek(self) -> str:
        return self.tokens[self.next] if self.next < len(self.tokens) else ""

    def whole(self) -> Unit:
        unit = self._unit()
        self._check_power(unit, 1)
        if self._peek():
            raise _bad(
                self.text,
                f"unexpected {self._peek()!r}",
                'one solidus at most, brackets after it: "W/(m^2 K)", not "W/m^2/K"',
            )
        return unit

    def _unit(self) -> Unit:
        unit = self._factor()
        while self._peek() not in ("", "/", ")"):
            if self._peek() in ("*", "·", "⋅"):
                self.next += 1
            unit = product(unit, self._factor(), 1)
        if self._peek() == "/":
            self.next += 1
            unit = product(unit, self._factor(), -1)
        return unit

    def _factor(self) -> Unit:
        symbol = self._peek()
        self.next += 1
        if symbol == "(":
            unit = self._unit()
            if self._peek() != ")":
                raise _bad(self.text, "a bracket is not closed", 'write as "J/(kg K)"')
            self.next += 1
        elif not symbol or symbol[0] in ")/*·⋅^":
            raise _bad(self.text, "a unit symbol is missing", 'write as "kg m^2/s"')
        else:
            unit = _symbol(symbol, self.text)
        if self._peek().startswith(("^", "**")):
            exponent = int(self._peek().lstrip("^*"))
            self.next += 1
            self._check_power(unit, exponent)
            unit = product(ONE, unit, exponent)
        return unit

    def _check_power(self, unit: Unit, exponent: int) -> None:
        powers = [unit.pi_power, *(power for _, power in unit.dimension)]
        largest = max(abs(power * exponent) for power in powers)
        bits = unit.factor.height_bits() * abs(exponent)
        if largest > MAX_UNIT_EXPONENT or bits > MAX_FACTOR_BITS:
            raise _bad(self.text, "the powers are too high", "write a simpler unit")


def product(a: Unit, b: Unit, power: int) -> Unit:
    """The product a * b^power; a level (degC) inside a product counts as its difference."""
    exponents = dict(a.dimension)
    for base, exponent in b.dimension:
        exponents[base] = exponents.get(base, 0) + exponent * power
    return Unit(
        text="",
        factor=a.factor * b.factor**power,
        pi_power=a.pi_power + b.pi_power * power,
        dimension=tuple(sorted((k, v) for k, v in exponents.items() if v)),
    )


@functools.lru_cache(maxsize=1)
def _registry() -> Any:  # noqa: ANN401 - the library's class is generic over its number type
    from pint import UnitRegistry  # half a second to import: only for plants with such units

    registry: Any = UnitRegistry  # its annotations know floating-point numbers only
    return registry(non_int_type=Fraction, cache_folder=None)


def _symbol(symbol: str, text: str) -> Unit:
    own = _OWN.get(symbol)
    if own is not None:
        return own
    if symbol in _REFUSED:
        raise _bad(text, f"{symbol!r} is not a unit", f"write {_REFUSED[symbol]}")
    standard = si_symbol(symbol)
    if standard is not None:
        return Unit(text=symbol, factor=standard[0], dimension=standard[1])
    if not re.fullmatch(r"[^\W\d_][\w]*|[µμΩ]\w*|Ω", symbol):
        raise _bad(text, f"{symbol!r} is not a unit symbol", 'write as "kg m^2/s"')
    return _library_symbol(symbol, text)


def _library_symbol(symbol: str, text: str) -> Unit:
    registry = _registry()
    try:
        factor, base = registry.get_root_units(symbol)
        name = registry.parse_unit_name(symbol)[0][1]
    except Exception:  # noqa: BLE001 - the library raises several unrelated classes for unknown symbols
        raise _bad(text, f"{symbol!r} is not a known unit", _near_unit(symbol)) from None
    if name in _OWN_BY_NAME:
        own = _OWN[_OWN_BY_NAME[name]]
        prefix = Fraction(factor) / Fraction(registry.get_root_units(name)[0])
        if prefix == 1:
            return own
        return product(Unit(text="", factor=fmpq(prefix.numerator, prefix.denominator)), own, 1)
    if not registry._units[name].is_multiplicative:  # noqa: SLF001 - no public way to ask
        problem = f"{symbol!r} is logarithmic or counts from a zero of its own"
        raise _bad(text, problem, "convert the value and use a plain unit")
    if name in _constants():
        raise _bad(
            text,
            f"{symbol!r} is a constant of nature, not a unit",
            "make the constant a parameter; " + _near_unit(symbol),
        )
    return _from_library(symbol, Fraction(factor), dict(base._units), text)  # noqa: SLF001 - no public mapping


@functools.lru_cache(maxsize=1)
def _constants() -> frozenset[str]:
    """Names that the library defines as constants of nature (c, k, e … are no units here)."""
    listed = files("pint").joinpath("constants_en.txt").read_text("utf-8")
    names = {line.partition("=")[0].strip() for line in listed.splitlines() if "=" in line}
    # units by the trade's use, in spite of standing in that list
    return frozenset(names - {"standard_gravity", "standard_atmosphere"})


def _near_unit(symbol: str) -> str:
    for known in (*_OWN, *_USUAL):
        if known and known.casefold() == symbol.casefold():
            return f"did you mean {known}?"
    return "unit symbols are case-sensitive: kN, MPa, kg, rad/s, degC, min, h"


def _from_library(symbol: str, factor: Fraction, bases: Mapping[str, Any], text: str) -> Unit:
    dimension: dict[str, int] = {}
    for base, exponent in bases.items():
        if base in ("radian", "dimensionless", "count"):
            continue
        if base not in _BASES or Fraction(exponent).denominator != 1:
            raise _bad(text, f"{symbol!r} has no place in the SI base units", "use another unit")
        dimension[_BASES[base]] = int(exponent)
        if base == "gram":  # the SI base unit is the kilogram
            factor /= Fraction(1000) ** int(exponent)
    if factor.denominator > 10**40 and "radian" in bases:
        raise _bad(text, f"{symbol!r} is known to some decimals of pi only", "use rad or deg")
    return Unit(
        text=symbol,
        factor=fmpq(factor.numerator, factor.denominator),
        dimension=tuple(sorted(dimension.items())),
    )
