"""LaTeX as a report may hold it, brought to one form.

A formula is the one thing that is written without escapes, so its text has to be harmless by
itself, also in a viewer that knows nothing of formulas: no dollar sign that would end it, no
"<" that could begin a tag, no backtick, no comment. These checks guard against slips of the
program; text that a stranger wrote never belongs into a formula.
"""

import re
from typing import Final

from tangentbook_reports.characters import has_invisible

_ATOM: Final = re.compile(r"\\.|.", re.DOTALL)
_COMPARISONS: Final = {"<": r"\lt ", ">": r"\gt "}
_LEADING_SIGN: Final = re.compile(r"^([-+=]) +", re.MULTILINE)


def one_line_formula(tex: str) -> str:
    """Return LaTeX for use within a line; see `many_line_formula` for what is refused."""
    return _checked(_without_extra_spaces(_with_named_comparisons(tex)))


def many_line_formula(tex: str) -> str:
    """Return LaTeX for a displayed formula, line by line.

    Args:
        tex: LaTeX without the dollar signs around it.

    Returns:
        The lines without outer spaces and without blank lines, which would end the formula. A
        sign that begins a line loses the space after it, since the two would begin a list.

    Raises:
        ValueError: The formula is empty, holds a dollar sign, backtick, comment or invisible
            character, ends in a lone backslash, or its braces do not pair.
    """
    lines = (_without_extra_spaces(line) for line in _with_named_comparisons(tex).split("\n"))
    joined = "\n".join(line for line in lines if line)
    return _checked(_LEADING_SIGN.sub(r"\1", joined))


def _with_named_comparisons(tex: str) -> str:
    return _ATOM.sub(lambda atom: _COMPARISONS.get(atom[0], atom[0]), tex)


def _without_extra_spaces(tex: str) -> str:
    return " ".join(tex.split())


def _checked(tex: str) -> str:
    if not tex:
        raise ValueError("expected a formula, found none")
    for unfit, why in (("$", "would end it"), ("`", "begins code"), ("<", "may begin a tag")):
        if unfit in tex:
            raise ValueError(f"a formula must not hold {unfit!r}, which {why}: tex={tex!r}")
    if has_invisible(tex):
        raise ValueError(f"a formula must not hold invisible characters: tex={tex!r}")
    _check_atoms(tex)
    return tex


def _check_atoms(tex: str) -> None:
    depth = 0
    for atom in _ATOM.findall(tex):
        depth += (atom == "{") - (atom == "}")
        if depth < 0:
            break
        if atom == "%":
            raise ValueError(f"a formula must not hold a comment: tex={tex!r}")
        if atom == "\\":
            raise ValueError(f"a formula must not end in a lone backslash: tex={tex!r}")
    if depth != 0:
        raise ValueError(f"the braces of a formula must pair: tex={tex!r}")
