"""The protocol's handlers: list, call, read. One per request of the protocol, no computing."""

from __future__ import annotations

import asyncio
import contextlib
import json
from typing import TYPE_CHECKING, Any
from urllib.parse import unquote

from mcp.server.caching import CacheHint
from mcp.server.lowlevel import Server
from mcp.shared.exceptions import MCPError
from mcp_types import (
    INVALID_PARAMS,
    Annotations,
    CallToolRequestParams,
    CallToolResult,
    ListResourcesResult,
    ListResourceTemplatesResult,
    ListToolsResult,
    PaginatedRequestParams,
    ReadResourceRequestParams,
    ReadResourceResult,
    ResourceLink,
    TextContent,
    TextResourceContents,
)

from tangentbook._version import __version__
from tangentbook.contract.registry import TOOLS
from tangentbook.contract.schemas import schema
from tangentbook.errors import TangentbookError, nearest
from tangentbook.running.limits import PROGRESS_S
from tangentbook.running.resolve import referred_plant, served_plants
from tangentbook.service.listing import INSTRUCTIONS, list_resources, list_templates, list_tools

if TYPE_CHECKING:
    from collections.abc import AsyncGenerator

    from mcp.server.context import ServerRequestContext

    from tangentbook.running.calls import Answer, Runner

_NAMES = [tool.name for tool in TOOLS]
_HOUR_MS = 3_600_000


class Service:
    """The handlers over one runner.

    Args:
        runner: answers the calls.
        show_paths: whether clients share the machine and may be told where a report lies.
    """

    def __init__(self, runner: Runner, *, show_paths: bool) -> None:
        self._runner = runner
        self._show_paths = show_paths
        self._tools = list_tools()

    def server(self) -> Server[Any]:
        """The protocol server with these handlers; its tools never change while it runs."""
        return Server(
            "tangentbook",
            version=__version__,
            title="Tangentbook",
            instructions=INSTRUCTIONS,
            cache_hints={"tools/list": CacheHint(_HOUR_MS, "public")},
            on_list_tools=self.list_tools,
            on_call_tool=self.call_tool,
            on_list_resources=self.list_resources,
            on_list_resource_templates=self.list_templates,
            on_read_resource=self.read_resource,
        )

    async def list_tools(
        self, _context: ServerRequestContext[Any], _params: PaginatedRequestParams | None
    ) -> ListToolsResult:
        """tools/list."""
        return ListToolsResult(tools=self._tools)

    async def list_resources(
        self, _context: ServerRequestContext[Any], _params: PaginatedRequestParams | None
    ) -> ListResourcesResult:
        """resources/list."""
        folder = self._runner.plants
        served = served_plants(folder) if folder is not None else {}
        return ListResourcesResult(resources=list_resources(served))

    async def list_templates(
        self, _context: ServerRequestContext[Any], _params: PaginatedRequestParams | None
    ) -> ListResourceTemplatesResult:
        """resources/templates/list."""
        return ListResourceTemplatesResult(resource_templates=list_templates())

    async def call_tool(
        self, context: ServerRequestContext[Any], params: CallToolRequestParams
    ) -> CallToolResult:
        """tools/call: a refusal is a result that says what to send instead.

        Raises:
            MCPError: there is no such tool; asking for one is a mistake of the protocol.
        """
        if params.name not in _NAMES:
            raise MCPError(
                code=INVALID_PARAMS,
                message=f"Unknown tool: {params.name[:64]}; {nearest(params.name, _NAMES)}",
            )
        try:
            async with _signs_of_life(context):
                answer = await self._runner.answer(params.name, params.arguments or {})
        except TangentbookError as error:
            return _refusal(error)
        return self._reply(answer)

    async def read_resource(
        self, _context: ServerRequestContext[Any], params: ReadResourceRequestParams
    ) -> ReadResourceResult:
        """resources/read: report://ID and schema://NAME.

        Raises:
            MCPError: there is no such resource.
        """
        try:
            text, kind = self._resource(params.uri)
        except TangentbookError:
            raise MCPError(
                code=INVALID_PARAMS, message=f"Unknown resource: {params.uri[:96]}"
            ) from None
        contents = TextResourceContents(uri=params.uri, mime_type=kind, text=text)
        return ReadResourceResult(contents=[contents])

    def _resource(self, uri: str) -> tuple[str, str]:
        """Text and media type; names are looked up, never made part of a path."""
        scheme, _, quoted = uri.partition("://")
        name = unquote(quoted)
        if scheme == "report":
            return self._runner.store.read_report(name), "text/markdown"
        if scheme == "plant":
            plant = referred_plant(name, self._runner.references)
            return json.dumps(plant, ensure_ascii=False, indent=1), "application/json"
        return json.dumps(schema(name if scheme == "schema" else uri)), "application/schema+json"

    def _reply(self, answer: Answer) -> CallToolResult:
        report = dict(answer.result["report"])
        if not self._show_paths:
            del report["path"]
        link = ResourceLink(
            uri=report["uri"],
            name=answer.path.name,
            title="Report",
            description="The whole report: derivation, matrices, checks, the call and the result.",
            mime_type="text/markdown",
            size=answer.size,
            annotations=Annotations(audience=["user"], priority=0.3),
        )
        text = f"{answer.short}\nreport: {report['uri']}"
        return CallToolResult(
            content=[TextContent(text=text), link],
            structured_content={**answer.result, "report": report},
        )


def _refusal(error: TangentbookError) -> CallToolResult:
    envelope = {"error": error.as_dict()}
    text = json.dumps(envelope, ensure_ascii=False)
    return CallToolResult(
        content=[TextContent(text=text)], structured_content=envelope, is_error=True
    )


@contextlib.asynccontextmanager
async def _signs_of_life(context: ServerRequestContext[Any]) -> AsyncGenerator[None]:
    """Report progress while the body runs, so that a waiting client does not give up."""

    async def report() -> None:
        seconds = 0
        while True:
            await asyncio.sleep(PROGRESS_S)
            seconds += 1
            await context.session.report_progress(seconds, message="computing")

    signs = asyncio.create_task(report())
    try:
        yield
    finally:
        signs.cancel()
