r"""Characters that a reader cannot see, made visible.

A report is signed by a person who reads it, so what the eye sees and what the file holds must
be the same. Text direction overrides, zero-width characters and control codes break that: they
let a name read as another name. They are replaced by a visible notation, ⟨U+202E⟩. Inside JSON
they become \uXXXX escapes, which any JSON parser reads back as the same text.

The set is written out rather than asked of the Unicode tables of the running Python, because a
report must come out as the same characters under every Python version. It holds the control
codes, the "default ignorable" code points (Unicode Standard, DerivedCoreProperties), separators
of lines, surrogates and noncharacters. Variation selectors are left out: they choose the shape
of a visible character.
"""

import re
from typing import Final

_INVISIBLE_RANGES: Final = (
    (0x0000, 0x0008),
    (0x000B, 0x001F),
    (0x007F, 0x009F),
    (0x00AD, 0x00AD),
    (0x034F, 0x034F),
    (0x061C, 0x061C),
    (0x115F, 0x1160),
    (0x17B4, 0x17B5),
    (0x180B, 0x180F),
    (0x200B, 0x200F),
    (0x2028, 0x202E),
    (0x2060, 0x206F),
    (0x3164, 0x3164),
    (0xD800, 0xDFFF),
    (0xFDD0, 0xFDEF),
    (0xFEFF, 0xFEFF),
    (0xFFA0, 0xFFA0),
    (0xFFF0, 0xFFFB),
    (0x1BCA0, 0x1BCA3),
    (0x1D173, 0x1D17A),
    (0xE0000, 0xE0FFF),
)
_NONCHARACTERS: Final = tuple(
    (plane + 0xFFFE, plane + 0xFFFF) for plane in range(0, 0x110000, 0x10000)
)
_INVISIBLE: Final = re.compile(
    "["
    + "".join(f"\\U{first:08x}-\\U{last:08x}" for first, last in _INVISIBLE_RANGES + _NONCHARACTERS)
    + "]"
)
_WHITESPACE_RUN: Final = re.compile(r"\s+")
_LINE_END: Final = re.compile(r"\r\n?")


def one_line(text: str) -> str:
    """Bring text of any origin to one visible line.

    Args:
        text: Any characters, lone surrogates included.

    Returns:
        The text with every run of whitespace (line ends, tabs and non-breaking spaces too) as
        one space and every invisible character in visible notation. Idempotent. Spaces at the
        ends stay, since they may stand between two spans.
    """
    return _INVISIBLE.sub(_visible, _WHITESPACE_RUN.sub(" ", text))


def many_lines(text: str, *, json: bool = False) -> str:
    r"""Bring text for a fence to visible lines, otherwise character for character.

    Args:
        text: Any characters.
        json: The text is JSON, so invisible characters can only stand in its strings, where an
            escape means the same.

    Returns:
        The text with line ends as "\n", no line end after the last line, and no invisible
        character. Tabs and spaces are kept. Idempotent.
    """
    lines = _LINE_END.sub("\n", text).rstrip("\n")
    return _INVISIBLE.sub(_json_escape if json else _visible, lines)


def has_invisible(text: str) -> bool:
    """Whether any character of the text would have to be made visible."""
    return _INVISIBLE.search(text) is not None


def _visible(match: re.Match[str]) -> str:
    return f"⟨U+{ord(match[0]):04X}⟩"


def _json_escape(match: re.Match[str]) -> str:
    code = ord(match[0])
    if code <= 0xFFFF:
        return f"\\u{code:04x}"
    high, low = divmod(code - 0x10000, 0x400)
    return f"\\u{0xD800 + high:04x}\\u{0xDC00 + low:04x}"
