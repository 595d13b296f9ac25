"""JSON Schemas and examples, by the names that `tangentbook schema NAME` and resources use."""

from __future__ import annotations

from typing import Any

from tangentbook.contract.plant import Plant
from tangentbook.contract.registry import TOOLS, tool_named
from tangentbook.contract.results import Result
from tangentbook.errors import RequestError, nearest


def schema_names() -> list[str]:
    """plant, result, and one per tool."""
    return ["plant", "result", *(tool.name for tool in TOOLS)]


def schema(name: str) -> dict[str, Any]:
    """The full JSON Schema of that name, with an example.

    Raises:
        RequestError: no schema of that name.
    """
    if name == "plant":
        return Plant.model_json_schema(by_alias=True)
    if name == "result":
        return Result.model_json_schema(by_alias=True)
    if name not in schema_names():
        raise RequestError(
            "request.reference",
            f"there is no schema {name!r}",
            where="schema",
            hint=nearest(name, schema_names()),
        )
    tool = tool_named(name)
    published = tool.request.model_json_schema(by_alias=True)
    published["examples"] = [tool.example]
    return published
