"""Text of an expression -> tokens with columns; limits are checked before anything grows."""

from __future__ import annotations

import re
from typing import Literal, NamedTuple

from tangentbook.errors import ExpressionError

MAX_LENGTH = 65_536
MAX_DIGITS = 400
# beyond the range of double precision a literal is a slip, not a quantity
MAX_DECADE = 300

# plain decimals of this length are inside every limit
_SURELY_FINE = 40

Kind = Literal["number", "name", "unit", "op", "rest", "end"]


class Token(NamedTuple):
    """One token: `text`, its 0-based column, and the number of primes directly behind it."""

    kind: Kind
    text: str
    at: int
    primes: int = 0


_PATTERN = re.compile(
    r"""\s*(?:
      (?P<number>(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)
    | (?P<name>[^\W\d]\w*)
    | (?P<unit>\[[^\[\]]*\])
    | (?P<op>\*\*|<=|>=|==|!=|[-+*/^(),<>=])
    )""",
    re.VERBOSE,
)
_PRIMES = {"'": 1, "″": 2}
_LETTERS = re.compile(r"\w+")
_SAME = str.maketrans(
    {"−": "-", "·": "*", "⋅": "*", "×": "*", "÷": "/", "′": "'", "’": "'", "≤": "\x01", "≥": "\x02"}
)


def tokenize(text: str, where: str) -> list[Token]:
    """The tokens of an expression or equation, ended by an `end` token.

    Raises:
        ExpressionError: a character or a literal that has no meaning here; a limit.
    """
    if len(text) > MAX_LENGTH:
        raise ExpressionError(
            "expression.length",
            f"{len(text)} characters; at most {MAX_LENGTH} are read",
            where=where,
            hint="name parts of it in `definitions`",
        )
    # one character for one character, so that columns stay those of the given text
    text = text.translate(_SAME)
    tokens: list[Token] = []
    position = 0
    while True:
        match = _PATTERN.match(text, position)
        if match is None:
            break
        kind = str(match.lastgroup)
        at = match.start(kind)
        token = _checked(text, where, kind, match.group(kind), at)
        position = match.end()
        if text[position : position + 1] in _PRIMES and (kind == "name" or token.text == ")"):
            primes = 0
            while position < len(text) and text[position] in _PRIMES:
                primes += _PRIMES[text[position]]
                position += 1
            token = Token(token.kind, token.text, at, primes)
            _refuse_letters_behind_primes(text, where, token, position)
        tokens.append(token)
    rest = text[position:]
    if rest.strip():
        at = position + len(rest) - len(rest.lstrip())
        raise _unreadable(text, where, at)
    tokens.append(Token("end", "", len(text.rstrip())))
    return tokens


def _refuse_letters_behind_primes(text: str, where: str, token: Token, position: int) -> None:
    rest = _LETTERS.match(text, position) if token.primes else None
    if rest is not None:
        tail = rest.group()
        wrong = token.text + "'" * token.primes + tail
        base = token.text if token.kind == "name" else "X"
        tail = tail.lstrip("_") or "1"
        raise ExpressionError(
            "expression.prime-inside-name",
            f"a prime is d/dt and ends a name; got {wrong}",
            where=f"{where}, column {token.at + 1}",
            hint=f"rename the quantity, as {base}_{tail} or {base}{tail}1 (a transient reactance, "
            f"say); write {base}*{tail} only with a time derivative as {base}'*{tail}",
        )


def _checked(text: str, where: str, kind: str, value: str, at: int) -> Token:
    if kind == "number":
        if len(value) > _SURELY_FINE or "e" in value or "E" in value:
            _check_number(value, where, at)
        return Token("number", value, at)
    if kind == "name":
        if not value.isidentifier():
            bad = next(k for k in range(len(value)) if not value[: k + 1].isidentifier())
            raise _unreadable(text, where, at + bad)
        return Token("name", value, at)
    if kind == "unit":
        return Token("unit", value[1:-1], at)
    return Token("op", "^" if value == "**" else value, at)


def _check_number(value: str, where: str, at: int) -> None:
    mantissa, _, exponent = value.lower().partition("e")
    digits = len(mantissa.replace(".", ""))
    place = f"{where}, column {at + 1}"
    if digits > MAX_DIGITS or len(exponent) > 5:
        raise ExpressionError(
            "expression.number",
            f"a number has at most {MAX_DIGITS} digits and a decimal exponent of at most "
            f"{MAX_DECADE} in size",
            where=place,
            hint="write the number with the digits that are known, or use another unit",
        )
    power = int(exponent or 0)
    decade = power + len(mantissa.partition(".")[0].lstrip("0")) - 1
    if abs(power) > MAX_DECADE + MAX_DIGITS or abs(decade) > MAX_DECADE:
        raise ExpressionError(
            "expression.number",
            f"{value[:24]} is outside the range of numbers, about 1e-{MAX_DECADE} to "
            f"1e{MAX_DECADE}",
            where=place,
            hint="use another unit or a scaled quantity",
        )


_ADVICE = {
    "'": "a prime follows a name or a closing bracket directly, as theta' or (m*V)'",
    "″": "a prime follows a name or a closing bracket directly, as theta'' or (m*V)''",
    "²": "write a power as ^2",
    "³": "write a power as ^3",
    "√": "write sqrt(…)",
    "π": "write pi",
    "%": "write a fraction, or give the quantity the unit %",
    "&": "write and",
    "|": "write or; abs(x) for the absolute value",
    "!": "write not, or != for unequal",
    "{": "use round brackets",
    "[": "square brackets hold the unit of a number, as 64.94[1/s]",
    "]": "square brackets hold the unit of a number, as 64.94[1/s]",
    "\\": "write plain text, not LaTeX",
    "$": "write plain text, not LaTeX",
    ":": "an equation is written left = right",
    ";": "one equation an entry; arguments are separated by commas",
    "\x01": "write <=",
    "\x02": "write >=",
}


def _unreadable(text: str, where: str, at: int) -> ExpressionError:
    character = {"\x01": "≤", "\x02": "≥"}.get(text[at], text[at])
    return ExpressionError(
        "expression.character",
        f"{character!r} has no meaning in an expression",
        where=f"{where}, column {at + 1}",
        hint=_ADVICE.get(text[at], "use + - * / ^ ( ), names, numbers and functions"),
    )
