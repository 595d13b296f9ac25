"""Markdown back into a document, strictly.

An audit compares what a report states with what is computed again, so a report must be read
completely or not at all: anything the document model has no place for (a link, raw HTML, a
quotation, an open fence) makes the report unreadable, with its line, instead of being dropped.
Small freedoms of hand editing that show the same are accepted: wrapped lines, `*italics*`,
tables without padding.
"""

import re
from collections.abc import Callable, Generator, Iterator
from contextlib import contextmanager
from itertools import takewhile
from typing import TYPE_CHECKING, Final

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
from tangentbook_reports.errors import UnreadableReport
from tangentbook_reports.spans import Code, Emphasis, Math, Span, Spans, Strong, Text, plain_text

if TYPE_CHECKING:
    from markdown_it.token import Token

    from tangentbook_reports.tokens import Parsed

_REASONS: Final = {
    "blockquote_open": "a quotation has no place in a report",
    "bullet_list_open": "a list within a list has no place in a report",
    "code_block": "an indented code block has no place in a report",
    "em_open": "an emphasis within an emphasis has no place in a report",
    "hardbreak": "a forced line break has no place in a report",
    "hr": "a horizontal rule has no place in a report",
    "html_block": "raw HTML has no place in a report",
    "html_inline": "raw HTML has no place in a report",
    "image": "a picture must stand alone in its paragraph",
    "link_open": "a link has no place in a report",
    "ordered_list_open": "a list within a list has no place in a report",
    "paragraph_open": "a list item must be one paragraph",
    "stray_dollar": "a dollar sign opens no formula",
    "strong_open": "an emphasis within an emphasis has no place in a report",
}
_ALIGNMENTS: Final[dict[str, Align]] = {
    "": "left",
    "text-align:left": "left",
    "text-align:right": "right",
    "text-align:center": "centre",
}
_CELL_BORDER: Final = re.compile(r"(?<!\\)\|")
_LAST_BORDER: Final = re.compile(r"(?<!\\)\|$")


def read(markdown: str) -> Document:
    """Return the document that a report's markdown shows.

    Args:
        markdown: A whole report.

    Raises:
        UnreadableReport: The text holds something that no document can hold.
    """
    # Here and not above, so that writing reports starts without the parser.
    from tangentbook_reports.tokens import parse

    parsed = parse(markdown)
    if parsed.reference_line is not None:
        raise UnreadableReport("a link definition has no place in a report", parsed.reference_line)
    return Document(tuple(_Blocks(parsed)))


class _Blocks:
    """Walks the tokens of a report once, from the first to the last."""

    def __init__(self, parsed: "Parsed") -> None:
        self._tokens = parsed.tokens
        self._lines = parsed.lines
        self._next = 0

    def __iter__(self) -> Iterator[Block]:
        while self._next < len(self._tokens):
            yield self._read_block()

    def _read_block(self) -> Block:
        token = self._tokens[self._next]
        self._next += 1
        reader = _READERS.get(token.type)
        with _located(token):
            if reader is None:
                raise _unplaced(token)
            return reader(self, token)

    def take(self, kind: str) -> "Token":
        """Return the next token, which must be of the kind."""
        token = self._tokens[self._next]
        with _located(token):
            if token.type != kind:
                raise _unplaced(token)
        self._next += 1
        return token

    def skip(self, kind: str) -> bool:
        """Go past the next token if it is of the kind, and say whether it was."""
        found = self._tokens[self._next].type == kind
        self._next += found
        return found

    def line_of(self, token: "Token") -> str:
        """Return the source line on which a token begins."""
        return self._lines[token.map[0]] if token.map else ""


def _read_heading(blocks: _Blocks, token: "Token") -> Heading:
    spans = _read_spans(blocks.take("inline"))
    blocks.take("heading_close")
    return Heading(level=int(token.tag.removeprefix("h")), spans=spans)


def _read_paragraph(blocks: _Blocks, _token: "Token") -> Paragraph | Figure:
    inline = blocks.take("inline")
    blocks.take("paragraph_close")
    match inline.children:
        case [only] if only.type == "image":
            return _read_figure(only)
        case _:
            return Paragraph(_read_spans(inline))


def _read_figure(image: "Token") -> Figure:
    if "title" in image.attrs:
        raise ValueError("the title of a picture has no place in a report")
    alt = _read_spans(image)
    if not all(isinstance(span, Text) for span in alt):
        raise ValueError("the text for a picture must be plain")
    return Figure(path=str(image.attrs["src"]), alt=plain_text(alt))


def _read_bullets(blocks: _Blocks, _token: "Token") -> Bullets:
    return Bullets(_read_items(blocks, "bullet_list_close"))


def _read_numbered(blocks: _Blocks, token: "Token") -> Numbered:
    if "start" in token.attrs:
        raise ValueError(f"a list must count from 1, found {token.attrs['start']}")
    return Numbered(_read_items(blocks, "ordered_list_close"))


def _read_items(blocks: _Blocks, closing: str) -> tuple[Spans, ...]:
    items: list[Spans] = []
    while not blocks.skip(closing):
        blocks.take("list_item_open")
        if blocks.skip("paragraph_open"):
            items.append(_read_spans(blocks.take("inline")))
            blocks.take("paragraph_close")
        else:
            items.append(())
        blocks.take("list_item_close")
    return tuple(items)


def _read_table(blocks: _Blocks, _token: "Token") -> Table:
    blocks.take("thead_open")
    header, align = _read_row(blocks, "th")
    blocks.take("thead_close")
    rows: list[tuple[Spans, ...]] = []
    if blocks.skip("tbody_open"):
        while not blocks.skip("tbody_close"):
            rows.append(_read_row(blocks, "td")[0])
    blocks.take("table_close")
    return Table(header=header, rows=tuple(rows), align=align)


def _read_row(blocks: _Blocks, kind: str) -> tuple[tuple[Spans, ...], tuple[Align, ...]]:
    row = blocks.take("tr_open")
    cells: list[Spans] = []
    align: list[Align] = []
    while not blocks.skip("tr_close"):
        align.append(_ALIGNMENTS[str(blocks.take(f"{kind}_open").attrs.get("style", ""))])
        cells.append(_read_spans(blocks.take("inline")))
        blocks.take(f"{kind}_close")
    with _located(row):
        _check_width(blocks.line_of(row), len(cells))
    return tuple(cells), tuple(align)


def _check_width(line: str, columns: int) -> None:
    """Refuse a row that viewers would fill up or cut off without a word."""
    inner = _LAST_BORDER.sub("", line.strip().removeprefix("|"))
    written = len(_CELL_BORDER.split(inner))
    if written != columns:
        raise ValueError(f"expected {columns} cells in the row, found {written}")


def _read_formula(_blocks: _Blocks, token: "Token") -> DisplayMath:
    return DisplayMath(token.content)


def _read_fence(_blocks: _Blocks, token: "Token") -> Fence:
    first, end = token.map or (0, 0)
    cut_off = bool(token.content) and not token.content.endswith("\n")
    if cut_off or end - first != token.content.count("\n") + 2:
        raise ValueError("a fence is not closed")
    return Fence(language=token.info.strip(), text=token.content)


def _read_spans(parent: "Token") -> Spans:
    children = iter(parent.children or ())
    with _located(parent):
        return tuple(_read_span(child, children) for child in children)


def _read_span(token: "Token", following: Iterator["Token"]) -> Span:
    match token.type:
        case "strong_open":
            return Strong(_read_emphasized(following, "strong_close"))
        case "em_open":
            return Emphasis(_read_emphasized(following, "em_close"))
        case _:
            return _read_plain_span(token)


def _read_emphasized(following: Iterator["Token"], closing: str) -> Spans:
    inner = takewhile(lambda token: token.type != closing, following)
    return tuple(_read_plain_span(token) for token in inner)


def _read_plain_span(token: "Token") -> Span:
    match token.type:
        case "text":
            return Text(token.content)
        case "softbreak":
            return Text(" ")
        case "code_inline":
            return Code(token.content)
        case "formula":
            return Math(token.content)
        case _:
            raise _unplaced(token)


def _unplaced(token: "Token") -> ValueError:
    return ValueError(_REASONS.get(token.type, f"{token.type!r} has no place here"))


@contextmanager
def _located(token: "Token") -> Generator[None]:
    """Give a refusal the line of the token, unless it knows a closer one."""
    try:
        yield
    except ValueError as error:
        known = error.line if isinstance(error, UnreadableReport) else None
        line = known or (token.map[0] + 1 if token.map else None)
        raise UnreadableReport(_reason(error), line) from error


def _reason(error: ValueError) -> str:
    return error.reason if isinstance(error, UnreadableReport) else str(error)


_READERS: Final[dict[str, Callable[[_Blocks, "Token"], Block]]] = {
    "bullet_list_open": _read_bullets,
    "fence": _read_fence,
    "formula_block": _read_formula,
    "heading_open": _read_heading,
    "ordered_list_open": _read_numbered,
    "paragraph_open": _read_paragraph,
    "table_open": _read_table,
}
