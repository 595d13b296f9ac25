"""What a tool produces: parts of the result, sections of the report, side files, a short text."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from tangentbook.contract.codes import CAUTIONS, CHECKS
from tangentbook.tools.numbers import bound

if TYPE_CHECKING:
    from tangentbook_reports import Block

JSON = dict[str, Any]


@dataclass(slots=True, kw_only=True)
class Findings:
    """Check values and cautions as they are collected over the points of a call."""

    checks: list[JSON] = field(default_factory=list)
    cautions: list[JSON] = field(default_factory=list)
    not_checked: list[str] = field(default_factory=list)

    def check(self, code: str, value: float, limit: float, *, point: str, note: str = "") -> None:
        """Record a check value; one beyond its limit is a caution too."""
        what = CHECKS[code] + (f" ({note})" if note else "")
        holds = value <= limit
        self.checks.append(
            {
                "code": code,
                "what": what,
                "value": bound(value),
                "limit": limit,
                "holds": holds,
                "point": point,
            }
        )
        if not holds:
            self.caution(
                "check-failed",
                [point],
                f"{point}: {what}: {value:.2g} is beyond its limit {limit:g}; do not use the "
                "numbers before the cause is known.",
            )

    def missing(self, code: str, why: str, *, point: str) -> None:
        """Record that a check could not be made."""
        self.caution(
            "check-not-made", [point], f"{point}: not confirmed: {CHECKS[code]} ({why})."
        )
        self.not_checked.append(f"{point}: {CHECKS[code]}")

    def caution(self, code: str, about: list[str], text: str) -> None:
        """Record a caution once."""
        if code not in CAUTIONS:
            raise KeyError(code)
        entry = {"code": code, "about": about, "text": text}
        if entry not in self.cautions:
            self.cautions.append(entry)


@dataclass(frozen=True, slots=True, kw_only=True)
class Content:
    """The product of one tool."""

    outcome: str
    answer: str
    question: str
    plant: JSON
    points: list[JSON]
    findings: Findings
    validity: JSON
    sections: list[Block]
    derivation: list[Block]
    files: dict[str, str]
    short: str
