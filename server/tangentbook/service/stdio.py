"""Serving over stdin and stdout."""

from __future__ import annotations

import asyncio
import contextlib
import gc
import signal
from typing import TYPE_CHECKING

import anyio
from mcp.server.stdio import stdio_server

from tangentbook.running.calls import Runner
from tangentbook.running.limits import PREWARM_DELAY_S
from tangentbook.running.pool import Pool
from tangentbook.running.store import Store
from tangentbook.service.server import Service

if TYPE_CHECKING:
    from pathlib import Path


def serve(*, reports: Path, plants: Path | None = None) -> None:
    """Serve until stdin ends or a signal comes.

    An interrupt ends the process at once: a thread that waits for stdin would hold up a gentler
    end, and the workers go with their parent.
    """
    signal.signal(signal.SIGINT, signal.SIG_DFL)
    anyio.run(_serve, Store(reports), plants)


async def _serve(store: Store, plants: Path | None) -> None:
    async with Pool() as pool:
        await serve_with(Runner(pool=pool, store=store, plants=plants))


async def serve_with(runner: Runner) -> None:
    """Serve the calls of one runner."""
    server = Service(runner, show_paths=True).server()
    warm = asyncio.create_task(_prewarm(runner.pool))
    gc.collect()
    gc.freeze()  # what was imported stays; collections while serving and at the end skip it
    try:
        async with stdio_server() as (incoming, outgoing):
            await server.run(incoming, outgoing, server.create_initialization_options())
    finally:
        warm.cancel()
        with contextlib.suppress(asyncio.CancelledError):
            await warm


async def _prewarm(pool: Pool) -> None:
    await asyncio.sleep(PREWARM_DELAY_S)
    await pool.prewarm()
