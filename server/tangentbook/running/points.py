"""A point taken over from an earlier report: its request again, with its values as guess."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from tangentbook.contract.base import Model
from tangentbook.contract.plain import is_array, is_object
from tangentbook.contract.plant import Plant
from tangentbook.contract.point import Point
from tangentbook.contract.requests import understand
from tangentbook.errors import ReportError, RequestError, nearest

if TYPE_CHECKING:
    from collections.abc import Iterator

_GUESSED = {"state", "input", "algebraic", "setting"}
"""Roles of the names a search starts from; others follow from them."""


class _Points(Model):
    """The part of a report's call that is taken over."""

    plant: Plant
    point: tuple[Point, ...] = (Point(),)


def point_again(
    point: Point, plant: Plant, report: tuple[dict[str, Any], dict[str, Any]], *, where: str
) -> Point:
    """The request of the report's point, with the values found there as guess.

    Args:
        point: the point that says `from`; its name and `set` go over the report's.
        plant: the plant of this call, which may differ in the values of its parameters only.
        report: call and result of the report.
        where: place of the point in this call.

    Raises:
        RequestError: the plant is another one, or the report has no such point.
        ReportError: the report is damaged.
    """
    assert point.from_ is not None  # noqa: S101 - the caller looked
    call, result = report
    earlier = understand(_Points, _arguments(call))
    if _equations(earlier.plant) != _equations(plant):
        raise RequestError(
            "request.reference",
            f"report {point.from_.report} is about another plant ({earlier.plant.name!r})",
            where=f"{where}.from",
            hint="take a point from a report about the same equations",
        )
    entry = _entry(result, point.from_.point, where=f"{where}.from.point")
    try:
        asked: Point = earlier.point[int(entry["request"])]
        values = dict(_values(result, entry))
        found = {name: values[name] for name in values if _is_found(name, asked, plant)}
    except (KeyError, IndexError, TypeError, ValueError, AttributeError):
        raise ReportError(
            "report.unreadable",
            f"report {point.from_.report} is damaged: its result does not fit its call",
            where=f"{where}.from",
            hint="run the call of that report again",
        ) from None
    changes: dict[str, Any] = {
        "name": point.name or asked.name,
        "guess": {**asked.guess, **found},
        "set": {**asked.set, **point.set},
        "every": False,
    }
    return asked.model_copy(update=changes)


def _arguments(call: dict[str, Any]) -> dict[str, Any]:
    arguments: dict[str, Any] = call["arguments"]
    return {name: arguments[name] for name in ("plant", "point") if name in arguments}


def _equations(plant: Plant) -> dict[str, Any]:
    """All of a plant that its parameter values do not touch."""
    content = plant.model_dump(mode="json", by_alias=True, exclude_defaults=True)
    return {**content, "parameters": list(plant.parameters)}


def _entry(result: dict[str, Any], name: str, *, where: str) -> dict[str, Any]:
    points: object = result.get("points")
    entries = [entry for entry in points if is_object(entry)] if is_array(points) else []
    for entry in entries:
        if entry.get("id") == name and is_object(entry.get("values")):
            return entry
    known = [str(entry["id"]) for entry in entries if entry.get("id") and entry.get("values")]
    raise RequestError(
        "request.reference",
        f"the report has no point {name!r}",
        where=where,
        hint=nearest(name, known) or "the report found no point at all",
    )


def _is_found(name: str, asked: Point, plant: Plant) -> bool:
    """Whether the search looks for the name: it is neither held nor a disturbance at rest."""
    rests = name in plant.inputs and plant.inputs[name].role == "disturbance"
    held = any(condition.is_ == name for condition in asked.hold)
    return not held and (not rests or name in asked.find)


def _values(result: dict[str, Any], entry: dict[str, Any]) -> Iterator[tuple[str, Any]]:
    roles: dict[str, str] = result["plant"]["roles"]
    for name, value in entry["values"].items():
        if roles.get(name) in _GUESSED:
            yield name, value["value"]
