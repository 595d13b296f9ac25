"""A document as markdown: CommonMark, pipe tables, formulas between dollar signs.

The text depends on the document alone: no clock, no settings, no width of a screen. Blocks are
parted by one blank line, lines end in a line feed. A paragraph is one line, so that nothing in
it can meet the start of a line. Columns of a table line up in the source, because many readers
see reports as plain text; a very long cell juts out instead of widening every row.
"""

import re
from collections.abc import Callable, Sequence
from typing import Final

from tangentbook_reports.document import (
    Align,
    Block,
    Bullets,
    DisplayMath,
    Document,
    Fence,
    Figure,
    Heading,
    Numbered,
    Paragraph,
    Table,
)
from tangentbook_reports.inline import escape, write_line
from tangentbook_reports.spans import Spans

_WIDEST_COLUMN: Final = 60
_BACKTICKS: Final = re.compile(r"`+")
_RULES: Final[dict[Align, Callable[[int], str]]] = {
    "left": lambda width: "-" * width,
    "right": lambda width: "-" * (width - 1) + ":",
    "centre": lambda width: ":" + "-" * (width - 2) + ":",
}
_PADDINGS: Final[dict[Align, Callable[[str, int], str]]] = {
    "left": str.ljust,
    "right": str.rjust,
    "centre": str.center,
}


def write(document: Document) -> str:
    """Return a document as markdown that ends in one line feed.

    Whatever characters its texts hold, they show literally and stay in their place, and `read`
    returns an equal document.
    """
    parts: list[str] = []
    neighbour: Block | None = None
    alternate = False
    for block in document.blocks:
        alternate = _follows_alike(block, neighbour) and not alternate
        parts.append(_write_block(block, alternate=alternate))
        neighbour = block
    return "\n\n".join(parts) + "\n"


def _follows_alike(block: Block, neighbour: Block | None) -> bool:
    """Whether a list would run into the list before it unless its marks differ."""
    return isinstance(block, Bullets | Numbered) and type(block) is type(neighbour)


def _write_block(block: Block, *, alternate: bool) -> str:
    match block:
        case Heading() | Paragraph() | Figure():
            return _write_single_line(block)
        case Bullets():
            return _write_bullets(block, "*" if alternate else "-")
        case Numbered():
            return _write_numbered(block, ")" if alternate else ".")
        case Table():
            return _write_table(block)
        case DisplayMath():
            return f"$$\n{block.tex}\n$$"
        case Fence():
            return _write_fence(block)


def _write_single_line(block: Heading | Paragraph | Figure) -> str:
    match block:
        case Heading():
            return _marked("#" * block.level, block.spans)
        case Paragraph():
            return write_line(block.spans)
        case Figure():
            return f"![{escape(block.alt)}]({block.path})"


def _marked(mark: str, spans: Spans) -> str:
    return f"{mark} {write_line(spans)}".rstrip(" ")


def _write_bullets(block: Bullets, mark: str) -> str:
    return "\n".join(_marked(mark, item) for item in block.items)


def _write_numbered(block: Numbered, mark: str) -> str:
    return "\n".join(
        _marked(f"{number}{mark}", item) for number, item in enumerate(block.items, start=1)
    )


def _write_table(table: Table) -> str:
    cells = [
        [write_line(cell, place="cell") for cell in row] for row in (table.header, *table.rows)
    ]
    widths = [_column_width(column) for column in zip(*cells, strict=True)]
    header, *rows = (_table_row(row, widths, table.align) for row in cells)
    rule = [_RULES[align](width) for align, width in zip(table.align, widths, strict=True)]
    return "\n".join([header, _bars(rule), *rows])


def _column_width(cells: Sequence[str]) -> int:
    return max(3, *(len(cell) for cell in cells if len(cell) <= _WIDEST_COLUMN), 0)


def _table_row(cells: Sequence[str], widths: Sequence[int], aligns: Sequence[Align]) -> str:
    columns = zip(cells, widths, aligns, strict=True)
    return _bars([_PADDINGS[align](cell, width) for cell, width, align in columns])


def _bars(cells: Sequence[str]) -> str:
    return f"| {' | '.join(cells)} |"


def _write_fence(block: Fence) -> str:
    longest = max((len(run) for run in _BACKTICKS.findall(block.text)), default=0)
    marks = "`" * max(3, longest + 1)
    lines = f"{block.text}\n" if block.text else ""
    return f"{marks}{block.language}\n{lines}{marks}"
