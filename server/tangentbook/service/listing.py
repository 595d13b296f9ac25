"""What the server lists: the registry's tools, the schemas and the report template."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING
from urllib.parse import quote

from mcp_types import Resource, ResourceTemplate, Tool, ToolAnnotations

from tangentbook.contract.registry import TOOLS
from tangentbook.contract.schemas import input_schema, output_schema, schema_names

if TYPE_CHECKING:
    from collections.abc import Iterable

    from tangentbook.contract.registry import Tool as Entry

INSTRUCTIONS = (
    "Tangentbook takes a plant as equations with units and linearizes it at an operating point. "
    'Start with check-plant; its reply carries an id, and later calls may send {"ref": id} as '
    "plant. Every number in a reply was computed, most were proved: quote them as they stand, "
    "with the scope of the answer and the cautions. Each call writes a report, linked as "
    "report://ID. A refusal names the place and what to send instead."
)


def list_tools() -> list[Tool]:
    """Every tool of the registry."""
    answer = output_schema()
    return [
        Tool(
            name=entry.name,
            title=entry.title,
            description=entry.description,
            input_schema=input_schema(entry),
            output_schema=answer,
            annotations=_annotations(entry),
        )
        for entry in TOOLS
    ]


def _annotations(entry: Entry) -> ToolAnnotations:
    """Reports go to the server's own store, so nothing of the client's is touched."""
    return ToolAnnotations(
        title=entry.title,
        read_only_hint=True,
        destructive_hint=False,
        idempotent_hint=True,
        open_world_hint=False,
    )


def list_resources(served: Iterable[str]) -> list[Resource]:
    """The served plants and the full schemas; reports are reached by the links in replies.

    Args:
        served: names of the plants in the served folder.
    """
    plants = [
        Resource(
            uri=f"plant://{quote(name, safe='')}",
            name=name,
            title=f"Plant: {name}",
            description=f'A plant that calls may name: {{"ref": {json.dumps(name)}}}.',
            mime_type="application/json",
        )
        for name in served
    ]
    schemas = [
        Resource(
            uri=f"schema://{name}",
            name=f"schema-{name}",
            title=f"JSON Schema: {name}",
            description=f"Full JSON Schema of {name}, with an example.",
            mime_type="application/schema+json",
        )
        for name in schema_names()
    ]
    return plants + schemas


def list_templates() -> list[ResourceTemplate]:
    """Where reports and plants are read."""
    return [
        ResourceTemplate(
            uri_template="report://{id}",
            name="report",
            title="Report of a call",
            description="The markdown report of an earlier call, by the id in its reply.",
            mime_type="text/markdown",
        ),
        ResourceTemplate(
            uri_template="plant://{id}",
            name="plant",
            title="Plant",
            description="A plant as stated, by its id in a reply or its name in the served folder.",
            mime_type="application/json",
        ),
    ]
