"""Text of strangers shows as it is, in whatever viewer, and never becomes markup.

A document with the hostile text is rendered beside the same document with a harmless word, by a
renderer that lets raw HTML pass. The tags must be the same and the text must be the hostile one.
"""

import re
from collections.abc import Callable
from html.parser import HTMLParser

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from markdown_it import MarkdownIt

from tangentbook_reports import (
    Block,
    Code,
    Document,
    Fence,
    Figure,
    bullets,
    emphasis,
    heading,
    numbered,
    para,
    read,
    strong,
    table,
    write,
)

ATTACKS = {
    "tag": "<script>alert(1)</script>",
    "open tag": "<img src=x onerror=alert(1)",
    "comment": "<!-- hidden --> shown",
    "open comment": "<!-- hides the rest",
    "processing": "<?php x ?>",
    "cdata": "<![CDATA[ x ]]>",
    "details": "</td></tr></table><details>",
    "entity": "&amp; literal &lt; &#60; &#x3c; &copy",
    "link": "[click](http://example.org)",
    "script link": "[x](javascript:alert(1))",
    "image": "![x](http://example.org/x.png)",
    "reference": "[x]: http://example.org",
    "reference use": "[x][y] and [x]",
    "footnote": "[^1]: note",
    "task": "[x] done",
    "autolink": "<http://example.org>",
    "mail": "<a@example.org> a@example.org",
    "bare link": "http://example.org https://example.org",
    "bare host": "www.example.org example.org",
    "bar": "a | b | c",
    "escaped bar": "a \\| b",
    "twice escaped bar": "a \\\\| b",
    "bars only": "||||",
    "delimiter row": "| --- | --- |",
    "backtick": "a ` b",
    "backticks": "`` ` ``",
    "fence": "```json",
    "tilde fence": "~~~",
    "strike": "~~gone~~",
    "bold": "**bold** __bold__",
    "italic": "*it* _it_ in*t*ra",
    "lone star": "*",
    "rule": "---",
    "star rule": "* * *",
    "rule of underscores": "___",
    "setext": "===",
    "heading": "# heading",
    "closed heading": "heading ##",
    "hash": "#",
    "dash item": "- item",
    "plus item": "+ item",
    "star item": "* item",
    "lone dash": "-",
    "numbered item": "1. item",
    "numbered bracket": "7) item",
    "number": "1.",
    "quotation": "> quoted",
    "backslash": "\\",
    "backslash letters": "C:\\temp\\new",
    "final backslash": "ends in \\",
    "dollar": "$x$ costs $5",
    "display": "$$x$$",
    "latex": "\\(x\\) \\[y\\] \\begin{a} \\input{/etc/passwd}",
    "markup mix": "*`<_[|]_>`*",
    "decimals": "-9.81 m/s^2 at 20.5 %",
    "definition": ": term",
}
HIDDEN = {
    "line end": ("a\nb", "a b"),
    "paragraph": ("a\n\n# b", "a # b"),
    "setext line": ("a\n===", "a ==="),
    "table line": ("a|b\n-|-\n1|2", "a|b -|- 1|2"),
    "carriage return": ("a\r\nb\rc", "a b c"),
    "tab": ("\tcode", "code"),
    "spaces": ("    code  block  ", "code block"),
    "non-breaking": ("5\u00a0kg", "5 kg"),
    "line separator": ("a\u2028b", "a b"),
    "zero width": ("Mc\u200bx", "Mc⟨U+200B⟩x"),
    "bidi": ("\u202etxt", "⟨U+202E⟩txt"),
    "isolate": ("a\u2066b\u2069", "a⟨U+2066⟩b⟨U+2069⟩"),
    "null": ("a\x00b", "a⟨U+0000⟩b"),
    "escape": ("\x1b[31m", "⟨U+001B⟩[31m"),
    "surrogate": ("a\ud800", "a⟨U+D800⟩"),
    "tag character": ("a\U000e0041", "a⟨U+E0041⟩"),
    "byte order": ("\ufeffa", "⟨U+FEFF⟩a"),
}
PLACES: dict[str, Callable[[str], Block]] = {
    "paragraph": para,
    "within": lambda text: para("before ", text, " after"),
    "touching": lambda text: para(strong("x"), text, emphasis("y"), text, Code("z")),
    "bold": lambda text: para("a", strong(text), "b"),
    "italic": lambda text: para("a", emphasis(text), "b"),
    "code": lambda text: para(Code(text)),
    "heading": lambda text: heading(2, text),
    "bullet": lambda text: bullets(text, "next"),
    "number": lambda text: numbered(text, "next"),
    "header": lambda text: table([text, "h"], [["a", "b"]]),
    "cell": lambda text: table(["h", "i"], [[text, text], ["a", "b"]], align="rc"),
    "code cell": lambda text: table(["h", "i"], [[Code(text), strong(Code(text))]]),
    "picture": lambda text: Figure(path="a.svg", alt=text),
}


class _Shown(HTMLParser):
    """Collects the tags of a page and, apart from them, its text."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.tags: list[str] = []
        self.text = ""

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(f"{tag} {sorted(name for name, _ in attrs)}")
        self.text += dict(attrs).get("alt") or ""

    def handle_endtag(self, tag: str) -> None:
        self.tags.append(f"/{tag}")

    def handle_data(self, data: str) -> None:
        self.text += data

    def handle_comment(self, data: str) -> None:
        self.tags.append(f"comment {data}")


def shown(place: str, text: str) -> _Shown:
    document = Document((PLACES[place](text), para("the next block")))
    page = _Shown()
    page.feed(MarkdownIt("commonmark", {"html": True}).enable("table").render(write(document)))
    page.close()
    return page


@pytest.mark.parametrize("place", PLACES)
@pytest.mark.parametrize("attack", ATTACKS)
def test_attack_shows_as_literal_text(attack: str, place: str) -> None:
    """Each attack leaves the page's structure alone and stands there word for word."""
    harmless, hostile = shown(place, "zzz"), shown(place, ATTACKS[attack])
    assert hostile.tags == harmless.tags
    assert hostile.text == harmless.text.replace("zzz", ATTACKS[attack])


@pytest.mark.parametrize("place", sorted(PLACES.keys() - {"within", "touching", "bold", "italic"}))
@pytest.mark.parametrize("case", HIDDEN)
def test_invisible_characters_become_visible(case: str, place: str) -> None:
    """What the eye cannot see is one space or a visible notation, wherever it stands."""
    given_text, expected = HIDDEN[case]
    harmless, page = shown(place, "zzz"), shown(place, given_text)
    assert page.tags == harmless.tags
    assert page.text == harmless.text.replace("zzz", expected)


@settings(max_examples=200, deadline=None)
@given(
    text=st.text("\\`*_[]()#+-.!|<>&;$~=:/@1ab é", min_size=1).map(str.strip),
    place=st.sampled_from(sorted(PLACES)),
)
def test_any_text_leaves_the_structure_alone(text: str, place: str) -> None:
    """Random markup characters never add or remove a tag and never lose a character."""
    text = " ".join(text.split()) or "a"
    harmless, hostile = shown(place, "zzz"), shown(place, text)
    assert hostile.tags == harmless.tags
    assert hostile.text == harmless.text.replace("zzz", text)


@pytest.mark.parametrize("attack", ["bare link", "bare host", "mail"])
def test_bare_addresses_are_broken_up(attack: str) -> None:
    """Viewers that look for bare addresses find none in the source."""
    source = write(Document((para(ATTACKS[attack]),)))
    assert not re.search(r"[^\\]://|www\.|[^\\]@|[a-z]\.[a-z]", source)


def test_fence_outlasts_fences_inside_it() -> None:
    """A fence is longer than any run of backticks in its text."""
    text = "```\n````json\n<script>\n$$\n# x\n`````"
    document = Document((Fence(language="toml", text=text),))
    assert write(document) == f"``````toml\n{text}\n``````\n"
    assert read(write(document)) == document
