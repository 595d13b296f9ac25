"""The document model refuses slips of the program and keeps everything in one form."""

from collections.abc import Callable
from typing import Any

import pytest

import tangentbook_reports
from tangentbook_reports import (
    Code,
    DisplayMath,
    Document,
    Emphasis,
    Fence,
    Figure,
    Heading,
    Math,
    Section,
    Strong,
    Table,
    Text,
    UnreadableReport,
    find_fence,
    find_fences,
    heading,
    para,
    plain_text,
    sections,
    strong,
    table,
)

SLIPS: dict[str, tuple[Callable[[], object], str]] = {
    "level 0": (lambda: heading(0, "a"), "expected a heading level from 1 to 6, found level=0"),
    "level 7": (lambda: Heading(level=7, spans=()), "found level=7"),
    "language": (lambda: Fence(language="a b", text=""), "found 'a b'"),
    "language mark": (lambda: Fence(language="json\n", text=""), r"found 'json\\n'"),
    "folder": (lambda: Figure(path="a/b.svg", alt=""), "found path='a/b.svg'"),
    "parent": (lambda: Figure(path="..", alt=""), "found path='..'"),
    "no column": (lambda: table([], []), "expected a table of at least one column"),
    "short row": (lambda: table(["a", "b"], [["1"]]), "expected 2 cells in row 1, found 1"),
    "letters": (lambda: table(["a"], [], align="x"), "expected letters l, r, c"),
    "alignments": (lambda: table(["a"], [], align="lr"), "expected 1 alignments"),
    "nested": (lambda: strong(Emphasis((Text("a"),))), "must not hold another emphasis"),
    "no formula": (lambda: Math(" "), "expected a formula, found none"),
    "dollar": (lambda: Math("a$b"), "must not hold '[$]', which would end it"),
    "backtick": (lambda: DisplayMath("`"), "must not hold '`', which begins code"),
    "escaped tag": (lambda: Math(r"\<b"), "must not hold '<', which may begin a tag"),
    "comment": (lambda: Math("a % b"), "must not hold a comment"),
    "backslash": (lambda: Math("a\\"), "must not end in a lone backslash"),
    "open brace": (lambda: Math("{a"), "braces of a formula must pair"),
    "closed brace": (lambda: Math("}{"), "braces of a formula must pair"),
    "hidden": (lambda: Math("a\u202eb"), "must not hold invisible characters"),
}


@pytest.mark.parametrize("case", SLIPS)
def test_slips_are_refused(case: str) -> None:
    """A block that could not be written is refused when it is made."""
    make, message = SLIPS[case]
    with pytest.raises(ValueError, match=message):
        make()


def test_unknown_alignment_is_refused() -> None:
    """An alignment from outside the type's three is refused at run time too."""
    unknown: Any = ("middle",)
    with pytest.raises(ValueError, match="found 'middle'"):
        Table(header=((),), rows=(), align=unknown)


def test_neighbours_of_one_kind_become_one() -> None:
    """Paragraphs that show the same are equal, however they were put together."""
    assert para("a ", "", Text(" b"), Code("")) == para("a b")
    assert para(strong("a"), strong("b")) == para(strong("ab"))
    assert para(Emphasis((Text("a"),)), Strong(()), Emphasis((Text("b"),))).spans == (
        Emphasis((Text("ab"),)),
    )
    assert para(Math("a"), Math("b")) == para(Math("a b"))
    assert para(Code("a"), Code("b")).spans == (Code("a"), Text(" "), Code("b"))
    assert para("  a ", Code(" b  c "), " ").spans == (Text("a "), Code("b c"))


def test_formulas_have_one_form() -> None:
    """Outer and repeated spaces, blank lines and comparison signs are brought to one form."""
    assert Math(" a  <\n b ") == Math(r"a \lt b")
    assert DisplayMath("\n  a\n\n - b\\\\\n>c\\%\n").tex == "a\n-b\\\\\n\\gt c\\%"


def test_fence_text_has_one_form() -> None:
    """Line ends are unified and hidden characters shown, in JSON as escapes."""
    assert Fence(language="", text="a\r\n\tb\r\u202e\n\n").text == "a\n\tb\n⟨U+202E⟩"
    assert Fence(language="json", text='"\u202e\U000e0041\ud800"').text == (
        '"\\u202e\\udb40\\udc41\\ud800"'
    )


def test_plain_text_drops_emphasis() -> None:
    """Headings can be compared as text."""
    assert plain_text(para("a ", strong("b ", Code("c")), Math("d")).spans) == "a b cd"


FIRST, LAST = Fence(language="json", text="1"), Fence(language="json", text="2")
NESTED = Document(
    (
        para("before"),
        heading(1, "Call and ", strong("result")),
        Fence(language="json", text="0"),
        heading(2, "Call and result"),
        heading(3, "Call"),
        FIRST,
        heading(3, "Result"),
        Fence(language="toml", text="x"),
        LAST,
    )
)


def test_sections_hold_what_stands_below_a_heading() -> None:
    """Sections nest: a section holds its deeper headings and their blocks."""
    found = sections(NESTED)
    assert [section.heading for section in found] == [
        "Call and result",
        "Call and result",
        "Call",
        "Result",
    ]
    assert found[2] == Section("Call", (FIRST,))
    assert found[1].blocks == NESTED.blocks[4:]
    assert found[0].blocks == NESTED.blocks[2:]


def test_fences_are_found_by_heading_and_language() -> None:
    """The last section of a heading counts, since a plant's name may read the same."""
    assert find_fences(NESTED, heading="Call and result", language="json") == (FIRST, LAST)
    assert find_fence(NESTED, heading="Call and result", language="json", index=1) == LAST
    assert find_fence(NESTED, language="json").text == "0"
    assert find_fence(NESTED, language="json", index=-1) == LAST
    assert len(find_fences(NESTED)) == 4
    assert find_fences(NESTED, heading="Other") == ()


def test_missing_fence_is_refused_without_a_line() -> None:
    """What is missing has no line; the message says what was looked for."""
    with pytest.raises(
        UnreadableReport, match=r"language='xml', index=0, found 0 fences"
    ) as caught:
        find_fence(NESTED, language="xml")
    assert caught.value.line is None


def test_public_names_are_sorted_and_complete() -> None:
    """What the package offers is one sorted list."""
    exported = tangentbook_reports.__all__
    public = {
        name
        for name, value in vars(tangentbook_reports).items()
        if not name.startswith("_") and type(value).__name__ != "module"
    }
    assert list(exported) == sorted(exported)
    assert set(exported) == public
