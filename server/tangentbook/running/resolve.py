"""Raw arguments -> a validated request that stands alone.

What a call refers to (an earlier plant, a plant of the served folder, the point of an earlier
report) is replaced by its content, so that the report can be run again on another machine.
"""

from __future__ import annotations

import json
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, cast

from tangentbook.contract.identity import (
    call_digest,
    plant_id,
    report_stem,
    resolved_arguments,
)
from tangentbook.contract.plain import is_object, require_plain
from tangentbook.contract.plant import Plant, PlantRef
from tangentbook.contract.registry import tool_named
from tangentbook.contract.requests import understand, understand_plant
from tangentbook.errors import LimitError, ReportError, RequestError, TangentbookError, nearest
from tangentbook.running.files import read_object
from tangentbook.running.limits import TEXT_BYTES
from tangentbook.running.overrides import with_parameters
from tangentbook.running.points import point_again
from tangentbook.running.store import Store, embedded

if TYPE_CHECKING:
    from tangentbook.contract.base import Model

_INLINE = "send the plant inline, as check-plant takes it"


@dataclass(frozen=True, slots=True, kw_only=True)
class Resolved:
    """A call that stands alone."""

    tool: str
    plant: Plant
    plant_id: str
    arguments: dict[str, Any]
    """What the worker computes and the report prints: defaults and budget left out."""
    report_id: str
    budget_s: float | None

    @property
    def stem(self) -> str:
        """File name of the report, without suffix."""
        return report_stem(self.plant.name, self.tool, self.report_id)


@dataclass(frozen=True, slots=True, kw_only=True)
class References:
    """Where references are looked up; without a store and a folder nothing can be referred to."""

    store: Store | None = None
    plants: Path | None = None
    """The served folder."""


NOWHERE = References()


def resolve(tool: str, arguments: object, *, references: References = NOWHERE) -> Resolved:
    """Understand a call and replace what it refers to.

    Raises:
        TangentbookError: the tool, an argument or a reference is not understood.
    """
    entry = tool_named(tool)
    _require_size(arguments)
    if is_object(arguments) and "plant" in arguments:
        arguments = {**arguments, "plant": _plant(arguments["plant"], references)}
    request = understand(entry.request, arguments)
    plant: object = getattr(request, "plant", None)
    if not isinstance(plant, Plant):
        raise RequestError("request.field", "plant is missing", where="plant", hint=_INLINE)
    request = _with_points(request, plant, references)
    return Resolved(
        tool=tool,
        plant=plant,
        plant_id=plant_id(plant),
        arguments=resolved_arguments(request),
        report_id=call_digest(tool, request)[:16],
        budget_s=getattr(request, "budget_s", None),
    )


def _require_size(arguments: object) -> None:
    require_plain(arguments)
    if len(json.dumps(arguments)) > TEXT_BYTES:
        raise LimitError(
            "limit.text",
            f"the arguments are longer than {TEXT_BYTES // 1024**2} MiB",
            hint='refer to a plant by {"ref": id}, or send a smaller one',
        )


def _plant(plant: object, references: References) -> object:
    """The plant that was meant; anything that is no reference is left for the model to judge."""
    if not (is_object(plant) and "ref" in plant):
        return plant
    reference = understand_plant(PlantRef, plant)
    return with_parameters(referred_plant(reference.ref, references), dict(reference.set))


def referred_plant(name: str, references: References) -> dict[str, Any]:
    """The plant of an id in the store, or of a name in the served folder.

    Raises:
        RequestError: neither knows the name.
    """
    if references.store is not None:
        known = references.store.find_plant(name)
        if known is not None:
            return known
    served = served_plants(references.plants) if references.plants is not None else {}
    if name in served:
        return served[name]
    raise RequestError(
        "request.reference",
        f"no plant {name[:64]!r} is known here",
        where="plant.ref",
        hint=f"{_INLINE}; {nearest(name, served)}" if served else _INLINE,
    )


def served_plants(folder: Path) -> dict[str, dict[str, Any]]:
    """Every plant of the served folder under its file stem and under its name.

    Files that cannot be read, or that lie elsewhere and are linked here, are left out: a folder
    may hold other things. A stem goes before another plant's name.
    """
    stems: dict[str, dict[str, Any]] = {}
    names: dict[str, dict[str, Any]] = {}
    root = folder.resolve()
    for path in sorted(folder.glob("*")):
        if path.suffix.lower() not in {".toml", ".json"} or path.resolve().parent != root:
            continue
        try:
            plant = read_object(path)
        except ReportError:
            continue
        if "equations" in plant:
            stems.setdefault(path.stem, plant)
            names.setdefault(str(plant.get("name", path.stem)), plant)
    return names | stems


def _with_points(request: Model, plant: Plant, references: References) -> Model:
    """Replace `from` in every point by the point request of the report it names."""
    points: object = getattr(request, "point", None)
    if not isinstance(points, tuple):
        return request
    listed = cast("tuple[Any, ...]", points)
    if all(point.from_ is None for point in listed):
        return request
    replaced = [
        point
        if point.from_ is None
        else point_again(point, plant, _report(point.from_.report, references), where=f"point.{n}")
        for n, point in enumerate(listed)
    ]
    raw = request.model_dump(mode="json", by_alias=True, exclude_defaults=True)
    raw["point"] = [
        point
        if is_object(point)
        else point.model_dump(mode="json", by_alias=True, exclude_defaults=True)
        for point in replaced
    ]
    return understand(type(request), raw)


def _report(report_id: str, references: References) -> tuple[dict[str, Any], dict[str, Any]]:
    if references.store is None:
        raise RequestError(
            "request.reference",
            "there are no reports to take a point from here",
            where="point.from.report",
            hint="send the point itself",
        )
    return embedded(references.store.read_report(report_id))


def error_at(error: TangentbookError, place: str) -> TangentbookError:
    """The same error, its place named from further out."""
    where = f"{place}: {error.where}" if error.where else place
    return type(error)(error.code, error.message, where=where, hint=error.hint)
