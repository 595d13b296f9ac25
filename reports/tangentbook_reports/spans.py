"""The pieces a line of a report is made of, and the one form in which they are kept.

Two documents that show the same must be equal, or reading a report back could not be compared
with what was written. Hence every sequence of spans is brought to one form when a block or an
emphasis is made: nothing empty, no two neighbours of one kind that a reader would see as one.

- `Text` and `Code` are one visible line (`characters.one_line`); `Code` has no outer spaces.
- Neighbouring `Text`, `Strong`, `Emphasis` spans are merged, `Math` spans with a space between.
- Neighbouring `Code` spans stay two and get a space between them.
- A block has no space before its first or after its last text.
"""

from collections.abc import Iterable
from dataclasses import dataclass
from typing import TypeAlias

from tangentbook_reports.characters import one_line
from tangentbook_reports.formulas import one_line_formula


@dataclass(frozen=True, slots=True)
class Text:
    """Prose, shown literally whatever characters it holds."""

    text: str

    def __post_init__(self) -> None:
        object.__setattr__(self, "text", one_line(self.text))


@dataclass(frozen=True, slots=True)
class Code:
    """A name, a unit, an equation: shown literally and in a fixed pitch."""

    text: str

    def __post_init__(self) -> None:
        object.__setattr__(self, "text", one_line(self.text).strip(" "))


@dataclass(frozen=True, slots=True)
class Math:
    """LaTeX of the program's own making within a line; never text that a stranger wrote."""

    tex: str

    def __post_init__(self) -> None:
        object.__setattr__(self, "tex", one_line_formula(self.tex))


@dataclass(frozen=True, slots=True)
class Strong:
    """Spans in bold; holds no further emphasis."""

    spans: "tuple[Span, ...]"

    def __post_init__(self) -> None:
        object.__setattr__(self, "spans", _unemphasized(self.spans))


@dataclass(frozen=True, slots=True)
class Emphasis:
    """Spans in italics; holds no further emphasis."""

    spans: "tuple[Span, ...]"

    def __post_init__(self) -> None:
        object.__setattr__(self, "spans", _unemphasized(self.spans))


Span: TypeAlias = Text | Code | Math | Strong | Emphasis
Spans: TypeAlias = tuple[Span, ...]


def joined(spans: Iterable[Span]) -> Spans:
    """Return spans without empty ones and with neighbours of one kind merged."""
    result: list[Span] = []
    for span in spans:
        if _is_empty(span):
            continue
        if result and type(result[-1]) is type(span):
            result.extend(_touching(result.pop(), span))
        else:
            result.append(span)
    return tuple(result)


def block_line(spans: Iterable[Span]) -> Spans:
    """Return spans in the form a block keeps: `joined`, without spaces at the two ends."""
    line = list(joined(spans))
    if line and isinstance(line[0], Text):
        line[0] = Text(line[0].text.lstrip(" "))
    if line and isinstance(line[-1], Text):
        line[-1] = Text(line[-1].text.rstrip(" "))
    return joined(line)


def plain_text(spans: Iterable[Span]) -> str:
    """Return what spans say, without emphasis; a formula as its LaTeX."""
    return "".join(_plain(span) for span in spans)


def _plain(span: Span) -> str:
    match span:
        case Text() | Code():
            return span.text
        case Math():
            return span.tex
        case Strong() | Emphasis():
            return plain_text(span.spans)


def _unemphasized(spans: Iterable[Span]) -> Spans:
    result = joined(spans)
    if any(isinstance(span, Strong | Emphasis) for span in result):
        raise ValueError("an emphasis must not hold another emphasis")
    return result


def _is_empty(span: Span) -> bool:
    match span:
        case Text() | Code():
            return not span.text
        case Strong() | Emphasis():
            return not span.spans
        case Math():
            return False


def _touching(left: Span, right: Span) -> Spans:
    match left, right:
        case Text(), Text():
            return (Text(left.text + right.text),)
        case Math(), Math():
            return (Math(f"{left.tex} {right.tex}"),)
        case Strong(), Strong():
            return (Strong(left.spans + right.spans),)
        case Emphasis(), Emphasis():
            return (Emphasis(left.spans + right.spans),)
        case _:
            return (left, Text(" "), right)
