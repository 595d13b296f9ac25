"""The arguments of each tool; `understand` turns raw JSON into one of them or a RequestError."""

from __future__ import annotations

from typing import Any, TypeVar

from pydantic import Field, ValidationError

from tangentbook.contract.base import Model, Name, Scalar, Text
from tangentbook.contract.plant import Plant, PlantRef
from tangentbook.contract.point import Also, Point, PointList
from tangentbook.errors import RequestError, nearest

PlantArgument = Plant | PlantRef
Budget = Field(default=None, gt=0, le=3600, description="seconds after which work stops")


class CheckPlant(Model):
    """Arguments of check-plant."""

    plant: PlantArgument
    budget_s: float | None = Budget


class Trim(Model):
    """Arguments of trim."""

    plant: PlantArgument
    point: PointList = Field(default=(Point(),), description="one operating point or a list")
    budget_s: float | None = Budget


class Linearize(Model):
    """Arguments of linearize."""

    plant: PlantArgument
    point: PointList = Field(default=(Point(),), description="one operating point or a list")
    outputs: dict[Name, Text] | list[Name] | None = Field(
        default=None, description="outputs of this call instead of the plant's: names or name -> expression"
    )
    also: tuple[Also, ...] = Field(default=(), description='further answers, as ["dc gain"]')
    frequencies: tuple[Scalar, ...] = ()
    held: dict[Name, Scalar] | None = None
    bilinear: bool = False
    budget_s: float | None = Budget


Request = TypeVar("Request", bound=Model)


def understand(model: type[Request], arguments: Any) -> Request:  # noqa: ANN401 - raw JSON
    """Validate raw arguments.

    Raises:
        RequestError: one line per field, with the nearest known name for a misspelt one.
    """
    if not isinstance(arguments, dict):
        raise RequestError(
            "request.type",
            f"the arguments are one JSON object; got {type(arguments).__name__}",
            hint='send {"plant": {…}, …}',
        )
    try:
        return model.model_validate(_without_union(arguments))
    except ValidationError as error:
        raise _request_error(model, error) from None


def _without_union(arguments: dict[str, Any]) -> dict[str, Any]:
    """Decide between a plant and a reference first, so that messages speak of the one meant."""
    plant = arguments.get("plant")
    if not isinstance(plant, dict):
        return arguments
    kind = PlantRef if "ref" in plant else Plant
    try:
        return {**arguments, "plant": kind.model_validate(plant)}
    except ValidationError as error:
        raise _request_error(kind, error, prefix="plant") from None


def _request_error(
    model: type[Model], error: ValidationError, *, prefix: str = ""
) -> RequestError:
    details = error.errors(include_url=False, include_input=False)
    lines = [_line(model, detail, prefix) for detail in details[:6]]
    if len(details) > 6:
        lines.append(f"and {len(details) - 6} more")
    where = _place(details[0]["loc"], prefix)
    first = details[0]
    hint = "mend the named fields and send the call again"
    if first["type"] == "extra_forbidden":
        name = str(first["loc"][-1])
        hint = nearest(name, _siblings(model, first["loc"])) or hint
    return RequestError("request.field", "; ".join(lines), where=where, hint=hint)


def _line(model: type[Model], detail: Any, prefix: str) -> str:  # noqa: ANN401 - pydantic's dict
    place = _place(detail["loc"], prefix)
    if detail["type"] == "extra_forbidden":
        return f"{place} is not a field of this call"
    if detail["type"] == "missing":
        return f"{place} is missing"
    message = str(detail["msg"]).removeprefix("Value error, ")
    return f"{place}: {message}"


_UNION_LABELS = {"Plant", "PlantRef", "int", "float", "str", "tuple", "dict", "list"}


def _place(location: tuple[int | str, ...], prefix: str) -> str:
    parts = [prefix] if prefix else []
    for part in location:
        text = str(part)
        if text.split("[")[0] in _UNION_LABELS or text.startswith("function-"):
            continue
        parts.append("is" if text == "is_" else text)
    return ".".join(parts) or "arguments"


def _siblings(model: type[Model], location: tuple[int | str, ...]) -> list[str]:
    """The field names that were possible where an unknown one stands."""
    fields = model.model_fields
    for part in location[:-1]:
        field = fields.get(str(part))
        inner = _model_of(field.annotation) if field is not None else None
        if inner is not None:
            fields = inner.model_fields
    return [field.alias or name for name, field in fields.items()]


def _model_of(annotation: Any) -> type[Model] | None:  # noqa: ANN401 - a typing construct
    if isinstance(annotation, type) and issubclass(annotation, Model):
        return annotation
    for inner in getattr(annotation, "__args__", ()):
        found = _model_of(inner)
        if found is not None:
            return found
    return None
