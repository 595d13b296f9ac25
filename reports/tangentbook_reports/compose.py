"""Short ways to make spans and blocks, for code that writes reports.

Wherever a line is expected, a plain `str` stands for `Text` and so is shown literally.
"""

from collections.abc import Iterable, Sequence
from typing import Final, TypeAlias

from tangentbook_reports.document import (
    Align,
    Bullets,
    Heading,
    Numbered,
    Paragraph,
    Table,
)
from tangentbook_reports.spans import Code, Emphasis, Math, Span, Spans, Strong, Text

Part: TypeAlias = str | Span
Line: TypeAlias = Part | Sequence[Part]

_ALIGN: Final[dict[str, Align]] = {"l": "left", "r": "right", "c": "centre"}


def text(content: str) -> Text:
    """Return prose that is shown literally."""
    return Text(content)


def code(content: str) -> Code:
    """Return a name, unit or equation in fixed pitch."""
    return Code(content)


def strong(*parts: Part) -> Strong:
    """Return the parts in bold."""
    return Strong(line(parts))


def emphasis(*parts: Part) -> Emphasis:
    """Return the parts in italics."""
    return Emphasis(line(parts))


def heading(level: int, *parts: Part) -> Heading:
    """Return a heading of level 1 to 6."""
    return Heading(level=level, spans=line(parts))


def para(*parts: Part) -> Paragraph:
    """Return a paragraph of the parts, joined without spaces between them."""
    return Paragraph(line(parts))


def bullets(*items: Line) -> Bullets:
    """Return a list without order, an item for each argument."""
    return Bullets(tuple(line(item) for item in items))


def numbered(*items: Line) -> Numbered:
    """Return a list counted from 1, an item for each argument."""
    return Numbered(tuple(line(item) for item in items))


def table(header: Sequence[Line], rows: Iterable[Sequence[Line]], *, align: str = "") -> Table:
    """Return a table.

    Args:
        header: A cell for each column.
        rows: The rows, each as long as the header.
        align: A letter for each column, "l", "r" or "c"; left where none are given.

    Raises:
        ValueError: A letter is none of the three, or the lengths differ.
    """
    unknown = set(align) - _ALIGN.keys()
    if unknown:
        raise ValueError(f"expected letters l, r, c, found align={align!r}")
    return Table(
        header=tuple(line(cell) for cell in header),
        rows=tuple(tuple(line(cell) for cell in row) for row in rows),
        align=tuple(_ALIGN[letter] for letter in align or "l" * len(header)),
    )


def line(content: Line) -> Spans:
    """Return spans of a text, of one span, or of a sequence of both."""
    if isinstance(content, str):
        return (Text(content),)
    if isinstance(content, Text | Code | Math | Strong | Emphasis):
        return (content,)
    return tuple(Text(part) if isinstance(part, str) else part for part in content)
