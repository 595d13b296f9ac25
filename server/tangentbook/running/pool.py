"""A pool of warm worker processes for asynchronous callers (the command line uses `asyncio.run`).

A call has a worker to itself. A call that is cancelled or takes too long has its worker killed
with everything it started; the next call gets another one. A worker that dies fails its own call
only.
"""

from __future__ import annotations

import asyncio
import contextlib
import json
import os
import signal
import sys
from typing import TYPE_CHECKING, Any

from tangentbook.errors import LimitError, TangentbookError
from tangentbook.running.limits import (
    CALLS_PER_WORKER,
    DEFAULT_JOBS,
    REPLY_BYTES,
    START_S,
    STOP_S,
    WALL_CLOCK_S,
    WORKER_MEMORY_BYTES,
)

if TYPE_CHECKING:
    from types import TracebackType

_ONE_THREAD = dict.fromkeys(
    ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS", "VECLIB_MAXIMUM_THREADS"), "1"
)
"""Several workers share the processors; threads inside each would only compete, and the order of
their sums would change the last digits."""


class _Worker:
    """One process and the pipe to it."""

    def __init__(self, process: asyncio.subprocess.Process) -> None:
        assert process.stdin is not None  # noqa: S101 - both are pipes, see `_start`
        assert process.stdout is not None  # noqa: S101
        self.process = process
        self.calls = 0
        self._in = process.stdin
        self._out = process.stdout

    async def responds(self) -> bool:
        """Whether the process can take a call; one that died while idle is found out here."""
        try:
            async with asyncio.timeout(STOP_S):
                await self._exchange({})
        except (TimeoutError, TangentbookError):
            return False
        return True

    async def receive(self) -> dict[str, Any]:
        """The next reply.

        Raises:
            TangentbookError: the process died or its reply is not one line of JSON.
        """
        try:
            line = await self._out.readline()
            if line.endswith(b"\n"):
                return json.loads(line)
        except ValueError:  # a line longer than REPLY_BYTES
            raise LimitError(
                "limit.reply", "the answer is too large to hand over", hint="ask for less"
            ) from None
        raise await self._death()

    async def ask(self, call: dict[str, Any]) -> dict[str, Any]:
        """Send a call and wait for its reply."""
        self.calls += 1
        return await self._exchange(call)

    async def _exchange(self, call: dict[str, Any]) -> dict[str, Any]:
        with contextlib.suppress(ConnectionError):  # the reply, or its lack, tells the same
            self._in.write(json.dumps(call, separators=(",", ":")).encode() + b"\n")
            await self._in.drain()
        return await self.receive()

    async def _death(self) -> TangentbookError:
        with contextlib.suppress(TimeoutError):
            await asyncio.wait_for(self.process.wait(), STOP_S)
        status = self.process.returncode
        how = f"signal {-status}" if status is not None and status < 0 else f"status {status}"
        return TangentbookError(
            "internal.worker-died",
            f"the process that computed this call died ({how})",
            hint="send the call again; if it dies again, ask for less (memory may have run out)",
        )

    def kill(self) -> None:
        """Kill the process and all it started, at once."""
        if self.process.returncode is None:
            with contextlib.suppress(ProcessLookupError, PermissionError):
                os.killpg(self.process.pid, signal.SIGKILL)
        self._in.close()

    async def gone(self) -> None:
        """Wait until a killed process is gone, so that nothing of it outlives the pool."""
        with contextlib.suppress(TimeoutError):
            await asyncio.wait_for(self.process.wait(), STOP_S)


class Pool:
    """At most `jobs` workers at a time; further calls wait their turn."""

    def __init__(
        self,
        *,
        jobs: int = DEFAULT_JOBS,
        wall_clock_s: float = WALL_CLOCK_S,
        memory_bytes: int = WORKER_MEMORY_BYTES,
        module: str = "tangentbook.running.worker",
    ) -> None:
        self.wall_clock_s = wall_clock_s
        self._memory_bytes = memory_bytes
        self._module = module
        self._free = asyncio.Semaphore(jobs)
        self._idle: list[_Worker] = []
        self._all: set[_Worker] = set()

    async def __aenter__(self) -> Pool:
        return self

    async def __aexit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        await self.close()

    async def run(
        self, tool: str, arguments: dict[str, Any], *, budget_s: float | None = None
    ) -> dict[str, Any]:
        """What `perform` answers.

        Args:
            tool: a name of the registry.
            arguments: resolved arguments.
            budget_s: seconds, where less than the pool's limit is wanted.

        Raises:
            TangentbookError: the call was refused, ran out of time or memory, or its worker died.
        """
        limit = min(self.wall_clock_s, budget_s or self.wall_clock_s)
        async with self._free:
            worker = await self._take()
            finished = False
            try:
                async with asyncio.timeout(limit):
                    reply = await worker.ask({"tool": tool, "arguments": arguments})
                finished = not reply.pop("retire", False) and worker.calls < CALLS_PER_WORKER
            except TimeoutError:
                raise self._too_long(limit) from None
            finally:
                if finished:
                    self._idle.append(worker)
                else:
                    self._discard(worker)
        if "error" in reply:
            raise TangentbookError(**reply["error"])
        return reply

    async def prewarm(self) -> None:
        """Have one worker ready before the first call."""
        async with self._free:
            self._idle.append(await self._take())

    async def close(self) -> None:
        """Kill every worker and wait until they are gone."""
        workers = list(self._all)
        for worker in workers:
            self._discard(worker)
        await asyncio.gather(*(worker.gone() for worker in workers))

    async def _take(self) -> _Worker:
        while self._idle:
            worker = self._idle.pop()
            responds = False
            try:
                responds = await worker.responds()
            finally:
                if not responds:
                    self._discard(worker)
            if responds:
                return worker
        return await self._start()

    async def _start(self) -> _Worker:
        process = await asyncio.create_subprocess_exec(
            sys.executable,
            "-P",  # the current folder is no place to import from
            "-u",
            "-m",
            self._module,
            "--memory",
            str(self._memory_bytes),
            stdin=asyncio.subprocess.PIPE,
            stdout=asyncio.subprocess.PIPE,
            limit=REPLY_BYTES,
            env=_environment(),
            start_new_session=True,
        )
        worker = _Worker(process)
        self._all = {other for other in self._all if other.process.returncode is None} | {worker}
        ready = False
        try:
            async with asyncio.timeout(START_S):
                await worker.receive()
            ready = True
        except TimeoutError:
            raise LimitError(
                "limit.time", f"no worker was ready within {START_S:g} s", hint="try again later"
            ) from None
        finally:
            if not ready:
                self._discard(worker)
        return worker

    def _discard(self, worker: _Worker) -> None:
        worker.kill()
        if worker in self._idle:
            self._idle.remove(worker)

    def _too_long(self, limit: float) -> LimitError:
        more = f", or raise budget_s (at most {self.wall_clock_s:g})"
        return LimitError(
            "limit.time",
            f"the call was stopped after {limit:g} s",
            hint="ask for less: fewer points, outputs or further answers"
            + (more if limit < self.wall_clock_s else ""),
        )


def _environment() -> dict[str, str]:
    """The parent's environment, its import path included, with single-threaded linear algebra."""
    path = os.pathsep.join(entry for entry in sys.path if entry)
    return {**os.environ, **_ONE_THREAD, "PYTHONPATH": path}
