"""Call sheets: files of calls, read whole, their grids laid out and their plant files read.

A mistake of the sheet itself (an unknown tool, a place a grid cannot set, an expectation that
cannot be compared) is found here, before any call runs, and named by file and call.
"""

from __future__ import annotations

import itertools
import json
import math
from copy import deepcopy
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from tangentbook.contract.base import one_line
from tangentbook.contract.plain import MISSING, is_array, is_object, pointer_parts
from tangentbook.contract.registry import tool_named
from tangentbook.contract.requests import understand
from tangentbook.contract.sheet import Sheet, SheetCall
from tangentbook.errors import ReportError, RequestError, TangentbookError
from tangentbook.running.callfiles import inline_plant
from tangentbook.running.files import read_document
from tangentbook.running.limits import SHEET_CALLS
from tangentbook.running.resolve import error_at

if TYPE_CHECKING:
    from collections.abc import Iterator
    from pathlib import Path


@dataclass(frozen=True, slots=True, kw_only=True)
class Call:
    """One call of a sheet, its grid laid out and its plant file read."""

    sheet: Path
    name: str
    tool: str
    arguments: dict[str, Any]
    expect: dict[str, Any]

    @property
    def place(self) -> str:
        """How messages name the call."""
        return f"{self.sheet}: call {self.name!r}"


def read_sheet(path: Path) -> list[Call]:
    """Every call of a sheet.

    Raises:
        ReportError: the sheet, or a plant file it names, cannot be read, or an entry is not
            understood; the message names the file and the call.
    """
    sheet = _sheet(read_document(path), path)
    calls: list[Call] = []
    for number, entry in enumerate(sheet.call, start=1):
        named = entry.name or f"call {number}"
        try:
            tool_named(entry.tool)
            calls.extend(_laid_out(entry, named, path))
        except TangentbookError as error:
            raise _misfit(error, f"{path}: call {named!r}") from None
        if len(calls) > SHEET_CALLS:
            raise ReportError(
                "sheet.call",
                f"more than {SHEET_CALLS} calls",
                where=str(path),
                hint="make the grids smaller, or cut the sheet in parts",
            )
    return calls


def _sheet(value: object, path: Path) -> Sheet:
    if is_array(value):  # JSON Lines: a call a line
        value = {"call": value}
    try:
        return understand(Sheet, value)
    except RequestError as error:
        raise _misfit(error, str(path)) from None


def _misfit(error: TangentbookError, place: str) -> TangentbookError:
    """A mistake of the sheet, whatever part found it; file errors stay what they are."""
    named = error_at(error, place)
    if error.code.startswith("file."):
        return named
    return ReportError("sheet.call", named.message, where=named.where, hint=named.hint)


def _laid_out(entry: SheetCall, name: str, path: Path) -> Iterator[Call]:
    """One call for every combination of the grid's values."""
    places = list(entry.over)
    count = math.prod(len(values) for values in entry.over.values())
    if count > SHEET_CALLS:
        raise ReportError(
            "sheet.call",
            f"the grid `over` makes {count} calls, more than {SHEET_CALLS}",
            where="over",
            hint="give fewer values, or several sheets",
        )
    for values in itertools.product(*entry.over.values()):
        arguments = deepcopy(entry.all_arguments)
        for place, value in zip(places, values, strict=True):
            _put(arguments, place, value)
        chosen = ", ".join(f"{p}={_short(v)}" for p, v in zip(places, values, strict=True))
        yield Call(
            sheet=path,
            name=f"{name} [{chosen}]" if chosen else name,
            tool=entry.tool,
            arguments=inline_plant(arguments, path.parent),
            expect=entry.expect,
        )


def _short(value: object) -> str:
    text = value if isinstance(value, str) else json.dumps(value, ensure_ascii=False)
    text = one_line(text)
    return text if len(text) <= 40 else text[:39] + "…"


def _put(arguments: dict[str, Any], place: str, value: object) -> None:
    """Set one place of a call: a dotted name or a JSON Pointer; missing tables are made.

    Raises:
        RequestError: the place lies inside a value that has no places.
    """
    parts = pointer_parts(place) if place.startswith("/") else place.split(".")
    if parts[0] == "plant" and len(parts) > 1 and isinstance(arguments.get("plant"), str):
        arguments["plant"] = {"file": arguments["plant"]}
    inside: object = arguments
    for part in parts[:-1]:
        inside = _step(inside, part)
    last = parts[-1]
    if is_object(inside):
        inside[last] = value
    elif is_array(inside) and last.isdecimal() and int(last) < len(inside):
        inside[int(last)] = value
    else:
        raise RequestError(
            "sheet.call", f"there is no place {place!r} in the call", where=f"over.{place}"
        )


def _step(inside: object, part: str) -> object:
    if is_object(inside):
        return inside.setdefault(part, {})
    if is_array(inside) and part.isdecimal() and int(part) < len(inside):
        return inside[int(part)]
    return MISSING
