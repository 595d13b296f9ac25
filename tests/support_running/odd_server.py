"""A server over stdio whose workers are odd: `python -m support_running.odd_server REPORTS`."""

from __future__ import annotations

import sys
from pathlib import Path

import anyio

from tangentbook.running.calls import Runner
from tangentbook.running.pool import Pool
from tangentbook.running.store import Store
from tangentbook.service.stdio import serve_with


async def _serve() -> None:
    async with Pool(module="support_running.odd_worker") as pool:
        await serve_with(Runner(pool=pool, store=Store(Path(sys.argv[1]))))


if __name__ == "__main__":
    anyio.run(_serve)
