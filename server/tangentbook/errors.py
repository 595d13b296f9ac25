"""One tree of errors, imported by every package.

    TangentbookError
    ├── RequestError        the arguments of a call cannot be understood
    ├── PlantError          the plant as written cannot be understood
    │   ├── ExpressionError     a text is not an expression (carries text and column)
    │   ├── DeclarationError    names, roles, values and units do not fit together
    │   └── StructureError      the equations cannot be brought to x' = f, y = g
    ├── PointError          the point asked for contradicts the plant's names or itself
    ├── LimitError          a stated limit (size, time, memory) was reached
    └── ReportError         a report, plant or file referred to is missing or unreadable

Each carries a stable `code` (registered in contract/codes.py), `where` it happened, a `message`
that says what was expected and what came, and a `hint`: what to do next.
"""

from __future__ import annotations

from difflib import get_close_matches
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Iterable


class TangentbookError(Exception):
    """Base of everything this package raises on purpose."""

    def __init__(self, code: str, message: str, *, where: str = "", hint: str = "") -> None:
        super().__init__(message)
        self.code = code
        self.message = message
        self.where = where
        self.hint = hint

    def as_dict(self) -> dict[str, str]:
        """The error envelope's content: code, where, message, hint."""
        return {
            "code": self.code,
            "where": self.where,
            "message": self.message,
            "hint": self.hint,
        }

    def __str__(self) -> str:
        place = f"{self.where}: " if self.where else ""
        advice = f" hint: {self.hint}" if self.hint else ""
        return f"{place}{self.message}{advice}"


class RequestError(TangentbookError, ValueError):
    """The arguments of a call cannot be understood: unknown field, wrong type, unknown option."""


class PlantError(TangentbookError, ValueError):
    """The plant as written cannot be understood."""


class ExpressionError(PlantError):
    """A text is not an expression: `where` names the equation and the column."""


class DeclarationError(PlantError):
    """Names, roles, values or units do not fit together."""


class StructureError(PlantError):
    """The equations cannot be brought to x' = f(x, u), y = g(x, u)."""


class PointError(TangentbookError, ValueError):
    """The point asked for names unknown things or contradicts itself."""


class LimitError(TangentbookError):
    """A stated limit was reached; the message says which, the hint how to ask for less."""


class ReportError(TangentbookError, LookupError):
    """A report, plant or file referred to is missing or cannot be read."""


def nearest(name: str, known: Iterable[str]) -> str:
    """A sentence that offers the closest known name, or lists the known; "" if there are none."""
    names = list(known)
    close = get_close_matches(name, names, n=1, cutoff=0.6)
    if not close:
        folded = {candidate.casefold(): candidate for candidate in names}
        close = [folded[name.casefold()]] if name.casefold() in folded else []
    if close:
        return f"did you mean {close[0]}?"
    if not names:
        return ""
    shown = ", ".join(names[:12]) + (", …" if len(names) > 12 else "")
    return f"known names: {shown}"
