"""Running the calls of sheets side by side, and comparing each result with what is expected.

Every call is understood before the first one runs; one that is refused then, or fails later,
never stops the others.
"""

from __future__ import annotations

import asyncio
from collections import Counter
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

from tangentbook.contract.plain import is_object
from tangentbook.errors import TangentbookError
from tangentbook.expectations import Failure, failures_of
from tangentbook.running.calls import Runner
from tangentbook.running.pool import Pool
from tangentbook.running.resolve import Resolved, error_at
from tangentbook.running.store import Store

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator, Sequence
    from pathlib import Path

    from tangentbook.running.calls import Answer
    from tangentbook.sheets import Call


@dataclass(frozen=True, slots=True, kw_only=True)
class Outcome:
    """What came of one call."""

    name: str
    tool: str
    plant: str
    outcome: str
    """holds, failed or refused."""
    answer: str
    failures: tuple[Failure, ...] = ()
    report: dict[str, Any] | None = None
    error: dict[str, str] | None = None

    def as_dict(self) -> dict[str, Any]:
        """One entry of `run --json`."""
        entry: dict[str, Any] = {
            "name": self.name,
            "tool": self.tool,
            "plant": self.plant,
            "outcome": self.outcome,
            "answer": self.answer,
            "failures": [failure.as_dict() for failure in self.failures],
            "report": self.report,
        }
        return entry if self.error is None else {**entry, "error": self.error}

    def line(self) -> str:
        """One line for people, and one more for each failure."""
        first = f"{self.outcome:8}{self.name}: {self.answer}"
        return "\n".join([first, *(f"        {failure}" for failure in self.failures)])


async def run_calls(
    calls: Sequence[Call],
    *,
    reports: Path,
    jobs: int,
    show: Callable[[Outcome], None] | None = None,
) -> list[Outcome]:
    """Run every call, `jobs` at a time.

    Args:
        calls: what `read_sheet` gave, of one sheet or several.
        reports: report folder.
        jobs: worker processes.
        show: told of each outcome, in the order of the calls.
    """
    async with Pool(jobs=jobs) as pool:
        runner = Runner(pool=pool, store=Store(reports))
        understood = [_understood(call, runner) for call in calls]
        slots = asyncio.Semaphore(2 * jobs)  # enough to keep the workers busy
        tasks = [
            asyncio.create_task(_run_one(call, resolved, runner, slots))
            for call, resolved in zip(calls, understood, strict=True)
        ]
        outcomes: list[Outcome] = []
        for task in tasks:
            outcomes.append(await task)
            if show is not None:
                show(outcomes[-1])
    return outcomes


def _understood(call: Call, runner: Runner) -> Resolved | TangentbookError:
    try:
        return runner.resolve(call.tool, call.arguments)
    except TangentbookError as error:
        return error_at(error, call.place)


async def _run_one(
    call: Call, resolved: Resolved | TangentbookError, runner: Runner, slots: asyncio.Semaphore
) -> Outcome:
    if isinstance(resolved, TangentbookError):
        return _refused(call, resolved, plant=_plant_name(call))
    async with slots:
        try:
            answer = await runner.answer_resolved(resolved)
        except TangentbookError as error:
            return _refused(call, error_at(error, call.place), plant=resolved.plant.name)
    return _outcome(call, answer)


def _outcome(call: Call, answer: Answer) -> Outcome:
    failures = [*failures_of(answer.result, call.expect), *_own_failures(answer.result)]
    return Outcome(
        name=call.name,
        tool=call.tool,
        plant=answer.result["plant"]["name"],
        outcome="failed" if failures else "holds",
        answer=answer.result["answer"],
        failures=tuple(failures),
        report=answer.result["report"],
    )


def _own_failures(result: dict[str, Any]) -> Iterator[Failure]:
    """Work that stopped and check values that fail, whatever the sheet expects."""
    if result.get("stopped_by"):
        yield Failure(pointer="/stopped_by", expected=None, found=result["stopped_by"])
    elif result.get("outcome") == "stopped":
        yield Failure(pointer="/outcome", expected="done", found="stopped")
    for number, check in enumerate(result.get("checks") or []):
        if not check["holds"]:
            yield Failure(
                pointer=f"/checks/{number}/value",
                expected=f"{check['code']} at most {check['limit']:g}",
                found=check["value"],
            )


def _refused(call: Call, error: TangentbookError, *, plant: str) -> Outcome:
    """A refused call; one that expects its refusal holds."""
    envelope = error.as_dict()
    asked = {p: v for p, v in call.expect.items() if p == "/error" or p.startswith("/error/")}
    refused = Outcome(
        name=call.name,
        tool=call.tool,
        plant=plant,
        outcome="refused",
        answer=str(error),
        error=envelope,
    )
    if not asked:
        return refused
    failures = tuple(failures_of({"error": envelope}, call.expect))
    return replace(refused, outcome="failed" if failures else "holds", failures=failures)


def _plant_name(call: Call) -> str:
    plant: object = call.arguments.get("plant")
    return str(plant.get("name", plant.get("ref", ""))) if is_object(plant) else ""


def summary(outcomes: Sequence[Outcome]) -> str:
    """The totals in one line."""
    counts = Counter(outcome.outcome for outcome in outcomes)
    parts = [f"{counts[kind]} {kind}" for kind in ("holds", "failed", "refused") if counts[kind]]
    return f"{len(outcomes)} calls: {', '.join(parts)}"
