"""The arguments of each tool; `understand` turns raw JSON into one of them or a RequestError."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, TypeVar, get_args

from pydantic import Field, ValidationError

from tangentbook.contract.base import Model, Name, Scalar, Text
from tangentbook.contract.plain import is_object
from tangentbook.contract.plant import Plant, PlantRef
from tangentbook.contract.point import Also, Point, PointList
from tangentbook.errors import RequestError, nearest

if TYPE_CHECKING:
    from pydantic_core import ErrorDetails

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
        default=None,
        description="outputs of this call instead of the plant's: names or name -> expression",
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
    if not is_object(arguments):
        raise RequestError(
            "request.type",
            f"the arguments are one JSON object; got {type(arguments).__name__}",
            hint='send {"plant": {…}, …}',
        )
    try:
        return model.model_validate(_without_union(arguments))
    except ValidationError as error:
        raise _request_error(model, error) from None


def understand_plant(kind: type[Request], plant: dict[str, Any]) -> Request:
    """Validate a plant or a reference to one, so that messages speak of the one meant.

    Raises:
        RequestError: as `understand`.
    """
    try:
        return kind.model_validate(plant)
    except ValidationError as error:
        raise _request_error(kind, error, prefix="plant") from None


def _without_union(arguments: dict[str, Any]) -> dict[str, Any]:
    """Decide between a plant and a reference first: both failing would speak of neither."""
    if "plant" not in arguments or isinstance(arguments["plant"], (Plant, PlantRef)):
        return arguments
    plant: object = arguments["plant"]
    if not is_object(plant):
        raise RequestError(
            "request.field",
            f"plant: an object is expected; got {type(plant).__name__}",
            where="plant",
            hint='send {"name": …, "equations": […], …}, or {"ref": id} for a plant of an '
            "earlier reply",
        )
    kind = PlantRef if "ref" in plant else Plant
    return {**arguments, "plant": understand_plant(kind, plant)}


def _request_error(model: type[Model], error: ValidationError, *, prefix: str = "") -> RequestError:
    details = error.errors(include_url=False, include_input=False)
    # a misspelt field is the likely cause of a missing one beside it, and comes first
    details.sort(key=lambda detail: detail["type"] != "extra_forbidden")
    lines = [_line(detail, prefix) for detail in details[:6]]
    if len(details) > 6:
        lines.append(f"and {len(details) - 6} more")
    return RequestError(
        "request.field",
        "; ".join(lines),
        where=_place(details[0]["loc"], prefix),
        hint=_hint(model, details),
    )


def _hint(model: type[Model], details: list[ErrorDetails]) -> str:
    """What to do: the nearest names of the misspelt fields, missing ones first."""
    missing = [str(detail["loc"][-1]) for detail in details if detail["type"] == "missing"]
    offers: list[str] = []
    for detail in details[:3]:
        if detail["type"] == "extra_forbidden":
            name = str(detail["loc"][-1])
            offer = nearest(name, missing) if missing else ""
            if not offer.startswith("did you"):
                offer = nearest(name, _siblings(model, detail["loc"]))
            offers.append(f"{name}: {offer}" if offer else "")
    return "; ".join(filter(None, offers)) or "mend the named fields and send the call again"


def _line(detail: ErrorDetails, prefix: str) -> str:
    place = _place(detail["loc"], prefix)
    if detail["type"] == "extra_forbidden":
        return f"{place} is not a field of this call"
    if detail["type"] == "missing":
        return f"{place} is missing"
    expected = _EXPECTED.get(_field(detail["loc"]))
    if expected is not None and detail["type"].endswith("_type"):
        return f"{place}: {expected} is expected"
    message = str(detail["msg"]).removeprefix("Value error, ")
    return f"{place}: {message}"


def _field(location: tuple[int | str, ...]) -> str:
    """The innermost named field of a place."""
    names = [str(part) for part in location if isinstance(part, str)]
    return next((name for name in reversed(names) if name in _EXPECTED), "")


_EXPECTED = {
    "point": 'an object as {"hold": {"theta": "60 deg"}}, or a list of them,',
    "equations": 'a list of texts "left = right"',
    "hold": 'an object name -> value, as {"theta": "60 deg"},',
    "guess": 'an object name -> value, as {"M": 9000},',
    "within": 'an object name -> [lower, upper], as {"theta": ["0 deg", "90 deg"]},',
    "also": 'a list, as ["dc gain"],',
    "parameters": 'an object name -> value, as {"J": "2.4e5 kg m^2"},',
    "states": "a list of names, or an object name -> unit or table,",
    "inputs": "a list of names, or an object name -> unit or table,",
    "outputs": "a list of names, or an object name -> expression,",
    "algebraic": "a list of names, or an object name -> unit or table,",
    "definitions": "an object name -> expression",
    "set": "an object parameter -> value",
    "limits": "[lower, upper], null for none,",
}


_UNION_LABELS = {"Plant", "PlantRef", "int", "float", "str", "tuple", "dict", "list"}


def _place(location: tuple[int | str, ...], prefix: str) -> str:
    parts = [prefix] if prefix else []
    for part in location:
        text = str(part)
        if text.split("[", maxsplit=1)[0] in _UNION_LABELS or text.startswith("function-"):
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
    for inner in get_args(annotation):
        found = _model_of(inner)
        if found is not None:
            return found
    return None
