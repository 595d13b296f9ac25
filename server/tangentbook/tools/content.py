"""What a tool produces: parts of the result, sections of the report, side files, a short text."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from tangentbook.contract.codes import CAUTIONS, CHECKS
from tangentbook.tools.numbers import bound

if TYPE_CHECKING:
    from tangentbook_reports import Block

JSON = dict[str, Any]

_FLOORS = {"point.second-route": 1e-12, "point.residual": 1e-40}
_FLOOR = 1e-20
"""Smaller disagreements are rounding of the 256-bit routes (or of the double-precision one)."""


@dataclass(slots=True, kw_only=True)
class Findings:
    """Check values and cautions as they are collected over the points of a call."""

    checks: list[JSON] = field(default_factory=list[JSON])
    cautions: list[JSON] = field(default_factory=list[JSON])
    not_checked: list[str] = field(default_factory=list[str])

    def check(self, code: str, value: float, limit: float, *, point: str, note: str = "") -> None:
        """Record a check value; one beyond its limit is a caution too."""
        what = CHECKS[code] + (f" ({note})" if note else "")
        holds = value <= limit
        self.checks.append(
            {
                "code": code,
                "what": what,
                "value": bound(value, _FLOORS.get(code, _FLOOR)),
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

    def confirmed(self, codes: tuple[str, ...], *, point: str) -> bool:
        """Whether all these checks were made at the point, and every one made there holds."""
        made = {c["code"]: c["holds"] for c in self.checks if c["point"] == point}
        return all(made.values()) and set(codes) <= made.keys()

    def missing(self, code: str, why: str, *, point: str) -> None:
        """Record that a check could not be made."""
        self.caution("check-not-made", [point], f"{point}: not confirmed: {CHECKS[code]} ({why}).")
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
    units: dict[str, str | None]
    points: list[JSON]
    findings: Findings
    validity: JSON
    sections: list[Block]
    derivation: list[Block]
    files: dict[str, str]
    short: str
