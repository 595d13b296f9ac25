"""Whole processes from start to end: the command line, and a server up to its first answers."""

from __future__ import annotations

import asyncio
import json
import os
import subprocess
import sys
import tempfile
from pathlib import Path
from time import perf_counter
from typing import TYPE_CHECKING

from mcp import Client, StdioServerParameters
from measure import Comparison, compare
from table import show, shown, times_over

from tangentbook.contract.registry import tool_named

if TYPE_CHECKING:
    from collections.abc import Callable

_PATH = os.pathsep.join(entry for entry in sys.path if entry)
_BARE = "bare interpreter"
_LINEARIZE = tool_named("linearize")


def cold_starts(*, quick: bool) -> None:
    """Median whole-process times and their ratio to an interpreter that does nothing."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        call = folder / "call.json"
        call.write_text(json.dumps(_LINEARIZE.example), encoding="utf-8")
        reports = str(folder / "reports")
        product = ("-m", "tangentbook")
        commands = {
            _BARE: ("-c", "pass"),
            "--help": (*product, "--help"),
            "schema plant": (*product, "schema", "plant"),
            "call linearize": (*product, "call", "linearize", str(call), "--reports", reports),
        }
        failed = {title: text for title, c in commands.items() if (text := _failure(c))}
        jobs: dict[str, Callable[[], object]] = {
            title: _runner(command) for title, command in commands.items() if title not in failed
        }
        found = compare(jobs, rounds=3 if quick else 7)
        rows = [_row(found, title) for title in jobs]
        rows += [[title, f"fails: {text}", ""] for title, text in failed.items()]
        rows += _server_rows(reports, found.median(_BARE), rounds=3 if quick else 7)
    show("Cold start of whole processes", ["process", "median", "over the bare interpreter"], rows)


def _row(found: Comparison, title: str) -> list[str]:
    return [title, shown(found.median(title)), times_over(found.ratio(title, _BARE))]


def _environment() -> dict[str, str]:
    return {**os.environ, "PYTHONPATH": _PATH}


def _runner(command: tuple[str, ...]) -> Callable[[], object]:
    def run() -> None:
        subprocess.run(
            [sys.executable, *command], env=_environment(), check=True, capture_output=True
        )

    return run


def _failure(command: tuple[str, ...]) -> str:
    """The last line of what a command says when it fails; empty where it does not."""
    done = subprocess.run(
        [sys.executable, *command],
        env=_environment(),
        check=False,
        capture_output=True,
        text=True,
    )
    if done.returncode == 0:
        return ""
    lines = (done.stderr or done.stdout).strip().splitlines()
    return lines[-1][:120] if lines else f"exit status {done.returncode}"


def _server_rows(reports: str, bare: float, *, rounds: int) -> list[list[str]]:
    spans = [asyncio.run(_session(reports)) for _ in range(rounds)]
    rows: list[list[str]] = []
    for title in spans[0]:
        times = sorted(span[title] for span in spans)
        middle = times[len(times) // 2]
        rows.append([title, shown(middle), times_over(middle / bare)])
    return rows


async def _session(reports: str) -> dict[str, float]:
    """One server: start to answered list, then a first and a second call."""
    server = StdioServerParameters(
        command=sys.executable,
        args=["-m", "tangentbook", "serve", "--reports", reports],
        env={"PYTHONPATH": _PATH},
    )
    spans: dict[str, float] = {}
    begin = perf_counter()
    async with Client(server) as client:
        await client.list_tools()
        spans["serve: start to answered list of tools"] = perf_counter() - begin
        for which in ("first", "second"):
            begin = perf_counter()
            result = await client.call_tool(_LINEARIZE.name, _LINEARIZE.example)
            title = f"serve: {which} call of linearize" + (" (refused)" * bool(result.is_error))
            spans[title] = perf_counter() - begin
    return spans
