"""JSON Schemas and examples: full ones by name, and the short ones of the list of tools.

A client is sent the list of tools again and again, so there the plant's schema stands in
check-plant alone and results are shown two levels deep; our own validation judges what comes.
"""

from __future__ import annotations

from copy import deepcopy
from typing import TYPE_CHECKING, Any

from tangentbook.contract.plain import is_array, is_object
from tangentbook.contract.plant import Plant
from tangentbook.contract.registry import TOOLS, tool_named
from tangentbook.contract.results import Result
from tangentbook.contract.sheet import Sheet
from tangentbook.errors import RequestError, nearest

if TYPE_CHECKING:
    from tangentbook.contract.registry import Tool

_FULL_PLANT = "check-plant"
"""The tool whose listed schema holds the whole plant."""

_SHORT_PLANT: dict[str, Any] = {
    "type": "object",
    "description": 'as in check-plant, or {"ref": id of an earlier reply, "set": {"J": "2.6e5 '
    'kg m^2"}} with parameters that differ',
}

_TEXT: dict[str, Any] = {"type": "string"}
_TEXTS: dict[str, Any] = {"anyOf": [_TEXT, {"type": "array", "items": _TEXT}]}


def schema_names() -> list[str]:
    """plant, result, call-sheet, and one per tool."""
    return ["plant", "result", "call-sheet", *(tool.name for tool in TOOLS)]


def schema(name: str) -> dict[str, Any]:
    """The full JSON Schema of that name, with an example.

    Raises:
        RequestError: no schema of that name.
    """
    if name not in schema_names():
        raise RequestError(
            "request.schema",
            f"there is no schema {name!r}",
            where="schema",
            hint=nearest(name, schema_names()),
        )
    models = {"plant": Plant, "result": Result, "call-sheet": Sheet}
    if name in models:
        return _widened(models[name].model_json_schema(by_alias=True))
    tool = tool_named(name)
    published = _widened(tool.request.model_json_schema(by_alias=True))
    published["examples"] = [tool.example]
    return published


_LATER = frozenset(
    [
        "settings",
        "tables",
        "numeric",
        "moving",
        "frozen",
        "least",
        "most",
        "every",
        "frequencies",
        "held",
        "bilinear",
    ]
)
"""Parts of the language that are read but not handled yet: a tool list offers none of them."""


def input_schema(tool: Tool) -> dict[str, Any]:
    """The arguments of a tool as the list of tools shows them."""
    published = schema(tool.name)
    for record in (published, *published.get("$defs", {}).values()):
        properties: dict[str, Any] = record.get("properties", {})
        for name in _LATER & properties.keys():
            del properties[name]
        if "also" in properties:
            properties["also"]["items"] = {"const": "dc gain"}
    if tool.name != _FULL_PLANT:
        published["properties"]["plant"] = _SHORT_PLANT
    published.pop("description", None)  # the tool's own says more
    published["$defs"] = _reachable(published)
    for definition in published["$defs"].values():
        definition.pop("examples", None)  # the tool's own example shows the whole
    return _without_ornament(published)


def output_schema() -> dict[str, Any]:
    """The result of every tool, two levels deep."""
    full = Result.model_json_schema(by_alias=True)
    return _shallow(full, full["$defs"], 2)


def _widened(published: dict[str, Any]) -> dict[str, Any]:
    """Add the short forms that validation also takes: texts for records, one for a list."""
    definitions: dict[str, Any] = published.get("$defs", {})
    for record in (published, *definitions.values()):
        properties: dict[str, Any] = record.get("properties", {})
        if "equations" in properties:
            _widen_plant(properties)
        if "hold" in properties:
            _widen_point(properties)
        if "assumptions" in properties:
            properties["assumptions"] = _TEXTS
        if "items" in properties.get("point", {}):
            one = properties["point"].pop("items")
            many = {"type": "array", "items": one, "minItems": 1}
            properties["point"] = {
                "anyOf": [one, many],
                "description": properties["point"]["description"],
            }
    return published


def _widen_plant(properties: dict[str, Any]) -> None:
    properties["equations"]["items"] = {"anyOf": [_TEXT, properties["equations"]["items"]]}
    for name in ("states", "inputs", "outputs", "algebraic", "settings"):
        table = properties[name]
        named = {"anyOf": [_TEXT, table.pop("additionalProperties")]}
        table.pop("type", None)
        table["anyOf"] = [
            {"type": "array", "items": _TEXT},
            {"type": "object", "additionalProperties": named},
        ]
    for name, short in (("parameters", ["number", "string"]), ("definitions", ["string"])):
        table = properties[name]
        table["additionalProperties"] = {"anyOf": [{"type": short}, table["additionalProperties"]]}


def _widen_point(properties: dict[str, Any]) -> None:
    properties["hold"] = {
        "type": ["object", "array"],
        "description": properties["hold"].get("description", ""),
    }
    for name in ("frozen", "find"):
        properties[name] = _TEXTS | {
            key: text for key, text in properties[name].items() if key == "description"
        }


def _reachable(published: dict[str, Any]) -> dict[str, Any]:
    """The definitions that the properties still refer to."""
    definitions: dict[str, Any] = published.get("$defs", {})
    found: dict[str, Any] = {}
    pending: list[object] = [published["properties"]]
    while pending:
        item = pending.pop()
        if is_object(item):
            name = str(item.get("$ref", "")).removeprefix("#/$defs/")
            if name in definitions and name not in found:
                found[name] = deepcopy(definitions[name])
                pending.append(found[name])
            pending.extend(item.values())
        elif is_array(item):
            pending.extend(item)
    return found


def _without_ornament(value: Any) -> Any:  # noqa: ANN401 - JSON
    """The same schema without titles, defaults and the null of an absent option."""
    if is_array(value):
        return [_without_ornament(item) for item in value]
    if not is_object(value):
        return value
    kept: dict[str, Any] = {}
    for key, item in value.items():
        if key in {"properties", "$defs"}:  # their keys are names, not keywords
            kept[key] = {name: _without_ornament(inner) for name, inner in item.items()}
        elif key in {"examples", "prefixItems"}:
            kept[key] = item
        elif key not in {"title", "default"} and not (key == "description" and not item):
            kept[key] = _without_ornament(item)
    return _without_null(kept)


def _without_null(schema: dict[str, Any]) -> dict[str, Any]:
    alternatives: object = schema.get("anyOf")
    if not is_array(alternatives) or {"type": "null"} not in alternatives:
        return schema
    others = [other for other in alternatives if other != {"type": "null"}]
    rest = {key: item for key, item in schema.items() if key != "anyOf"}
    return rest | (others[0] if len(others) == 1 else {"anyOf": others})


def _shallow(value: dict[str, Any], definitions: dict[str, Any], levels: int) -> dict[str, Any]:
    """A schema of objects, cut off below `levels` of them."""
    if "$ref" in value:
        value = definitions[value["$ref"].removeprefix("#/$defs/")]
    if "anyOf" in value:
        return _shallow_union(value["anyOf"], definitions, levels)
    kept = {key: value[key] for key in ("type", "enum", "const") if key in value}
    if "properties" in value and levels:
        properties: dict[str, Any] = value["properties"]
        kept["properties"] = {
            name: _shallow(item, definitions, levels - 1) for name, item in properties.items()
        }
        kept |= {"required": value["required"]} if "required" in value and levels == 2 else {}
    if "items" in value and levels:
        kept["items"] = _shallow(value["items"], definitions, levels)
    return kept


def _shallow_union(
    alternatives: list[dict[str, Any]], definitions: dict[str, Any], levels: int
) -> dict[str, Any]:
    """Below the first level a value that may be absent is named only, to save tokens."""
    if levels < 2:
        return {}
    cut = [_shallow(one, definitions, levels) for one in alternatives]
    return {"anyOf": cut} if all(cut) else {}
