"""The server in a process of its own, spoken to by the SDK's client in both eras over stdio."""

from __future__ import annotations

import asyncio
import json
import os
import signal
import subprocess
import sys
import time
from collections.abc import AsyncGenerator, Awaitable, Callable, Generator, Iterator
from contextlib import asynccontextmanager, contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

import pytest
from anyio.from_thread import BlockingPortal, start_blocking_portal
from mcp import Client, MCPError, StdioServerParameters
from mcp_types import (
    INVALID_PARAMS,
    CallToolResult,
    ResourceLink,
    TextContent,
    TextResourceContents,
)

from support_running.cases import AT_60, has_pids, is_running, odd, pids_in, wait_for
from tangentbook.contract.plant import BRIDGE
from tangentbook.contract.registry import TOOLS

Era = Literal["auto", "legacy"]

PATH = os.pathsep.join(entry for entry in sys.path if entry)


@asynccontextmanager
async def client(era: Era, *arguments: str) -> AsyncGenerator[Client]:
    """A client of `python -m …` in the given era."""
    server = StdioServerParameters(
        command=sys.executable, args=["-m", *arguments], env={"PYTHONPATH": PATH}
    )
    async with Client(server, mode=era) as connected:
        yield connected


@dataclass(frozen=True, slots=True, kw_only=True)
class Talk:
    """A server that several tests speak to, and a folder of its own."""

    portal: BlockingPortal
    connected: Client
    folder: Path

    def __call__(self, body: Callable[[Client], Awaitable[None]]) -> None:
        """Run the body against the server."""
        self.portal.call(body, self.connected)


@contextmanager
def talking(era: Era, folder: Path, *arguments: str) -> Generator[Talk]:
    """Start a server; it runs until the end of the block."""
    with (
        start_blocking_portal() as portal,
        portal.wrap_async_context_manager(client(era, *arguments)) as connected,
    ):
        yield Talk(portal=portal, connected=connected, folder=folder)


@pytest.fixture(scope="module", params=["auto", "legacy"])
def talk(
    request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory
) -> Iterator[Talk]:
    """The product's own server."""
    folder = tmp_path_factory.mktemp("served")
    with talking(request.param, folder, "tangentbook", "serve", "--reports", str(folder)) as begun:
        yield begun


@pytest.fixture(scope="module", params=["auto", "legacy"])
def talk_oddly(
    request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory
) -> Iterator[Talk]:
    """The same with workers that misbehave by the plant's name."""
    folder = tmp_path_factory.mktemp("odd")
    with talking(request.param, folder, "support_running.odd_server", str(folder)) as begun:
        yield begun


def structured(result: CallToolResult) -> dict[str, Any]:
    content: dict[str, Any] = result.structured_content
    return content


def error_of(result: CallToolResult) -> dict[str, Any]:
    """The envelope of a refusal, which is the same as text."""
    assert result.is_error
    (text,) = result.content
    assert isinstance(text, TextContent)
    assert json.loads(text.text) == result.structured_content
    error: dict[str, Any] = structured(result)["error"]
    assert set(error) == {"code", "where", "message", "hint"}
    return error


def test_the_tools_are_those_of_the_registry(talk: Talk) -> None:
    async def body(connected: Client) -> None:
        listed = (await connected.list_tools()).tools
        assert [tool.name for tool in listed] == [tool.name for tool in TOOLS]
        for tool in listed:
            assert tool.description
            assert tool.output_schema
            assert tool.input_schema["examples"]
            assert tool.annotations is not None
            assert tool.annotations.read_only_hint
            assert tool.annotations.destructive_hint is False
            assert tool.annotations.open_world_hint is False
        size = sum(len(t.model_dump_json(by_alias=True, exclude_none=True)) for t in listed)
        assert size / 4 < 5000
        templates = (await connected.list_resource_templates()).resource_templates
        assert [template.uri_template for template in templates] == [
            "report://{id}",
            "plant://{id}",
        ]
        for resource in (await connected.list_resources()).resources:
            (content,) = (await connected.read_resource(resource.uri)).contents
            assert isinstance(content, TextResourceContents)
            assert json.loads(content.text)["type"] == "object"

    talk(body)


def test_a_call_of_each_tool_and_its_report(talk: Talk) -> None:
    async def body(connected: Client) -> None:
        content: dict[str, Any] = {}
        for tool in TOOLS:
            arguments = {"plant": BRIDGE} if tool.name == "check-plant" else AT_60
            result = await connected.call_tool(tool.name, arguments)
            assert not result.is_error
            content = structured(result)
            assert content["tool"] == tool.name
            assert content["outcome"] == "done"
            report = content["report"]
            assert Path(report["path"]).parent == talk.folder
            text, link = result.content
            assert isinstance(text, TextContent)
            assert report["uri"] in text.text
            assert isinstance(link, ResourceLink)
            assert link.uri == report["uri"] == f"report://{report['id']}"
            (page,) = (await connected.read_resource(link.uri)).contents
            assert isinstance(page, TextResourceContents)
            assert page.mime_type == "text/markdown"
            assert page.text == Path(report["path"]).read_text("utf-8")
            assert link.size == len(page.text.encode())
        point = content["points"][0]
        assert point["values"]["M"]["value"] == 9100
        eigenvalues = point["stability"]["eigenvalues"]
        assert [item["re"] for item in eigenvalues] == [0.2525460312, -0.2600460312, -2.5]

    talk(body)


def test_mistakes_of_a_call_are_answers_and_of_the_protocol_errors(talk: Talk) -> None:
    async def body(connected: Client) -> None:
        wrong = error_of(await connected.call_tool("trim", {**AT_60, "pont": {}}))
        assert wrong["code"] == "request.field"
        assert "did you mean point?" in wrong["hint"]
        unknown = {"plant": {"ref": "0123456789abcdef"}}
        lost = error_of(await connected.call_tool("trim", unknown))
        assert "send the plant inline" in lost["hint"]
        path = error_of(await connected.call_tool("trim", {"plant": {"ref": "/etc/passwd"}}))
        assert path["code"] == "request.reference"
        large = {"plant": {**BRIDGE, "about": "x" * 1_100_000}}
        assert error_of(await connected.call_tool("trim", large))["code"] == "limit.text"
        with pytest.raises(MCPError, match="did you mean linearize") as caught:
            await connected.call_tool("linearise", AT_60)
        assert caught.value.error.code == INVALID_PARAMS
        for uri in (
            "report://0123456789abcdef",
            "report://../plants/0123456789abcdef",
            "report://*",
            "report:///etc/passwd",
            "schema://none",
            "plant://0123456789abcdef",
            "plant://..%2Fplants%2F0123456789abcdef",
            "file:///etc/passwd",
        ):
            with pytest.raises(MCPError, match="Unknown resource") as refused:
                await connected.read_resource(uri)
            assert refused.value.error.code == INVALID_PARAMS
        fine = await connected.call_tool("trim", AT_60)
        assert not fine.is_error

    talk(body)


def test_a_plant_is_known_to_a_later_server_in_the_other_era(tmp_path: Path) -> None:
    ids: list[str] = []
    folder = tmp_path / "plants"
    folder.mkdir()
    (folder / "leaf.json").write_text(json.dumps(BRIDGE), "utf-8")

    async def first(connected: Client) -> None:
        checked = await connected.call_tool("check-plant", {"plant": BRIDGE})
        ids.append(structured(checked)["plant"]["id"])

    async def second(connected: Client) -> None:
        plants = [r.uri for r in (await connected.list_resources()).resources][:2]
        assert plants == ["plant://Lift%20bridge%20leaf", "plant://leaf"]
        for uri in (*plants, f"plant://{ids[0]}"):
            (content,) = (await connected.read_resource(uri)).contents
            assert isinstance(content, TextResourceContents)
            assert json.loads(content.text)["name"] == "Lift bridge leaf"
        for plant in ({"ref": ids[0], "set": {"W": 26000}}, {"ref": "leaf", "set": {"W": "26 kN"}}):
            half = await connected.call_tool("trim", {**AT_60, "plant": plant})
            values = structured(half)["points"][0]["values"]
            assert values["M"]["value"] == (4550 if plant["ref"] == "leaf" else 4550000)

    serve = ("tangentbook", "serve", "--reports", str(tmp_path / "reports"))
    with talking("auto", tmp_path, *serve) as begun:
        begun(first)
    with talking("legacy", tmp_path, *serve, "--plants", str(folder)) as begun:
        begun(second)


def test_cancelling_ends_the_work_and_the_server_goes_on(talk_oddly: Talk, tmp_path: Path) -> None:
    async def body(connected: Client) -> None:
        pids = tmp_path / "pids"
        call = asyncio.create_task(connected.call_tool("trim", odd("sleeper", about=str(pids))))
        while not has_pids(pids):
            await asyncio.sleep(0.02)
        begin = time.monotonic()
        await connected.list_tools()
        assert time.monotonic() - begin < 2
        call.cancel()
        await asyncio.wait([call])
        for pid in pids_in(pids):
            while is_running(pid):
                assert time.monotonic() - begin < 10
                await asyncio.sleep(0.02)
        assert not (await connected.call_tool("trim", AT_60)).is_error

    talk_oddly(body)


def test_a_killed_worker_fails_its_call_alone(talk_oddly: Talk, tmp_path: Path) -> None:
    async def body(connected: Client) -> None:
        pids = tmp_path / "pids"
        call = asyncio.create_task(connected.call_tool("trim", odd("sleeper", about=str(pids))))
        while not has_pids(pids):
            await asyncio.sleep(0.02)
        beside = await connected.call_tool("trim", AT_60)
        os.killpg(pids_in(pids)[0], signal.SIGKILL)
        assert error_of(await call)["code"] == "internal.worker-died"
        assert structured(beside)["outcome"] == "done"
        crash = error_of(await connected.call_tool("trim", odd("crasher")))
        assert crash["code"] == "internal.crash"
        assert "Traceback" not in crash["message"]
        within = {**odd("sleeper", about=str(pids)), "budget_s": 0.3}
        assert error_of(await connected.call_tool("trim", within))["code"] == "limit.time"
        memory = error_of(await connected.call_tool("trim", odd("glutton")))
        assert memory["code"] == "limit.memory"
        assert not (await connected.call_tool("trim", AT_60)).is_error

    talk_oddly(body)


def test_progress_is_reported_to_a_client_that_asks(talk_oddly: Talk, tmp_path: Path) -> None:
    seen: list[float] = []

    async def note(progress: float, total: float | None, message: str | None) -> None:
        assert total is None
        assert message
        seen.append(progress)

    async def body(connected: Client) -> None:
        arguments = {**odd("sleeper", about=str(tmp_path / "pids")), "budget_s": 2.6}
        await connected.call_tool("trim", arguments, progress_callback=note)

    talk_oddly(body)
    assert len(seen) >= 2
    assert seen == sorted(set(seen))


def test_nothing_outlives_a_killed_server(tmp_path: Path) -> None:
    call = {
        "jsonrpc": "2.0",
        "id": 2,
        "method": "tools/call",
        "params": {"name": "trim", "arguments": odd("sleeper", about=str(tmp_path / "pids"))},
    }
    hello = {
        "jsonrpc": "2.0",
        "id": 1,
        "method": "initialize",
        "params": {
            "protocolVersion": "2025-06-18",
            "capabilities": {},
            "clientInfo": {"name": "t", "version": "0"},
        },
    }
    ready = {"jsonrpc": "2.0", "method": "notifications/initialized"}
    server = subprocess.Popen(
        [sys.executable, "-m", "support_running.odd_server", str(tmp_path / "reports")],
        env={**os.environ, "PYTHONPATH": PATH},
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
    )
    with server:
        assert server.stdin is not None
        for message in (hello, ready, call):
            server.stdin.write(json.dumps(message).encode() + b"\n")
        server.stdin.flush()
        assert wait_for(lambda: has_pids(tmp_path / "pids"), seconds=20)
        server.kill()
    worker, child = pids_in(tmp_path / "pids")
    assert wait_for(lambda: not is_running(worker))
    if is_running(child):
        os.kill(child, signal.SIGKILL)  # what a worker starts is the pool's to kill


def test_the_server_process_imports_nothing_that_computes() -> None:
    script = (
        "import sys\n"
        "import tangentbook.cli, tangentbook.service.stdio, tangentbook.audit\n"
        "import tangentbook.sheet_runs\n"
        "heavy = {'numpy', 'scipy', 'sympy', 'flint', 'mpmath', 'pint', 'tangentbook.tools'}\n"
        "sys.exit(str(heavy & set(sys.modules)) if heavy & set(sys.modules) else 0)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", script],
        env={**os.environ, "PYTHONPATH": PATH},
        capture_output=True,
        check=False,
    )
    assert done.stderr == b""
    assert done.returncode == 0
