"""Reading accepts what a document can hold and says what is in the way of the rest."""

import pickle

import pytest

from tangentbook_reports import (
    Bullets,
    Code,
    DisplayMath,
    Document,
    Emphasis,
    Fence,
    Figure,
    Heading,
    Math,
    Strong,
    Text,
    UnreadableReport,
    bullets,
    heading,
    numbered,
    para,
    read,
    table,
    write,
)

UNREADABLE = {
    "html block": ("a\n\n<div>x</div>\n", 3, "raw HTML has no place in a report"),
    "comment": ("<!-- x -->\n", 1, "raw HTML has no place in a report"),
    "html in line": ("a\n\nb <b>x</b>\n", 3, "raw HTML has no place in a report"),
    "html in cell": ("| a |\n| --- |\n| <b> |\n", 3, "raw HTML has no place in a report"),
    "link": ("see [x](y)\n", 1, "a link has no place in a report"),
    "autolink": ("# <http://x.y>\n", 1, "a link has no place in a report"),
    "link definition": ("a\n\n[x]: y\n", 3, "a link definition has no place in a report"),
    "link in emphasis": ("**[x](y)**\n", 1, "a link has no place in a report"),
    "picture in text": ("see ![x](y.svg)\n", 1, "a picture must stand alone in its paragraph"),
    "picture title": ('![x](y.svg "z")\n', 1, "the title of a picture has no place in a report"),
    "picture markup": ("![`x`](y.svg)\n", 1, "the text for a picture must be plain"),
    "picture elsewhere": (
        "![x](http://a/b.svg)\n",
        1,
        "expected the plain name of a file, found path='http://a/b.svg'",
    ),
    "quotation": ("a\n\n> b\n", 3, "a quotation has no place in a report"),
    "rule": ("a\n\n---\n", 3, "a horizontal rule has no place in a report"),
    "indented code": ("    a\n", 1, "an indented code block has no place in a report"),
    "forced break": ("a  \nb\n", 1, "a forced line break has no place in a report"),
    "nested list": ("- a\n  - b\n", 2, "a list within a list has no place in a report"),
    "nested numbers": ("- a\n\n  1. b\n", 3, "a list within a list has no place in a report"),
    "two paragraphs": ("- a\n\n  b\n", 3, "a list item must be one paragraph"),
    "fence in item": ("- ```\n  x\n  ```\n", 1, "'fence' has no place here"),
    "late start": ("3. a\n", 1, "a list must count from 1, found 3"),
    "nested emphasis": ("***a***\n", 1, "an emphasis within an emphasis has no place in a report"),
    "nested bold": ("_a **b**_\n", 1, "an emphasis within an emphasis has no place in a report"),
    "lone dollar": ("a\n\nit costs $5\n", 3, "a dollar sign opens no formula"),
    "display in line": ("a $$x$$ b\n", 1, "a dollar sign opens no formula"),
    "open display": ("$$\nx\n", 1, "a dollar sign opens no formula"),
    "dollar in picture": ("![$](a.svg)\n", 1, "a dollar sign opens no formula"),
    "empty display": ("$$\n\n$$\n", 1, "expected a formula, found none"),
    "tag in formula": ("$`x`$\n", 1, "a formula must not hold '`', which begins code: tex='`x`'"),
    "open fence": ("a\n\n```json\n{}\n", 3, "a fence is not closed"),
    "open fence, cut": ("```json\n{}", 1, "a fence is not closed"),
    "open fence, blank": ("```json\n{}\n\n\n", 1, "a fence is not closed"),
    "only a fence mark": ("```json", 1, "a fence is not closed"),
    "fence language": ("```C++\n```\n", 1, "expected a language of a-z, 0-9, -, found 'C++'"),
    "short row": ("| a | b |\n|---|---|\n| 1 |\n", 3, "expected 2 cells in the row, found 1"),
    "long row": ("| a |\n|---|\n| 1 |\n| 1 | 2 |\n", 4, "expected 1 cells in the row, found 2"),
    "deep": (">" * 3000 + "a\n", 1, "a quotation has no place in a report"),
    "many marks": (
        "*" * 3000 + "a" + "*" * 3000,
        1,
        "an emphasis within an emphasis has no place in a report",
    ),
}


@pytest.mark.parametrize("case", UNREADABLE)
def test_unreadable_text_is_refused_with_line_and_reason(case: str) -> None:
    """Whatever no document can hold is named, with the line where its block begins."""
    markdown, line, reason = UNREADABLE[case]
    with pytest.raises(UnreadableReport) as caught:
        read(markdown)
    assert (caught.value.line, caught.value.reason) == (line, reason)
    assert str(caught.value) == f"line {line}: {reason}"


def test_refusal_survives_a_process_boundary() -> None:
    """The error keeps its data when it is sent from one process to another."""
    copy = pickle.loads(pickle.dumps(UnreadableReport("no", 3)))  # noqa: S301
    assert (type(copy), copy.reason, copy.line) == (UnreadableReport, "no", 3)


ACCEPTED = {
    "wrapped lines": ("one\ntwo\n", para("one two")),
    "other italics": ("*a* __b__", para(Emphasis((Text("a"),)), " ", Strong((Text("b"),)))),
    "underlined heading": ("a `b`\n===\n", Heading(level=1, spans=(Text("a "), Code("b")))),
    "closed heading": ("## a ##\n", heading(2, "a")),
    "loose list": ("* a\n\n* b\n", bullets("a", "b")),
    "unnumbered": ("1. a\n1. b\n", numbered("a", "b")),
    "bare table": (
        "a|b\n:-|:-:\n1|\\|\n",
        table(["a", "b"], [["1", "|"]], align="lc"),
    ),
    "tilde fence": ("~~~toml\na = 1\n~~~\n", Fence(language="toml", text="a = 1")),
    "carriage returns": ("# a\r\n\r\n$$\r\nx\r\n$$\r\n", heading(1, "a")),
    "no final line end": ("- a", Bullets(((Text("a"),),))),
    "picture": ("![a\\_b](c.svg)", Figure(path="c.svg", alt="a_b")),
    "formula": ("$a_b*c*d$", para(Math("a_b*c*d"))),
    "spaced display": ("$$  \n  x\n$$\n", DisplayMath("x")),
}


@pytest.mark.parametrize("case", ACCEPTED)
def test_freedoms_of_hand_editing_are_accepted(case: str) -> None:
    """What shows the same as a written report reads as the same block."""
    markdown, block = ACCEPTED[case]
    assert read(markdown).blocks[0] == block


def test_nothing_reads_as_an_empty_document() -> None:
    """An empty text and an empty document belong together."""
    assert read("") == read(write(Document(()))) == Document(())
