"""Plain JSON values: guards, bounds of nesting, and JSON Pointers (RFC 6901).

Arguments, results and sheets are handled as plain values where their model does not matter;
these guards are the one place that narrows them.
"""

from __future__ import annotations

import math
from typing import Any, TypeGuard

from tangentbook.errors import RequestError

MAX_NESTING = 64
"""Levels of a request; a plant needs six, and deeper texts only exhaust a recursive reader."""

MISSING = object()
"""What `look_up` answers where a pointer leads nowhere (None is a value)."""


def is_object(value: object) -> TypeGuard[dict[str, Any]]:
    """Whether the value is a JSON object."""
    return isinstance(value, dict)


def is_array(value: object) -> TypeGuard[list[Any]]:
    """Whether the value is a JSON array."""
    return isinstance(value, list)


def is_number(value: object) -> TypeGuard[int | float]:
    """Whether the value is a JSON number; true and false are not."""
    return isinstance(value, (int, float)) and not isinstance(value, bool)


def require_plain(value: object, *, where: str = "arguments") -> None:
    """Refuse what JSON cannot hold and what is nested too deep, before anything recursive sees it.

    Raises:
        RequestError: a date, NaN, infinity, or more than `MAX_NESTING` levels.
    """
    pending: list[tuple[object, int]] = [(value, 1)]
    while pending:
        item, depth = pending.pop()
        if is_object(item):
            pending.extend((inner, depth + 1) for inner in item.values())
        elif is_array(item):
            pending.extend((inner, depth + 1) for inner in item)
        elif isinstance(item, float) and not math.isfinite(item):
            raise RequestError(
                "request.type", "NaN and infinity are not numbers of a call", where=where
            )
        elif item is not None and not isinstance(item, (str, int, float)):
            raise RequestError(
                "request.type",
                f"a {type(item).__name__} is not a value of a call; send a number or a text",
                where=where,
            )
        if depth > MAX_NESTING:
            raise RequestError(
                "request.type", f"nested deeper than {MAX_NESTING} levels", where=where
            )


def pointer_parts(pointer: str) -> list[str]:
    """The reference tokens of a JSON Pointer.

    Raises:
        ValueError: the text is neither empty nor begins with a slash.
    """
    if not pointer:
        return []
    if not pointer.startswith("/"):
        msg = f"a JSON Pointer begins with a slash; got {pointer!r}"
        raise ValueError(msg)
    return [part.replace("~1", "/").replace("~0", "~") for part in pointer[1:].split("/")]


def pointer_to(pointer: str, token: str | int) -> str:
    """The pointer one step further."""
    return f"{pointer}/{str(token).replace('~', '~0').replace('/', '~1')}"


def look_up(value: object, pointer: str) -> object:
    """The value a JSON Pointer leads to, or `MISSING`."""
    for part in pointer_parts(pointer):
        if is_object(value):
            value = value.get(part, MISSING)
        elif is_array(value) and part.isascii() and part.isdigit() and int(part) < len(value):
            value = value[int(part)]
        else:
            return MISSING
    return value
