"""Written reports look as people expect who read them as plain text."""

import subprocess
import sys
from pathlib import Path

import pytest

from tangentbook_reports import (
    Block,
    Code,
    DisplayMath,
    Document,
    Fence,
    Figure,
    Math,
    Paragraph,
    Text,
    bullets,
    code,
    emphasis,
    heading,
    numbered,
    para,
    read,
    strong,
    table,
    text,
    write,
)

FIXTURES = Path(__file__).parent / "fixtures"

BRIDGE_LEAF = Document(
    (
        heading(1, "Lift bridge leaf"),
        para("Point ", emphasis("leaf at 60 degrees"), ", held at ", code("theta = 60 deg"), "."),
        heading(2, "Answer"),
        para(strong("Unstable"), ": one eigenvalue lies to the right, of the equations as stated."),
        bullets(
            ["The leaf is held by ", code("Mc"), " at 9100 N m."],
            "Wind | gusts of <unknown> size & shape were not checked.",
        ),
        heading(2, "The point"),
        table(
            ["name", "value", "unit", "known"],
            [
                [code("theta"), "1.0472", "rad", "exact"],
                [code("M"), "9100", "N m", "exact"],
                [code("|theta'|"), "0", "rad/s", strong("proved")],
            ],
            align="lrlc",
        ),
        heading(2, "Derivation"),
        para("With ", Math(r"\theta_0 = \pi/3"), " the slope is"),
        DisplayMath("\\frac{W r \\sin\\theta_0}{J}\n= 0.0656736"),
        numbered("Solve for the highest rate.", "Differentiate."),
        Figure(path="leaf-modes.svg", alt="Eigenvalues [1/s]"),
        heading(2, "Call and result"),
        Fence(language="json", text='{\n "tool": "linearize"\n}\n'),
        Fence(language="json", text='{"outcome": "done"}'),
    )
)


def test_document_and_markdown_of_the_fixture_pair_belong_together() -> None:
    """The reviewed pair of files holds: the blocks, one a line, and their markdown."""
    blocks = (FIXTURES / "bridge_leaf.blocks.txt").read_text(encoding="utf-8").splitlines()
    markdown = (FIXTURES / "bridge_leaf.md").read_text(encoding="utf-8")
    assert [repr(block) for block in BRIDGE_LEAF.blocks] == blocks
    assert write(BRIDGE_LEAF) == markdown
    assert read(markdown) == BRIDGE_LEAF


WRITTEN: dict[str, tuple[Block, str]] = {
    "plain prose stays plain": (
        para("At 9.81 m/s^2 (p. 3), a - b + c > 0; see note: 5 % & up!"),
        "At 9.81 m/s^2 (p. 3), a - b + c > 0; see note: 5 % & up!",
    ),
    "letters beside emphasis": (para("a", strong("b"), "c"), "&#97;**b**&#99;"),
    "punctuation beside emphasis": (para("(", strong("b"), ")."), "(**b**)."),
    "space within emphasis": (para(strong(" b")), "**&#32;b**"),
    "touching emphasis": (para(strong("a"), emphasis("b"), strong("c")), "**a**_b_**c**"),
    "backtick in code": (para(Code("a`b``c`")), "``` a`b``c` ```"),
    "touching code": (para(Code("a"), Code("b")), "`a` `b`"),
    "comparison in a formula": (para(Math("a<b")), r"$a\lt b$"),
    "negative number": (para("-5 is"), "-5 is"),
    "dash before a space": (para("- 5"), "\\- 5"),
    "rule": (para("---"), "\\---"),
    "empty item": (bullets("", "a"), "-\n- a"),
    "empty heading": (heading(3), "###"),
    "empty fence": (Fence(language="", text="\n"), "```\n```"),
}


@pytest.mark.parametrize("case", WRITTEN)
def test_single_blocks(case: str) -> None:
    """Escapes appear where they are needed and nowhere else."""
    block, expected = WRITTEN[case]
    assert write(Document((block,))) == f"{expected}\n"


CELLS = {
    "bar": (text("a|b"), r"a\|b"),
    "bar in code": (Code("a|b"), r"`a\|b`"),
    "escaped bar in code": (Code(r"a\|b"), r"`a\\|b`"),
    "backslash before a bar": (text("a\\|b"), r"a\\\|b"),
    "backtick and bar": (Code("`|"), r"`` `\| ``"),
    "bar in a formula": (Math(r"\|x\| = |y|"), r"$\\|x\\| = \|y\|$"),
    "bar in bold": (strong("a|", Code("|")), r"**a\|`\|`**"),
    "line mark": (text("- 1. #"), r"- 1. \#"),
    "empty": (text(""), ""),
}


@pytest.mark.parametrize("case", CELLS)
def test_cells_escape_bars(case: str) -> None:
    """A bar within a cell is escaped in text, code and formulas, and comes back."""
    cell, expected = CELLS[case]
    document = Document((table([cell, "h"], [[cell, "x"]]),))
    header, _, row = write(document).splitlines()
    assert header.startswith(f"| {expected.ljust(3)} | h ")
    assert row.startswith(f"| {expected.ljust(3)} | x ")
    assert read(write(document)) == document


def test_columns_line_up_and_long_cells_jut_out() -> None:
    """Bars stand below each other, except in a row whose cell is too long to wait for."""
    rows = [["1.5", "x"], ["-20", "w" * 61], ["", "yy"]]
    lines = write(Document((table(["n", "text"], rows, align="rl"),))).splitlines()
    assert lines == [
        "|   n | text |",
        "| --: | ---- |",
        "| 1.5 | x    |",
        f"| -20 | {'w' * 61} |",
        "|     | yy   |",
    ]


def test_neighbouring_lists_stay_apart() -> None:
    """Lists that follow each other change their marks, so that they do not grow together."""
    document = Document((bullets("a"), bullets("b"), bullets("c"), numbered("d"), numbered("e")))
    assert write(document) == "- a\n\n* b\n\n- c\n\n1. d\n\n1) e\n"


def test_blocks_that_show_nothing_are_left_out() -> None:
    """An empty text from a plant leaves no trace and breaks nothing."""
    assert Document((para(""), bullets(), numbered(), Paragraph((Text(" "),)))) == Document(())
    assert write(Document(())) == "\n"


def test_writing_does_not_load_the_parser() -> None:
    """A process that only writes reports starts without markdown-it-py."""
    program = (
        "import sys, tangentbook_reports as r; r.write(r.Document((r.para('x'),)));"
        "sys.exit('markdown_it' in sys.modules)"
    )
    paths = [path for path in sys.path if path]
    done = subprocess.run(
        [sys.executable, "-c", f"import sys; sys.path[:0] = {paths!r}; {program}"], check=False
    )
    assert done.returncode == 0
