"""Audit: run the call a report carries again, and compare what it says with what comes out.

A report is reproduced if every byte of it and of its side files comes out again. Otherwise the
audit says where it differs, and whether only in digits that differ between machines.
"""

from __future__ import annotations

import asyncio
import os
import re
from collections import Counter
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from tangentbook._version import __version__
from tangentbook.contract.results import SCHEMA
from tangentbook.differences import Difference, of_lines, of_values
from tangentbook.errors import ReportError, TangentbookError
from tangentbook.running.calls import Computed, compute
from tangentbook.running.pool import Pool
from tangentbook.running.resolve import Resolved, resolve
from tangentbook.running.store import embedded, read_whole
from tangentbook_reports import UnreadableReport, read

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

_REPORT_NAME = re.compile(r".*-[0-9a-f]{16}\.md")
_SHOWN = 12
"""Differences shown to people for one report; --json gives all."""

_HOLDING = {"reproduced", "same digits"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Audit:
    """What came of auditing one report."""

    path: Path
    outcome: str
    """reproduced, same digits, differs, unreadable or other version."""
    differences: tuple[Difference, ...] = ()

    @property
    def holds(self) -> bool:
        """Whether the report says what its call answers."""
        return self.outcome in _HOLDING

    def as_dict(self) -> dict[str, Any]:
        """One entry of `audit --json`."""
        return {
            "path": str(self.path),
            "outcome": self.outcome,
            "differences": [difference.as_dict() for difference in self.differences],
        }

    def lines(self) -> str:
        """A line for people, and one for each difference."""
        shown = [f"    {difference}" for difference in self.differences[:_SHOWN]]
        more = len(self.differences) - len(shown)
        return "\n".join(
            [f"{self.outcome:14}{self.path}", *shown, *([f"    and {more} more"] if more else [])]
        )


def find_reports(paths: Sequence[Path]) -> list[Path]:
    """The reports named, and those in the folders named and all below.

    In a folder a markdown file is a report if it is called like one or holds a result.

    Raises:
        ReportError: a path does not exist, or there is no report at all.
    """
    found: dict[Path, None] = {}
    for path in paths:
        if path.is_dir():
            found |= dict.fromkeys(_reports_below(path))
        elif path.exists():
            found[path] = None
        else:
            raise ReportError("file.missing", "no such file or folder", where=str(path))
    if not found:
        raise ReportError(
            "file.missing",
            "no report in the folders named",
            where=", ".join(str(path) for path in paths),
            hint="reports are markdown files that end with their call and result",
        )
    return list(found)


def _reports_below(folder: Path) -> Iterator[Path]:
    for root, folders, names in os.walk(folder):  # does not follow linked folders
        folders.sort()
        for name in sorted(names):
            path = Path(root, name)
            if _REPORT_NAME.fullmatch(name) or (path.suffix == ".md" and _holds_result(path)):
                yield path


def _holds_result(path: Path) -> bool:
    try:
        text = read_whole(path)
    except ReportError:
        return False
    # a report that was cut off begins like one
    return SCHEMA in text or ("## Identity" in text and "Digest of the c" in text[:20_000])


async def audit_reports(paths: Sequence[Path], *, jobs: int) -> list[Audit]:
    """Audit reports, `jobs` at a time; the order is kept."""
    slots = asyncio.Semaphore(2 * jobs)  # reading ahead keeps the workers busy
    async with Pool(jobs=jobs) as pool:

        async def one(path: Path) -> Audit:
            async with slots:
                return await audit_report(path, pool)

        return list(await asyncio.gather(*(one(path) for path in paths)))


async def audit_report(path: Path, pool: Pool) -> Audit:
    """Audit one report with its side files."""
    try:
        text = read_whole(path)
        read(text)
        call, stated = embedded(text)
    except (TangentbookError, UnreadableReport) as error:
        return _without_comparison(path, "unreadable", "report", found=str(error))
    version = call.get("tool_version")
    if version != __version__:
        return _without_comparison(
            path, "other version", "/tool_version", stated=version, found=__version__
        )
    try:
        resolved = resolve(str(call.get("tool")), call["arguments"])
        computed = await compute(pool, resolved)
    except TangentbookError as error:
        return _without_comparison(path, "differs", "call", stated="a result", found=str(error))
    return _compared(path, text, stated, resolved, computed)


def _without_comparison(
    path: Path, outcome: str, where: str, *, found: str, stated: object = None
) -> Audit:
    difference = Difference(where=where, stated=stated, found=found)
    return Audit(path=path, outcome=outcome, differences=(difference,))


def _compared(
    path: Path, text: str, stated: dict[str, Any], resolved: Resolved, computed: Computed
) -> Audit:
    values = tuple(of_values(stated, computed.result))
    soft = bool(values) and all(difference.soft for difference in values)
    sides = tuple(_side_differences(path, resolved.stem, computed.files, soft=soft))
    lines: tuple[Difference, ...] = ()
    if text != computed.markdown:
        # lines of the result repeat the values, and lines with digests follow from side files
        body, fresh = _before_result(text), _before_result(computed.markdown)
        lines = tuple(
            of_lines(body, fresh, where="line", soft=soft, ignore=tuple(_digests(sides, resolved)))
        )
        if not (values or lines or sides):
            lines = tuple(of_lines(text, computed.markdown, where="line", soft=False))
    differences = (*values, *lines, *sides)
    if not differences:
        return Audit(path=path, outcome="reproduced")
    same = all(difference.soft for difference in differences)
    return Audit(path=path, outcome="same digits" if same else "differs", differences=differences)


def _before_result(text: str) -> str:
    """The report up to its last fenced block, whose values are compared one by one."""
    return text[: text.rfind("\n```json\n")]


def _digests(sides: tuple[Difference, ...], resolved: Resolved) -> Iterator[str]:
    """Names of side files that differ: the report gives their digests in the same line."""
    for side in sides:
        yield f"{resolved.stem}.{side.where.split(' ')[0]}"


def _side_differences(
    path: Path, stem: str, files: dict[str, str], *, soft: bool
) -> Iterator[Difference]:
    """Side files beside the report against those that come out now."""
    for what, text in files.items():
        beside = path.with_name(f"{stem}.{what}")
        try:
            stated = read_whole(beside)
        except ReportError:
            yield Difference(where=f"{what} 1", stated="(no such file)", found="(a file)")
            continue
        if stated != text:
            yield from of_lines(stated, text, where=what, soft=soft)
    for extra in sorted(path.parent.glob(f"{stem}.*")):
        what = extra.name.removeprefix(f"{stem}.")
        if what != "md" and what not in files:
            yield Difference(where=f"{what} 1", stated="(a file)", found="(no such file)")


def summary(audits: Sequence[Audit]) -> str:
    """The totals in one line."""
    counts = Counter(audit.outcome for audit in audits)
    return f"{len(audits)} reports: " + ", ".join(f"{n} {kind}" for kind, n in counts.items())
