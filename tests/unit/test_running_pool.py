"""A call has its worker to itself: limits, crashes and cancellation end that call and no other."""

from __future__ import annotations

import asyncio
import contextlib
import os
import signal
import subprocess
import sys
import time
from collections.abc import Awaitable, Callable
from pathlib import Path
from typing import Any, TypeVar

import pytest

from support_running.cases import ODD, has_pids, is_running, odd, pids_in, wait_for
from tangentbook.errors import LimitError, TangentbookError
from tangentbook.running.pool import Pool

T = TypeVar("T")


def in_pool(
    body: Callable[[Pool], Awaitable[T]], *, jobs: int = 2, wall_clock_s: float = 20.0
) -> T:
    async def main() -> T:
        async with Pool(jobs=jobs, wall_clock_s=wall_clock_s, module=ODD) as pool:
            return await body(pool)

    return asyncio.run(main())


async def refused(pool: Pool, name: str, *, about: str = "") -> TangentbookError:
    with pytest.raises(TangentbookError) as caught:
        await pool.run("trim", odd(name, about=about))
    return caught.value


def test_a_worker_is_used_again_and_gone_with_the_pool() -> None:
    async def body(pool: Pool) -> tuple[int, int]:
        first = await pool.run("trim", odd("echo"))
        second = await pool.run("trim", odd("echo"))
        return first["pid"], second["pid"]

    first, second = in_pool(body)
    assert first == second
    assert not is_running(first)


def test_linear_algebra_is_single_threaded() -> None:
    async def body(pool: Pool) -> str:
        return (await pool.run("trim", odd("echo")))["threads"]

    assert in_pool(body) == "1"


def test_a_stray_print_does_not_break_the_protocol() -> None:
    async def body(pool: Pool) -> bool:
        first = await pool.run("trim", odd("printer"))
        second = await pool.run("trim", odd("printer"))
        return first == second

    assert in_pool(body)


def test_a_call_that_takes_too_long_is_killed_with_all_it_started(tmp_path: Path) -> None:
    async def body(pool: Pool) -> dict[str, Any]:
        error = await refused(pool, "sleeper", about=str(tmp_path / "pids"))
        assert isinstance(error, LimitError)
        assert error.code == "limit.time"
        assert "1 s" in error.message
        assert error.hint
        return await pool.run("trim", odd("echo"))

    assert in_pool(body, wall_clock_s=1.0)["pid"] not in pids_in(tmp_path / "pids")
    for pid in pids_in(tmp_path / "pids"):
        assert wait_for(lambda pid=pid: not is_running(pid))


def test_a_smaller_budget_is_kept_and_may_be_raised(tmp_path: Path) -> None:
    async def body(pool: Pool) -> None:
        begin = time.monotonic()
        with pytest.raises(LimitError, match=r"stopped after 0\.5 s") as caught:
            await pool.run("trim", odd("sleeper", about=str(tmp_path / "pids")), budget_s=0.5)
        assert time.monotonic() - begin < 10
        assert "budget_s (at most 20)" in caught.value.hint

    in_pool(body)


@pytest.mark.parametrize(
    ("name", "code"),
    [
        ("glutton", "limit.memory"),
        ("crasher", "internal.crash"),
        ("not a number", "internal.crash"),
        ("killer", "internal.worker-died"),
    ],
)
def test_a_call_that_goes_wrong_fails_alone(name: str, code: str) -> None:
    async def body(pool: Pool) -> tuple[TangentbookError, dict[str, Any]]:
        error = await refused(pool, name)
        return error, await pool.run("trim", odd("echo"))

    error, after = in_pool(body, jobs=1)
    assert error.code == code
    assert error.hint
    assert "Traceback" not in error.message
    assert after["pid"]


def test_a_worker_killed_while_idle_is_replaced_unseen() -> None:
    async def body(pool: Pool) -> tuple[int, int]:
        first = (await pool.run("trim", odd("echo")))["pid"]
        os.kill(first, signal.SIGKILL)
        assert wait_for(lambda: not is_running(first))
        return first, (await pool.run("trim", odd("echo")))["pid"]

    first, second = in_pool(body)
    assert first != second


def test_a_killed_worker_fails_its_call_and_not_the_one_beside_it(tmp_path: Path) -> None:
    async def body(pool: Pool) -> None:
        sleeping = asyncio.create_task(refused(pool, "sleeper", about=str(tmp_path / "pids")))
        while not has_pids(tmp_path / "pids"):
            await asyncio.sleep(0.01)
        beside = await pool.run("trim", odd("echo"))
        worker = pids_in(tmp_path / "pids")[0]
        os.killpg(worker, signal.SIGKILL)
        assert (await sleeping).code == "internal.worker-died"
        assert (await pool.run("trim", odd("echo"))) == beside

    in_pool(body)


def test_cancelling_kills_the_work_at_once(tmp_path: Path) -> None:
    async def body(pool: Pool) -> float:
        call = asyncio.create_task(pool.run("trim", odd("sleeper", about=str(tmp_path / "pids"))))
        while not has_pids(tmp_path / "pids"):
            await asyncio.sleep(0.01)
        call.cancel()
        begin = time.monotonic()
        with contextlib.suppress(asyncio.CancelledError):
            await call
        for pid in pids_in(tmp_path / "pids"):
            assert wait_for(lambda pid=pid: not is_running(pid))
        return time.monotonic() - begin

    assert in_pool(body) < 2


def test_no_worker_outlives_a_killed_parent(tmp_path: Path) -> None:
    script = (
        "import asyncio, sys\n"
        "from support_running.cases import ODD, odd\n"
        "from tangentbook.running.pool import Pool\n"
        "asyncio.run(Pool(module=ODD).run('trim', odd('sleeper', about=sys.argv[1])))\n"
    )
    path = os.pathsep.join(entry for entry in sys.path if entry)
    parent = subprocess.Popen(
        [sys.executable, "-c", script, str(tmp_path / "pids")],
        env={**os.environ, "PYTHONPATH": path},
    )
    try:
        assert wait_for(lambda: has_pids(tmp_path / "pids"), seconds=20)
    finally:
        parent.kill()
        parent.wait()
    worker, child = pids_in(tmp_path / "pids")
    assert wait_for(lambda: not is_running(worker))
    with contextlib.suppress(ProcessLookupError):
        os.kill(child, signal.SIGKILL)  # what a worker starts is the pool's to kill


def test_calls_beyond_the_number_of_workers_wait_their_turn() -> None:
    async def body(pool: Pool) -> set[int]:
        replies = await asyncio.gather(*(pool.run("trim", odd("echo")) for _ in range(6)))
        return {reply["pid"] for reply in replies}

    assert len(in_pool(body, jobs=2)) <= 2
