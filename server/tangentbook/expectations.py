"""What a call sheet expects of a result, compared with what is there."""

from __future__ import annotations

import json
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from tangentbook.contract.plain import MISSING, is_array, is_number, is_object, look_up

if TYPE_CHECKING:
    from collections.abc import Iterator

DIGITS = 10
"""Significant digits of a number in a result; two that print alike are equal."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Failure:
    """One expectation that is not met."""

    pointer: str
    expected: Any
    found: Any
    """`MISSING` where the pointer leads nowhere."""

    def as_dict(self) -> dict[str, Any]:
        """As printed by `--json`; what is not there has no `found`."""
        entry = {"pointer": self.pointer, "expected": self.expected}
        return entry if self.found is MISSING else {**entry, "found": self.found}

    def __str__(self) -> str:
        found = "nothing there" if self.found is MISSING else _text(self.found)
        return f"{self.pointer}: expected {_text(self.expected)}, found {found}"


def failures_of(result: dict[str, Any], expect: dict[str, Any]) -> Iterator[Failure]:
    """The expectations a result does not meet.

    Args:
        result: the result of a call, or {"error": …}.
        expect: JSON Pointer -> text, number, list of them, or {value, abs | rel}.
    """
    for pointer, expected in expect.items():
        found = look_up(result, pointer)
        if not _meets(found, expected):
            yield Failure(pointer=pointer, expected=expected, found=found)


def _meets(found: object, expected: object) -> bool:
    if is_object(expected):
        return is_number(found) and _within(found, expected)
    if is_array(expected):
        return (
            is_array(found)
            and len(found) == len(expected)
            and all(_meets(*pair) for pair in zip(found, expected, strict=True))
        )
    if is_number(expected):
        return is_number(found) and printed(found) == printed(expected)
    return found == expected and type(found) is type(expected)


def _within(found: float, expected: dict[str, Any]) -> bool:
    """Whether one of the tolerances given covers the difference."""
    difference = abs(found - expected["value"])
    allowed = max(expected.get("abs", 0), expected.get("rel", 0) * abs(expected["value"]))
    return difference <= allowed


def printed(number: float) -> str:
    """The number at the digits of a result, zero without sign."""
    return f"{float(number) + 0.0:.{DIGITS}g}" if number else "0"


def _text(value: object) -> str:
    text = json.dumps(value, ensure_ascii=False)
    return text if len(text) <= 200 else text[:199] + "…"
