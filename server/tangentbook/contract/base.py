"""What every model at the edge shares: strict, frozen, finite; and the scalar of a request."""

from __future__ import annotations

import math
import unicodedata
from typing import Annotated, Any

from pydantic import BaseModel, BeforeValidator, ConfigDict, WithJsonSchema

from tangentbook.contract.plain import is_array, is_object

MAX_TEXT = (
    65_536  # characters of one expression: 64 KiB keeps a hostile text from being parsed at all
)


class Model(BaseModel):
    """A record of the contract: unknown fields refused, immutable, no NaN or infinity."""

    model_config = ConfigDict(
        extra="forbid", frozen=True, allow_inf_nan=False, populate_by_name=True
    )


def _scalar(value: object) -> object:
    if isinstance(value, bool) or not isinstance(value, (int, float, str)):
        msg = 'a number or a text such as "52 kN" or "2*pi/3" is expected'
        raise ValueError(msg)  # noqa: TRY004 - pydantic turns ValueError into its own error
    if isinstance(value, str):
        return _text(value)
    if isinstance(value, float):
        if not math.isfinite(value):
            msg = "NaN and infinity are not numbers of a plant; leave the entry out"
            raise ValueError(msg)
        # 1.0 and 1 are one number on every transport (JavaScript clients send 1)
        return int(value) if value.is_integer() and abs(value) < 1e15 else value
    if abs(value) >= 10**400:
        msg = "a whole number has at most 400 digits"
        raise ValueError(msg)
    return value


def _text(value: object) -> object:
    if isinstance(value, str):
        if len(value) > MAX_TEXT:
            msg = f"a text of {len(value)} characters; at most {MAX_TEXT} are read"
            raise ValueError(msg)
        try:
            value.encode("utf-8")
        except UnicodeEncodeError:
            msg = "the text holds a lone surrogate, which is not Unicode text"
            raise ValueError(msg) from None
        return unicodedata.normalize("NFC", value)
    return value


def one_line(text: str) -> str:
    """A text on one line, with invisible characters shown: it cannot forge lines of its own."""
    folded = " ".join(text.split())
    return "".join(
        f"\u27e8U+{ord(c):04X}\u27e9" if unicodedata.category(c).startswith("C") else c
        for c in folded
    )


def _line(value: object) -> object:
    value = _text(value)
    return one_line(value) if isinstance(value, str) else value


def _name(value: object) -> object:
    value = _text(value)
    if isinstance(value, str):
        return value.strip().replace("′", "'").replace("’", "'").replace("″", "''")
    return value


Scalar = Annotated[
    int | float | str,
    BeforeValidator(_scalar),
    WithJsonSchema({"type": ["number", "string"]}),
]
"""A number, "number unit", or a constant expression."""

Text = Annotated[str, BeforeValidator(_text)]
"""Text of a stranger: NFC, bounded."""

Line = Annotated[str, BeforeValidator(_line)]
"""What something is called: one line, nothing invisible."""

Name = Annotated[str, BeforeValidator(_name)]
"""A name of the plant, primes in one spelling."""


def canonical(value: Any) -> Any:  # noqa: ANN401 - JSON is what it is
    """The canonical form that is digested: maps become lists of pairs, their order has meaning."""
    if isinstance(value, BaseModel):
        return canonical(value.model_dump(mode="json", by_alias=True, exclude_defaults=True))
    if is_object(value):
        return [[key, canonical(item)] for key, item in value.items()]
    if is_array(value):
        return [canonical(item) for item in value]
    return value
