"""Programs of the grammar: steps of a stack machine, and the functions they may call."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from tangentbook.errors import ExpressionError, nearest

FUNCTIONS: dict[str, tuple[int, int]] = {
    **dict.fromkeys(
        [
            "sin",
            "cos",
            "tan",
            "asin",
            "acos",
            "atan",
            "sinh",
            "cosh",
            "tanh",
            "exp",
            "log",
            "log10",
            "sqrt",
            "abs",
            "sign",
        ],
        (1, 1),
    ),
    "atan2": (2, 2),
    "min": (2, 64),
    "max": (2, 64),
    "clip": (3, 3),
}
"""Functions with their least and greatest number of arguments."""

ALIASES = {"ln": "log", "arcsin": "asin", "arccos": "acos", "arctan": "atan", "arctan2": "atan2"}
RESERVED = frozenset(("pi", "and", "or", "not"))

Op = Literal["number", "unit", "pi", "name", "rate", "neg", "binary", "call", "if", "not"]


@dataclass(frozen=True, slots=True)
class Step:
    """One step of a program: what to do with the stack, and the column it comes from."""

    op: Op
    text: str = ""
    count: int = 0
    at: int = 0


Program = tuple[Step, ...]


@dataclass(frozen=True, slots=True)
class EquationProgram:
    """Both sides of "left = right"."""

    left: Program
    right: Program


def names_in(program: Program) -> list[tuple[str, int]]:
    """The names of a program with their primes, in order of occurrence, with 0-based columns."""
    return [(step.text + "'" * step.count, step.at) for step in program if step.op == "name"]


_OTHER_WORDS = {
    **dict.fromkeys(("der", "ddt", "diff", "dot"), "a rate, written x' or d(x)/dt"),
    **dict.fromkeys(("sat", "saturate", "saturation", "limit"), "clip(x, low, high)"),
    "sgn": "sign",
    "log2": "log(x)/log(2)",
    "pow": "x^y",
}


def unknown_function(name: str, known: list[str], where: str, at: int) -> ExpressionError:
    """The error for a name before a bracket that is no function."""
    close = nearest(name, [*FUNCTIONS, *ALIASES, "if", *known])
    if name in _OTHER_WORDS:
        close = f"did you mean {_OTHER_WORDS[name]}?"
    return ExpressionError(
        "expression.function",
        f"{name} is not a function",
        where=f"{where}, column {at + 1}",
        hint=f"a product is written with *: {name}*(…)"
        + (f"; or {close}" if close.startswith("did you mean") else ""),
    )
