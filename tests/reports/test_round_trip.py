"""Whatever a document holds, reading what was written gives an equal document."""

import json

from hypothesis import given, settings
from hypothesis import strategies as st

from tangentbook_reports import (
    Align,
    Block,
    Bullets,
    Code,
    DisplayMath,
    Document,
    Emphasis,
    Fence,
    Figure,
    Heading,
    Math,
    Numbered,
    Paragraph,
    Span,
    Strong,
    Table,
    Text,
    read,
    write,
)

MARKUP = "\\`*_{}[]()#+-.!|<>&$~^=:;/@'\"%0123ab \t\r\n\u00a0\u200b\u202e\x00é漢😀"
FRAGMENTS = (
    "**", "__", "``", "```", "~~~", "$$", "||", "\\|", "\\\\", "&lt;", "&#60;", "<b>", "<!--",
    "-->", "[x](y)", "![", "](", "http://", "www.", "- ", "1. ", "2) ", "# ", " #", "> ", "---",
    "===", "| --- |", "    ", "\n\n", "\r\n", "[x]: y", "\u2028", "\ud800", "\ufdd0", "\U000e0041",
)  # fmt: skip
hostile = st.one_of(
    st.lists(st.sampled_from([*MARKUP, *FRAGMENTS]), max_size=8).map("".join),
    st.text(max_size=8),
)
formulas = st.lists(
    st.sampled_from([*"ab019|_^*&<> =+-[]()\n", r"\|", r"\{", r"\\", r"\alpha", "{x}", "~"]),
    max_size=6,
).map(lambda atoms: "a" + "".join(atoms) + "b")
plain_spans: st.SearchStrategy[Span] = st.one_of(
    st.builds(Text, hostile), st.builds(Code, hostile), st.builds(Math, formulas)
)
inner_spans = st.lists(plain_spans, max_size=3).map(tuple)
spans = st.lists(
    st.one_of(plain_spans, st.builds(Strong, inner_spans), st.builds(Emphasis, inner_spans)),
    max_size=5,
).map(tuple)
items = st.lists(spans, max_size=3).map(tuple)
alignments: st.SearchStrategy[Align] = st.sampled_from(["left", "right", "centre"])


@st.composite
def tables(draw: st.DrawFn) -> Table:
    columns = draw(st.integers(1, 3))
    row = st.lists(spans, min_size=columns, max_size=columns).map(tuple)
    align = st.lists(alignments, min_size=columns, max_size=columns)
    return Table(
        header=draw(row),
        rows=tuple(draw(st.lists(row, max_size=3))),
        align=tuple(draw(align)),
    )


blocks: st.SearchStrategy[Block] = st.one_of(
    st.builds(Heading, level=st.integers(1, 6), spans=spans),
    st.builds(Paragraph, spans),
    st.builds(Bullets, items),
    st.builds(Numbered, items),
    tables(),
    st.builds(DisplayMath, formulas),
    st.builds(Fence, language=st.sampled_from(["", "json", "toml", "c-1"]), text=hostile),
    st.builds(Figure, path=st.sampled_from(["a.svg", "leaf-1.rest_run.svg"]), alt=hostile),
)
documents = st.lists(blocks, max_size=4).map(lambda found: Document(tuple(found)))


@settings(max_examples=150, deadline=None)
@given(document=documents)
def test_reading_returns_what_was_written(document: Document) -> None:
    """Any document with any text comes back equal."""
    assert read(write(document)) == document


@settings(max_examples=150, deadline=None)
@given(line=spans)
def test_every_line_comes_back_from_every_place(line: tuple[Span, ...]) -> None:
    """The same spans come back from a paragraph, heading, item and cell, side by side."""
    document = Document(
        (
            Heading(level=2, spans=line),
            Paragraph(line),
            Bullets((line, line)),
            Bullets((line,)),
            Bullets((line,)),
            Numbered((line, line)),
            Numbered((line,)),
            Table(header=(line, line), rows=((line, line),), align=("left", "right")),
        )
    )
    assert read(write(document)) == document


@settings(max_examples=80, deadline=None)
@given(document=documents)
def test_written_text_has_one_form(document: Document) -> None:
    """What is written ends in one line feed, can be encoded, and is written again the same."""
    written = write(document)
    assert written.endswith("\n")
    assert not written.endswith("\n\n")
    assert "\r" not in written
    assert write(read(written.encode().decode())) == written


@settings(max_examples=80, deadline=None)
@given(value=st.recursive(hostile, lambda inner: st.lists(inner, max_size=3), max_leaves=4))
def test_embedded_json_keeps_its_value(value: object) -> None:
    """JSON in a fence parses to the same value, though invisible characters became escapes."""
    text = json.dumps(value, ensure_ascii=False, indent=1)
    written = write(Document((Fence(language="json", text=text),)))
    (fence,) = read(written).blocks
    assert isinstance(fence, Fence)
    assert json.loads(fence.text) == value
