"""The operating point of a request."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Field, model_validator

from tangentbook.contract.base import Line, Model, Name, Scalar, Text
from tangentbook.contract.plain import is_array, is_object


class Hold(Model):
    """A condition on any expression: `is` shall equal `equals`."""

    is_: Text = Field(alias="is")
    equals: Scalar


class From(Model):
    """The point of an earlier report."""

    report: Text
    point: Text = "p1"


def _hold(value: object) -> object:
    """An object name -> value, or a list of such objects and of {is, equals}: always a list.

    In an object a name may also stand for a whole condition: label -> {"is": …, "equals": …}.
    """
    if is_object(value):
        value = [value]
    if not is_array(value):
        return value
    conditions: list[Any] = []
    for item in value:
        if is_object(item) and "is" not in item:
            conditions.extend(
                held if is_object(held) else {"is": name, "equals": held}
                for name, held in item.items()
            )
        else:
            conditions.append(item)
    return conditions


def _as_list(value: object) -> object:
    """One point stands for a list of one."""
    return [value] if is_object(value) or isinstance(value, Point) else value


Names = Annotated[tuple[Name, ...], BeforeValidator(lambda v: [v] if isinstance(v, str) else v)]


class Point(Model):
    """How an operating point is asked for; {} is all at rest."""

    name: Line = ""
    hold: Annotated[tuple[Hold, ...], BeforeValidator(_hold)] = Field(
        default=(), description='name -> value, or {"is": expression, "equals": value}'
    )
    moving: dict[Name, Scalar] = Field(default_factory=dict)
    frozen: Names = ()
    find: Names = Field(default=(), description="disturbances that are found, not at rest")
    guess: dict[Name, Scalar] = Field(default_factory=dict)
    within: dict[Name, tuple[Scalar | None, Scalar | None]] = Field(
        default_factory=dict, description="hard bounds of the search, name -> [lower, upper]"
    )
    set: dict[Name, Scalar] = Field(
        default_factory=dict, description="parameter overrides of this configuration"
    )
    least: Text | None = None
    most: Text | None = None
    every: bool = False
    from_: From | None = Field(default=None, alias="from")

    @model_validator(mode="after")
    def _from_alone(self) -> Point:
        others = self.model_fields_set - {"from_", "set", "name"}
        if self.from_ is not None and others:
            msg = "beside `from` only `set` and `name` may stand"
            raise ValueError(msg)
        return self


PointList = Annotated[
    tuple[Point, ...],
    BeforeValidator(_as_list),
    Field(min_length=1, max_length=1000),
]

Also = Literal["transfer functions", "zeros", "dc gain", "frequency response", "held", "bilinear"]
