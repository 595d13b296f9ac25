"""A call sheet: many calls in one file, each with what is expected of its result."""

from __future__ import annotations

from typing import Annotated, Any

from pydantic import AfterValidator, ConfigDict, Field, model_validator

from tangentbook.contract.base import Line, Model, Text
from tangentbook.contract.plain import is_array, is_number, is_object, pointer_parts

_SHEET_EXAMPLE: dict[str, Any] = {
    "call": [
        {
            "name": "leaf at 60 degrees",
            "tool": "trim",
            "plant": {"file": "bridge.toml", "set": {"W": "52 kN"}},
            "point": {"hold": {"theta": "60 deg"}},
            "over": {"plant.set.J": ["2.2e5 kg m^2", "2.4e5 kg m^2"]},
            "expect": {
                "/outcome": "done",
                "/points/0/values/M/value": {"value": 9100, "rel": 1e-9},
            },
        }
    ]
}


def _expectations(expected: dict[str, Any]) -> dict[str, Any]:
    for pointer, value in expected.items():
        pointer_parts(pointer)
        _require_expectation(value, pointer)
    return expected


def _require_expectation(value: object, pointer: str) -> None:
    if is_array(value):
        for item in value:
            _require_expectation(item, pointer)
    elif is_object(value):
        tolerances = value.keys() & {"abs", "rel"}
        known = value.keys() <= {"value", "abs", "rel"} and "value" in value
        if not (known and tolerances and all(is_number(item) for item in value.values())):
            msg = f'{pointer}: {{"value": number, "abs" or "rel": number}} is expected'
            raise ValueError(msg)
        if any(value[name] < 0 for name in tolerances):
            msg = f"{pointer}: a tolerance is not negative"
            raise ValueError(msg)


class SheetCall(Model):
    """One entry: a name, a tool, the tool's arguments beside them, and what is expected."""

    model_config = ConfigDict(extra="allow", protected_namespaces=())

    name: Line = Field(default="", description="what the call is called in the summary")
    tool: Text = Field(description="a tool's name; its arguments stand beside it")
    arguments: dict[str, Any] = Field(
        default_factory=dict, description="the arguments, where they do not stand beside `tool`"
    )
    over: dict[str, Annotated[list[Any], Field(min_length=1)]] = Field(
        default_factory=dict,
        description='a grid: place in the call ("plant.set.J" or a JSON Pointer) -> values; '
        "every combination is a call",
    )
    expect: Annotated[dict[str, Any], AfterValidator(_expectations)] = Field(
        default_factory=dict,
        description="JSON Pointer into the result -> text, number (equal at 10 digits), or "
        "{value, abs | rel}",
    )

    @model_validator(mode="after")
    def _arguments_once(self) -> SheetCall:
        twice = self.arguments.keys() & (self.model_extra or {}).keys()
        if twice:
            msg = f"given beside `tool` and in `arguments`: {', '.join(sorted(twice))}"
            raise ValueError(msg)
        return self

    @property
    def all_arguments(self) -> dict[str, Any]:
        """The arguments of the tool, wherever they stand."""
        return {**self.arguments, **(self.model_extra or {})}


class Sheet(Model):
    """A file of calls: TOML with [[call]], JSON {"call": […]}, or JSON Lines, a call a line."""

    model_config = ConfigDict(json_schema_extra={"examples": [_SHEET_EXAMPLE]})

    about: Text = ""
    call: list[SheetCall] = Field(min_length=1)
