"""Published schemas are valid, take every form that validation takes, and stay short."""

from __future__ import annotations

import json
from typing import Any

import pytest
from jsonschema import Draft202012Validator

from tangentbook.contract.plant import BRIDGE
from tangentbook.contract.registry import TOOLS, Tool
from tangentbook.contract.schemas import input_schema, output_schema, schema, schema_names

by_name = pytest.mark.parametrize("tool", TOOLS, ids=lambda tool: tool.name)


def fits(value: Any, published: dict[str, Any]) -> bool:  # noqa: ANN401 - JSON
    errors = Draft202012Validator(published).iter_errors(value)  # pyright: ignore[reportUnknownMemberType]
    return not list(errors)


@pytest.mark.parametrize("name", schema_names())
def test_every_schema_is_valid_and_fits_its_examples(name: str) -> None:
    published = schema(name)
    Draft202012Validator.check_schema(published)
    for example in published.get("examples", []):
        assert fits(example, published)


@by_name
def test_the_listed_schema_fits_the_example_and_refuses_other_names(tool: Tool) -> None:
    published = input_schema(tool)
    Draft202012Validator.check_schema(published)
    assert fits(tool.example, published)
    assert not fits({**tool.example, "pont": {}}, published)


FORMS: list[dict[str, Any]] = [
    {"plant": {"name": "x", "equations": ["x' = u"], "inputs": ["u"]}},
    {"plant": {"name": "x", "equations": [{"is": "x' = u"}], "inputs": {"u": "m"}}},
    {
        "plant": {
            **BRIDGE,
            "assumptions": "rigid",
            "parameters": {"J": 1, "b": "2 m", "c": {"is": 1}},
        }
    },
    {"plant": {**BRIDGE, "definitions": {"a": "J*b", "c": {"is": "b"}}, "states": ["theta"]}},
    {"plant": {**BRIDGE, "inputs": {"Mc": {"unit": "N m", "limits": [0, None]}}}},
]


@pytest.mark.parametrize("arguments", FORMS)
@by_name
def test_short_forms_fit(tool: Tool, arguments: dict[str, Any]) -> None:
    tool.request.model_validate(arguments)
    assert fits(arguments, schema(tool.name))
    assert fits(arguments, input_schema(tool))


@pytest.mark.parametrize(
    "point",
    [
        {},
        [{}],
        {"hold": [{"is": "W*r/M", "equals": 2}], "frozen": "h", "find": ["Mw"]},
        {"within": {"x": [0, None]}, "every": True},
        {"from": {"report": "0123456789abcdef", "point": "p2"}, "set": {"J": 1}},
    ],
)
def test_points_fit(point: object) -> None:
    (trim,) = (tool for tool in TOOLS if tool.name == "trim")
    arguments = {"plant": BRIDGE, "point": point}
    trim.request.model_validate(arguments)
    assert fits(arguments, schema("trim"))
    # a tool list offers only what this version handles
    later = isinstance(point, dict) and ("frozen" in point or "every" in point)
    assert fits(arguments, input_schema(trim)) is not later


@by_name
def test_a_reference_to_a_plant_fits(tool: Tool) -> None:
    arguments = {"plant": {"ref": "0123456789abcdef", "set": {"J": 1}}}
    assert fits(arguments, schema(tool.name))
    assert fits(arguments, input_schema(tool))


def depth(published: object) -> int:
    if not isinstance(published, dict):
        return 0
    below = [depth(item) for item in published.values()]  # pyright: ignore[reportUnknownVariableType, reportUnknownArgumentType]
    return max(below, default=0) + ("properties" in published)


def test_the_listed_result_is_two_levels_deep() -> None:
    assert depth(output_schema()) == 2


def test_the_list_of_tools_stays_below_5000_tokens() -> None:
    characters = sum(
        len(tool.description)
        + len(json.dumps(input_schema(tool), ensure_ascii=False, separators=(",", ":")))
        + len(json.dumps(output_schema(), separators=(",", ":")))
        for tool in TOOLS
    )
    assert characters / 4 < 5000
