"""A report as data: blocks in order, each checked and brought to one form when it is made.

The model holds exactly what `write` can write and `read` can read back, so
`read(write(document)) == document` for every document. What shows nothing is left out rather
than refused, since it comes from text that somebody left empty: a paragraph without spans, a
list without items. What would be a slip of the program is refused with ValueError.
"""

import re
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Final, Literal, TypeAlias

from tangentbook_reports.characters import many_lines, one_line
from tangentbook_reports.formulas import many_line_formula
from tangentbook_reports.spans import Spans, block_line

Align: TypeAlias = Literal["left", "right", "centre"]

_ALIGNMENTS: Final = ("left", "right", "centre")
_LANGUAGE: Final = re.compile(r"[a-z0-9-]*")
_FILE_NAME: Final = re.compile(r"[A-Za-z0-9][A-Za-z0-9._-]*")


@dataclass(frozen=True, slots=True, kw_only=True)
class Heading:
    """A heading of level 1 (the report's title) to 6."""

    level: int
    spans: Spans

    def __post_init__(self) -> None:
        if not 1 <= self.level <= 6:
            raise ValueError(f"expected a heading level from 1 to 6, found level={self.level!r}")
        object.__setattr__(self, "spans", block_line(self.spans))


@dataclass(frozen=True, slots=True)
class Paragraph:
    """Spans on one line; viewers wrap it."""

    spans: Spans

    def __post_init__(self) -> None:
        object.__setattr__(self, "spans", block_line(self.spans))


@dataclass(frozen=True, slots=True)
class Bullets:
    """A list without order; an item is one line and holds no further list."""

    items: tuple[Spans, ...]

    def __post_init__(self) -> None:
        object.__setattr__(self, "items", _lines(self.items))


@dataclass(frozen=True, slots=True)
class Numbered:
    """A list counted from 1; an item is one line and holds no further list."""

    items: tuple[Spans, ...]

    def __post_init__(self) -> None:
        object.__setattr__(self, "items", _lines(self.items))


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """A table with one header row.

    Attributes:
        header: A cell for each column, at least one; cells may be empty.
        rows: Any number of rows, each as long as the header.
        align: For each column where its cells stand; numbers stand right.
    """

    header: tuple[Spans, ...]
    rows: tuple[tuple[Spans, ...], ...]
    align: tuple[Align, ...]

    def __post_init__(self) -> None:
        object.__setattr__(self, "header", _lines(self.header))
        object.__setattr__(self, "rows", tuple(_lines(row) for row in self.rows))
        object.__setattr__(self, "align", tuple(self.align))
        self._check_shape()

    def _check_shape(self) -> None:
        columns = len(self.header)
        if columns == 0:
            raise ValueError("expected a table of at least one column, found none")
        if len(self.align) != columns:
            raise ValueError(f"expected {columns} alignments, found align={self.align!r}")
        for align in self.align:
            if align not in _ALIGNMENTS:
                raise ValueError(f"expected an alignment of {_ALIGNMENTS}, found {align!r}")
        for number, row in enumerate(self.rows, start=1):
            if len(row) != columns:
                raise ValueError(f"expected {columns} cells in row {number}, found {len(row)}")


@dataclass(frozen=True, slots=True)
class DisplayMath:
    """LaTeX of the program's own making, on lines of its own."""

    tex: str

    def __post_init__(self) -> None:
        object.__setattr__(self, "tex", many_line_formula(self.tex))


@dataclass(frozen=True, slots=True, kw_only=True)
class Fence:
    """Lines shown as they are.

    Attributes:
        language: What the lines are, from a-z, 0-9 and "-"; may be empty.
        text: The lines, joined by a line feed, without one at the end. Invisible characters
            become escapes where the language is `json`, else visible notation.
    """

    language: str
    text: str

    def __post_init__(self) -> None:
        if _LANGUAGE.fullmatch(self.language) is None:
            raise ValueError(f"expected a language of a-z, 0-9, -, found {self.language!r}")
        lines = many_lines(self.text, json=self.language == "json")
        object.__setattr__(self, "text", lines)


@dataclass(frozen=True, slots=True, kw_only=True)
class Figure:
    """A picture in a file beside the report.

    Attributes:
        path: The file's name, without a folder.
        alt: What the picture shows, for those who do not see it.
    """

    path: str
    alt: str

    def __post_init__(self) -> None:
        if _FILE_NAME.fullmatch(self.path) is None:
            raise ValueError(f"expected the plain name of a file, found path={self.path!r}")
        object.__setattr__(self, "alt", one_line(self.alt).strip(" "))


Block: TypeAlias = Heading | Paragraph | Bullets | Numbered | Table | DisplayMath | Fence | Figure


@dataclass(frozen=True, slots=True)
class Document:
    """A whole report; blocks that show nothing are left out."""

    blocks: tuple[Block, ...]

    def __post_init__(self) -> None:
        shown = (block for block in self.blocks if not _shows_nothing(block))
        object.__setattr__(self, "blocks", tuple(shown))


def _lines(items: Iterable[Spans]) -> tuple[Spans, ...]:
    return tuple(block_line(item) for item in items)


def _shows_nothing(block: Block) -> bool:
    match block:
        case Paragraph():
            return not block.spans
        case Bullets() | Numbered():
            return not block.items
        case _:
            return False
