"""Parameter overrides of a plant: {"J": "2.6e5 kg m^2"} over the entries of `parameters`.

A number, or a text with numbers only, keeps the unit the parameter was given in; a text with a
unit, or one that speaks of other parameters, replaces value and unit. What was recorded of the
old value's source no longer holds and is dropped.
"""

from __future__ import annotations

import re
from typing import Any

from tangentbook.contract.plain import is_object
from tangentbook.errors import RequestError, nearest

_NUMERIC = re.compile(r"(?:[\s()+\-*/^.\d]|\d[eE]|\bpi\b)+")


def with_parameters(plant: dict[str, Any], changes: dict[str, Any]) -> dict[str, Any]:
    """The plant with the named parameters changed; the given one is left as it is.

    Args:
        plant: a plant as JSON, parameters in any form that is read.
        changes: name -> number, "number unit" or constant expression.

    Raises:
        RequestError: a name is not a parameter of the plant.
    """
    old = plant.get("parameters", {})
    entries: dict[str, Any] = dict(old) if is_object(old) else {}
    for name, change in changes.items():
        if name not in entries:
            raise RequestError(
                "request.set",
                f"{name} is not a parameter of the plant",
                where=f"plant.set.{name}",
                hint=nearest(name, entries) or "the plant has no parameters",
            )
        entries[name] = _changed(entries[name], change)
    return {**plant, "parameters": entries} if changes else plant


def _changed(old: Any, change: Any) -> dict[str, Any]:  # noqa: ANN401 - JSON
    entry: dict[str, Any] = dict(old) if is_object(old) else {"is": old}
    former = entry.pop("is", None)
    entry.pop("value", None)
    entry.pop("source", None)
    if isinstance(change, str) and not _NUMERIC.fullmatch(change):
        return {"is": change, **entry}
    if former is None or "unit" in entry:
        return {"value": change, **entry}
    unit = unit_of(former)
    return {"is": f"{change} {unit}" if unit else change, **entry}


def unit_of(text: Any) -> str:  # noqa: ANN401 - JSON
    """The unit of "number unit": what follows the first space outside the expression."""
    found = _split(text) if isinstance(text, str) else None
    return found or ""


def _split(text: str) -> str | None:
    depth = 0
    for position, character in enumerate(text):
        depth += (character == "(") - (character == ")")
        if character.isspace() and depth == 0:
            head, tail = text[:position].strip(), text[position:].strip()
            if head and tail and head[-1] not in "+-*/^," and tail[0] not in "+-*/^,)":
                return tail
    return None
