"""What the benchmarks print: markdown tables, times in a unit that suits them."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Sequence

_UNITS = ((1.0, "s"), (1e-3, "ms"), (1e-6, "us"))


def shown(seconds: float) -> str:
    """A time with three digits."""
    size, unit = next((u for u in _UNITS if seconds >= u[0]), _UNITS[-1])
    return f"{seconds / size:.3g} {unit}"


def times_over(ratio: float) -> str:
    """A ratio, as "146x"."""
    return f"{ratio:.3g}x"


def show(
    title: str, heads: Sequence[str], rows: Sequence[Sequence[str]], *, note: str = ""
) -> None:
    """Print one table, with what it means below."""
    lines = [f"## {title}", "", _line(heads), _line(["---"] * len(heads)), *map(_line, rows), ""]
    if note:
        lines += [note, ""]
    sys.stdout.write("\n".join(lines) + "\n")
    sys.stdout.flush()


def _line(cells: Sequence[str]) -> str:
    return "| " + " | ".join(cells) + " |"
