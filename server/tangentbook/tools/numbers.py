"""Numbers as people and JSON see them.

Decimal, rounded half to even on the exact value, no more digits than are known, no -0.
"""

from __future__ import annotations

import math

from flint import arb

JSON_DIGITS = 10
PEOPLE_DIGITS = 6


def rounded(value: arb, digits: int = JSON_DIGITS) -> float | int:
    """A ball as a number of at most `digits` significant digits; 0 where it contains zero."""
    return _number(*_decimal(value, digits))


def shown(value: arb, digits: int = PEOPLE_DIGITS) -> str:
    """A ball as text for people."""
    return _plain(*_decimal(value, digits))


def shown_float(value: float, digits: int = PEOPLE_DIGITS) -> str:
    """A number as text for people."""
    return shown(arb(value), digits) if math.isfinite(value) else "–"


def bound(value: float, floor: float) -> float:
    """A check value: the next power of ten up, at least `floor`.

    Below the floor the value is rounding, which differs between machines and says nothing.
    """
    if not math.isfinite(value):
        return 1e300
    if value <= floor:
        return floor
    exponent = math.ceil(math.log10(value) - 1e-12)
    return max(float(f"1e{exponent}"), floor)


def plural(number: int, word: str) -> str:
    """A count with its noun."""
    return f"{number} {word}{'' if number == 1 else 's'}"


def _decimal(value: arb, digits: int) -> tuple[int, int]:
    """Mantissa and decimal exponent of the rounded midpoint; (0, 0) for zero."""
    if value.contains(0):
        return 0, 0
    mantissa, exponent = (int(part) for part in value.mid().man_exp())
    top, bottom = (mantissa << exponent, 1) if exponent >= 0 else (mantissa, 1 << -exponent)
    decade = _decade(abs(top), bottom)
    known = _known_digits(value, decade, digits)
    if known < 1:
        return 0, 0
    scale = known - 1 - decade
    numerator = abs(top) * 10**scale if scale >= 0 else abs(top)
    denominator = bottom if scale >= 0 else bottom * 10**-scale
    quotient, rest = divmod(numerator, denominator)
    if 2 * rest > denominator or (2 * rest == denominator and quotient % 2):
        quotient += 1
    return (quotient if top > 0 else -quotient), -scale


def _decade(top: int, bottom: int) -> int:
    """floor(log10(top/bottom)), exactly."""
    guess = math.floor((top.bit_length() - bottom.bit_length()) * math.log10(2))
    while _at_least(top, bottom, guess + 1):
        guess += 1
    while not _at_least(top, bottom, guess):
        guess -= 1
    return guess


def _at_least(top: int, bottom: int, decade: int) -> bool:
    return top >= bottom * 10**decade if decade >= 0 else top * 10**-decade >= bottom


def _known_digits(value: arb, decade: int, digits: int) -> int:
    """Digits of which the radius is at most half a unit."""
    radius = value.rad()
    if radius.is_zero():
        return digits
    room = arb(10) ** decade / (2 * radius)
    known = 1 + math.floor(float(room.log().mid()) / math.log(10)) if room > 0 else 0
    return min(digits, known)


def _number(mantissa: int, exponent: int) -> float | int:
    number = float(f"{mantissa}e{exponent}")
    return int(number) if number.is_integer() and abs(number) < 1e15 else number


def _plain(mantissa: int, exponent: int) -> str:
    if mantissa == 0:
        return "0"
    sign, digits = ("-" if mantissa < 0 else ""), str(abs(mantissa)).rstrip("0")
    exponent += len(str(abs(mantissa))) - len(digits)
    decade = len(digits) + exponent - 1
    if -4 <= decade < 7:
        if exponent >= 0:
            return f"{sign}{digits}{'0' * exponent}"
        if decade >= 0:
            return f"{sign}{digits[: decade + 1]}.{digits[decade + 1 :]}"
        return f"{sign}0.{'0' * (-decade - 1)}{digits}"
    head = digits[0] + ("." + digits[1:] if len(digits) > 1 else "")
    return f"{sign}{head}e{decade}"
