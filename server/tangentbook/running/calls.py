"""One call from arguments to answer: resolve, compute in a worker, keep the report.

The server, the command line and the call sheets all go through here.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from tangentbook.running.resolve import References, Resolved, resolve

if TYPE_CHECKING:
    from pathlib import Path

    from tangentbook.running.pool import Pool
    from tangentbook.running.store import Store


@dataclass(frozen=True, slots=True, kw_only=True)
class Computed:
    """What a worker answers."""

    result: dict[str, Any]
    markdown: str
    files: dict[str, str]
    short: str
    caveat: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Answer:
    """A result with its report on disk."""

    result: dict[str, Any]
    """As promised by the contract, `report` included."""
    short: str
    path: Path
    size: int
    """Bytes of the report."""

    @property
    def succeeded(self) -> bool:
        """Whether the work was finished and every check value holds."""
        checks: list[dict[str, Any]] = self.result.get("checks") or []
        stopped = self.result.get("outcome") == "stopped" or self.result.get("stopped_by")
        return not stopped and all(check["holds"] for check in checks)


@dataclass(frozen=True, slots=True, kw_only=True)
class Runner:
    """Answers calls with one pool and one store."""

    pool: Pool
    store: Store
    plants: Path | None = None
    references: References = field(init=False)

    def __post_init__(self) -> None:
        references = References(store=self.store, plants=self.plants)
        object.__setattr__(self, "references", references)

    def resolve(self, tool: str, arguments: object) -> Resolved:
        """The call with all it refers to replaced by its content."""
        return resolve(tool, arguments, references=self.references)

    async def answer(self, tool: str, arguments: object) -> Answer:
        """Answer a call as it came.

        Raises:
            TangentbookError: the call is refused or could not be finished; there is no report.
        """
        return await self.answer_resolved(self.resolve(tool, arguments))

    async def answer_resolved(self, call: Resolved) -> Answer:
        """Answer a call that stands alone."""
        computed = await compute(self.pool, call)
        self.store.put_plant(call.plant)
        path = self.store.write_report(call.stem, computed.markdown, computed.files)
        report = {"id": call.report_id, "uri": f"report://{call.report_id}", "path": str(path)}
        return Answer(
            result={**computed.result, "report": report},
            short="\n".join(part for part in (computed.short, computed.caveat) if part),
            path=path,
            size=len(computed.markdown.encode("utf-8")),
        )


async def compute(pool: Pool, call: Resolved) -> Computed:
    """Compute a call and keep nothing (an audit compares with what is kept already)."""
    reply = await pool.run(call.tool, call.arguments, budget_s=call.budget_s)
    return Computed(
        result=reply["result"],
        markdown=reply["markdown"],
        files=reply["files"],
        short=reply["short"],
        caveat=reply["caveat"],
    )
