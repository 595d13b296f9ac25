"""The token stream of a report: CommonMark and pipe tables, plus the two kinds of formula.

This is the only module that needs markdown-it-py. Reading imports it when it is called, so that
a process that only writes reports starts without it.

A dollar sign is an error of the report unless it opens a formula or is escaped: viewers disagree
about it. It becomes a token of its own, `stray_dollar`, which no reader accepts.
"""

import re
from dataclasses import dataclass
from typing import Any, Final

from markdown_it import MarkdownIt
from markdown_it.ruler import RuleOptionsType
from markdown_it.rules_block import StateBlock
from markdown_it.rules_inline import StateInline
from markdown_it.token import Token

_FORMULA_LINE: Final = "$$"
_LINE_END: Final = re.compile(r"\r\n?|\n")  # as the parser counts lines
_INTERRUPTS: Final[RuleOptionsType] = {"alt": ["paragraph", "reference", "blockquote", "list"]}


@dataclass(frozen=True, slots=True, kw_only=True)
class Parsed:
    """What the parser found in a report.

    Attributes:
        tokens: Blocks in order; a token with inline content has its pieces as children.
        lines: The source, for what the tokens do not tell.
        reference_line: Line (from 1) of the first link definition, which leaves no token behind.
    """

    tokens: tuple[Token, ...]
    lines: tuple[str, ...]
    reference_line: int | None


def parse(markdown: str) -> Parsed:
    """Return the tokens of a report."""
    parser = MarkdownIt("commonmark").enable("table")
    parser.block.ruler.before("fence", "formula_block", _formula_block, _INTERRUPTS)
    parser.inline.ruler.before("escape", "formula", _formula)
    env: dict[str, Any] = {}
    tokens = parser.parse(markdown, env)
    definitions = [reference["map"][0] + 1 for reference in env.get("references", {}).values()]
    return Parsed(
        tokens=tuple(tokens),
        lines=tuple(_LINE_END.split(markdown)),
        reference_line=min(definitions, default=None),
    )


def _formula(state: StateInline, silent: bool) -> bool:  # noqa: FBT001 (the parser's signature)
    """Take `$…$` as it stands, ahead of escapes and emphasis."""
    start = state.pos
    if state.src[start] != "$":
        return False
    end = state.src.find("$", start + 1, state.posMax)
    found = end > start + 1
    if not silent:
        token = state.push("formula" if found else "stray_dollar", "", 0)
        token.content = state.src[start + 1 : end] if found else ""
    state.pos = end + 1 if found else start + 1
    return True


def _formula_block(state: StateBlock, start: int, end: int, silent: bool) -> bool:  # noqa: FBT001
    """Take the lines between two lines `$$`; an open end is left to be found stray."""
    if _line(state, start) != _FORMULA_LINE:
        return False
    closing = next((n for n in range(start + 1, end) if _line(state, n) == _FORMULA_LINE), None)
    if closing is None:
        return False
    if not silent:
        token = state.push("formula_block", "", 0)
        token.content = state.getLines(start + 1, closing, state.sCount[start], keepLastLF=False)
        token.map = [start, closing + 1]
        state.line = closing + 1
    return True


def _line(state: StateBlock, number: int) -> str:
    return state.src[state.bMarks[number] : state.eMarks[number]].rstrip(" ")
