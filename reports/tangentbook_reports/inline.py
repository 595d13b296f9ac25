"""Spans as one line of markdown in which nobody's text can turn into markup.

Everything that CommonMark, GitHub's extensions or a formula plugin could act on is escaped with
a backslash. Three places need more than that:

- Emphasis opens and closes only beside a space or punctuation (CommonMark 0.31, 6.2, "flanking
  delimiter runs"). A letter that touches one is written as a character reference, `&#97;`,
  which counts as punctuation and shows as the same letter.
- A line must not begin like a list, quotation or heading.
- A cell ends at a bar wherever it stands, in code and formulas too, so it is escaped there; the
  table rule takes that backslash away before code is looked at (GFM 0.29, 4.10, example 200).

Bold is written with `**` and italics with `_`, so that the two never run into each other.
"""

import re
from typing import Final, Literal, TypeAlias

from tangentbook_reports.spans import Code, Emphasis, Math, Span, Spans, Strong, Text

Place: TypeAlias = Literal["line", "cell"]
Edge: TypeAlias = Literal["outer edge", "inner edge"]

_MARKUP: Final = re.compile(
    r"[\\`*_\[\]<$~|@]"
    r"|&(?=[#A-Za-z])"  # a character reference
    r"|(?<!\S)#"  # a heading, or the marks that may close one
    r"|:(?=//)"  # a bare address
    r"|(?<=[wW])\.|(?<=\S)\.(?=[A-Za-z\u0080-\U0010ffff])"  # a bare host name
)
_BLOCK_START: Final = re.compile(r"^(?:([0-9]+)(?=[.)](?: |$))|(?=[-+=](?:[-+= ]|$))|(?=[>:]))")
_BACKTICKS: Final = re.compile(r"`+")
_NEUTRAL: Final = frozenset(" !\"#$%&'()*+,-./:;<=>?@[\\]^_`{|}~")


def write_line(spans: Spans, *, place: Place = "line") -> str:
    """Return spans as one line of markdown.

    Args:
        spans: Spans in the form a block keeps.
        place: "line" where the spans begin a line of their own (after a list or heading mark
            too), "cell" within a table.
    """
    written = _write_spans(spans, in_cell=place == "cell", inside=False)
    if place == "line" and spans and isinstance(spans[0], Text):
        return _BLOCK_START.sub(r"\1\\", written)
    return written


def escape(text: str) -> str:
    """Return text of one line with everything escaped that could act as markup within it."""
    return _MARKUP.sub(r"\\\g<0>", text)


def _write_spans(spans: Spans, *, in_cell: bool, inside: bool) -> str:
    edge: Edge = "inner edge" if inside else "outer edge"
    around: list[Span | Edge] = [edge, *spans, edge]
    return "".join(
        _write_text(span.text, before=around[index], after=around[index + 2])
        if isinstance(span, Text)
        else _write_marked(span, in_cell=in_cell)
        for index, span in enumerate(spans)
    )


def _write_marked(span: Code | Math | Strong | Emphasis, *, in_cell: bool) -> str:
    match span:
        case Code():
            return _shield_bars(_write_code(span.text), in_cell=in_cell)
        case Math():
            return _shield_bars(f"${span.tex}$", in_cell=in_cell)
        case Strong():
            return f"**{_write_spans(span.spans, in_cell=in_cell, inside=True)}**"
        case Emphasis():
            return f"_{_write_spans(span.spans, in_cell=in_cell, inside=True)}_"


def _write_text(text: str, *, before: Span | Edge, after: Span | Edge) -> str:
    head = tail = ""
    if _needs_reference(text[0], before):
        head, text = _reference(text[0]), text[1:]
    if text and _needs_reference(text[-1], after):
        tail, text = _reference(text[-1]), text[:-1]
    return head + escape(text) + tail


def _needs_reference(character: str, neighbour: Span | Edge) -> bool:
    """Whether a character would stop the delimiter beside it from opening or closing."""
    match neighbour:
        case "inner edge":
            return character == " "
        case Strong() | Emphasis() | Math():
            return character not in _NEUTRAL
        case _:
            return False


def _reference(character: str) -> str:
    return f"&#{ord(character)};"


def _write_code(text: str) -> str:
    runs = {len(run) for run in _BACKTICKS.findall(text)}
    marks = "`" * next(length for length in range(1, len(runs) + 2) if length not in runs)
    pad = " " if text.startswith("`") or text.endswith("`") else ""
    return f"{marks}{pad}{text}{pad}{marks}"


def _shield_bars(written: str, *, in_cell: bool) -> str:
    return written.replace("|", r"\|") if in_cell else written
