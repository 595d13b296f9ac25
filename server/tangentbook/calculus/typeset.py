"""Nodes as text: plain (the plant's own language) and LaTeX for the report.

Built bottom-up without recursion. Each piece carries how tightly it binds, so that brackets stand
only where they are needed; sums are collected term by term. `known` gives nodes a name of their
own, so that long expressions are shown through named intermediates.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from flint import fmpq

    from tangentbook.calculus.graph import Graph, Node

# binding strengths
_OR, _AND, _NOT, _COMPARE, _SUM, _PRODUCT, _SIGN, _POWER, _ATOM = range(9)

MAX_CHARACTERS = 20_000
"""A longer expression is cut off with an ellipsis: nobody reads it, and it must not grow."""


@dataclass(frozen=True, slots=True)
class _Piece:
    text: str
    binding: int


class _Style:
    """How operations are spelled; plain text here, LaTeX in the subclass."""

    times = "*"

    def name(self, name: str) -> str:
        return name

    def number(self, value: fmpq) -> _Piece:
        text = decimal_text(value)
        if text is not None:
            return _Piece(text, _SIGN if value < 0 else _ATOM)
        return _Piece(f"{value.p}/{value.q}", _PRODUCT)

    def pi(self) -> str:
        return "pi"

    def bracket(self, text: str) -> str:
        return f"({text})"

    def quotient(self, a: _Piece, b: _Piece) -> _Piece:
        return _Piece(f"{self.at(a, _PRODUCT)}/{self.at(b, _SIGN)}", _PRODUCT)

    def power(self, a: _Piece, exponent: str) -> _Piece:
        return _Piece(f"{self.at(a, _ATOM)}^{exponent}", _POWER)

    def call(self, op: str, args: Sequence[str]) -> _Piece:
        return _Piece(f"{op}({', '.join(args)})", _ATOM)

    def compare(self, op: str) -> str:
        return {"lt": "<", "le": "<=", "eq": "==", "ne": "!="}[op]

    def choice(self, condition: str, a: str, b: str) -> _Piece:
        return _Piece(f"if({condition}, {a}, {b})", _ATOM)

    def at(self, piece: _Piece, binding: int) -> str:
        """The text, bracketed where it binds less tightly than asked for."""
        return piece.text if piece.binding >= binding else self.bracket(piece.text)

    def exponent(self, piece: _Piece) -> str:
        return self.at(piece, _ATOM)


class _LatexStyle(_Style):
    times = r" \cdot "

    def name(self, name: str) -> str:
        return latex_name(name)

    def number(self, value: fmpq) -> _Piece:
        text = decimal_text(value)
        if text is None:
            sign = "-" if value < 0 else ""
            return _Piece(rf"{sign}\tfrac{{{abs(int(value.p))}}}{{{value.q}}}", _SIGN)
        if "e" in text:
            mantissa, _, power = text.partition("e")
            head = "" if mantissa == "1" else mantissa + r" \cdot "
            return _Piece(rf"{head}10^{{{int(power)}}}", _PRODUCT)
        return _Piece(text, _SIGN if value < 0 else _ATOM)

    def pi(self) -> str:
        return r"\pi"

    def bracket(self, text: str) -> str:
        return rf"\left({text}\right)"

    def quotient(self, a: _Piece, b: _Piece) -> _Piece:
        return _Piece(rf"\frac{{{a.text}}}{{{b.text}}}", _PRODUCT)

    def power(self, a: _Piece, exponent: str) -> _Piece:
        return _Piece(f"{{{self.at(a, _ATOM)}}}^{{{exponent}}}", _POWER)

    def exponent(self, piece: _Piece) -> str:
        return piece.text

    def call(self, op: str, args: Sequence[str]) -> _Piece:
        if op == "abs":
            return _Piece(rf"\left|{args[0]}\right|", _ATOM)
        if op == "sqrt":
            return _Piece(rf"\sqrt{{{args[0]}}}", _ATOM)
        command = _COMMANDS.get(op, rf"\operatorname{{{op}}}")
        return _Piece(rf"{command}\left({', '.join(args)}\right)", _ATOM)

    def compare(self, op: str) -> str:
        return {"lt": r" \lt ", "le": r" \le ", "eq": " = ", "ne": r" \ne "}[op]

    def choice(self, condition: str, a: str, b: str) -> _Piece:
        cases = rf"{a} & \text{{if }} {condition} \cr {b} & \text{{otherwise}}"
        return _Piece(rf"\begin{{cases}} {cases} \end{{cases}}", _ATOM)


_COMMANDS = {
    "sin": r"\sin",
    "cos": r"\cos",
    "tan": r"\tan",
    "asin": r"\arcsin",
    "acos": r"\arccos",
    "atan": r"\arctan",
    "sinh": r"\sinh",
    "cosh": r"\cosh",
    "tanh": r"\tanh",
    "exp": r"\exp",
    "log": r"\ln",
    "log10": r"\log_{10}",
    "min": r"\min",
    "max": r"\max",
}


def plain_text(graph: Graph, node: Node) -> str:
    """An expression in the plant's own language."""
    return _render(graph, node, _Style(), {})


def latex(graph: Graph, node: Node, known: Mapping[Node, str] | None = None) -> str:
    """An expression in LaTeX; nodes in `known` stand as the given LaTeX name."""
    return _render(graph, node, _LatexStyle(), known or {})


def _render(graph: Graph, root: Node, style: _Style, known: Mapping[Node, str]) -> str:
    pieces: dict[Node, _Piece] = {}
    for node in _needed(graph, root, known):
        if node in known and node != root:
            pieces[node] = _Piece(known[node], _ATOM)
        else:
            piece = _piece(graph, node, pieces, style)
            if len(piece.text) > MAX_CHARACTERS:
                return "…" if isinstance(style, _LatexStyle) is False else r"\dots"
            pieces[node] = piece
    return pieces[root].text


def _needed(graph: Graph, root: Node, known: Mapping[Node, str]) -> list[Node]:
    seen: set[Node] = set()
    stack = [root]
    while stack:
        node = stack.pop()
        if node in seen:
            continue
        seen.add(node)
        if node not in known or node == root:
            stack.extend(graph.children(node))
    return sorted(seen)


def _piece(graph: Graph, node: Node, pieces: Mapping[Node, _Piece], style: _Style) -> _Piece:
    op = graph.op[node]
    value = graph.value_of(node)
    if value is not None:
        return style.number(value)
    if op == "pi":
        return _Piece(style.pi(), _ATOM)
    if op == "var":
        return _Piece(style.name(str(graph.args[node][0])), _ATOM)
    args = [pieces[child] for child in graph.children(node)]
    if op == "ipow":
        return _integer_power(graph.exponent(node), args[0], style)
    if op in ("add", "sub", "mul", "div", "neg"):
        return _arithmetic(op, args, style)
    return _other(op, args, style)


def _integer_power(n: int, a: _Piece, style: _Style) -> _Piece:
    if n < 0:
        below = a if n == -1 else style.power(a, str(-n))
        return style.quotient(_Piece("1", _ATOM), below)
    return style.power(a, str(n))


def _arithmetic(op: str, args: Sequence[_Piece], style: _Style) -> _Piece:
    if op == "neg":
        return _Piece(f"-{style.at(args[0], _PRODUCT)}", _SIGN)
    a, b = args
    if op == "add":
        if b.text.startswith("-") and b.binding != _ATOM:
            return _Piece(f"{style.at(a, _SUM)} - {b.text[1:]}", _SUM)
        return _Piece(f"{style.at(a, _SUM)} + {style.at(b, _SUM)}", _SUM)
    if op == "sub":
        right = style.at(b, _PRODUCT) if b.binding != _SIGN else style.bracket(b.text)
        return _Piece(f"{style.at(a, _SUM)} - {right}", _SUM)
    if op == "div":
        return style.quotient(a, b)
    left = style.at(a, _PRODUCT)
    right = b.text if b.binding >= _PRODUCT and b.binding != _SIGN else style.bracket(b.text)
    return _Piece(f"{left}{style.times}{right}", _PRODUCT)


def _other(op: str, args: Sequence[_Piece], style: _Style) -> _Piece:
    if op == "pow":
        return style.power(args[0], style.exponent(args[1]))
    if op in ("lt", "le", "eq", "ne"):
        return _Piece(
            f"{style.at(args[0], _SUM)}{style.compare(op)}{style.at(args[1], _SUM)}", _COMPARE
        )
    if op in ("and", "or"):
        binding = _AND if op == "and" else _OR
        word = rf" \;\text{{{op}}}\; " if isinstance(style, _LatexStyle) else f" {op} "
        return _Piece(word.join(style.at(a, binding) for a in args), binding)
    if op == "not":
        word = r"\text{not}\;" if isinstance(style, _LatexStyle) else "not "
        return _Piece(word + style.at(args[0], _COMPARE), _NOT)
    if op == "if":
        return style.choice(args[0].text, args[1].text, args[2].text)
    return style.call(op, [a.text for a in args])


def decimal_text(value: fmpq) -> str | None:
    """A rational as a terminating decimal of at most 17 digits, else None."""
    p, q = int(value.p), int(value.q)
    rest, places = q, 0
    for prime in (2, 5):
        count = 0
        while rest % prime == 0:
            rest //= prime
            count += 1
        places = max(places, count)
    if rest != 1 or places > 330:
        return None
    digits = str(abs(p * 10**places // q)).rjust(places + 1, "0")
    stripped = digits.strip("0")
    if len(stripped) > 17:
        return None
    sign = "-" if p < 0 else ""
    exponent = len(digits) - places
    if p and not -4 < exponent - len(digits) + len(digits.lstrip("0")) <= 7:
        lead = len(digits) - len(digits.lstrip("0"))
        power = exponent - lead - 1
        mantissa = stripped[0] + ("." + stripped[1:] if len(stripped) > 1 else "")
        return f"{sign}{mantissa}e{power}"
    whole, fraction = digits[:exponent], digits[exponent:].rstrip("0")
    return f"{sign}{whole}.{fraction}" if fraction else f"{sign}{whole}"


_GREEK = frozenset(
    [
        "alpha",
        "beta",
        "gamma",
        "delta",
        "epsilon",
        "zeta",
        "eta",
        "theta",
        "iota",
        "kappa",
        "lambda",
        "mu",
        "nu",
        "xi",
        "pi",
        "rho",
        "sigma",
        "tau",
        "upsilon",
        "phi",
        "chi",
        "psi",
        "omega",
        "Gamma",
        "Delta",
        "Theta",
        "Lambda",
        "Xi",
        "Pi",
        "Sigma",
        "Upsilon",
        "Phi",
        "Psi",
        "Omega",
    ]
)
_DOTS = ("", r"\dot", r"\ddot", r"\dddot", r"\ddddot")


def latex_name(name: str) -> str:
    """A name in LaTeX: Greek letters, indices from digits and underscores, dots for primes."""
    base = name.rstrip("'")
    primes = len(name) - len(base)
    head, index = _split(base)
    body = rf"\{head}" if head in _GREEK else (head if len(head) == 1 else _upright(head))
    if primes:
        body = rf"{_DOTS[primes]}{{{body}}}" if primes < len(_DOTS) else rf"{body}^{{({primes})}}"
    return rf"{body}_{{{_upright(index)}}}" if index else body


def _split(name: str) -> tuple[str, str]:
    """Head and index of a name: theta_1, h1, Tm and Mw have one."""
    head, underscore, index = name.partition("_")
    if underscore and head:
        return head, index.strip("_")
    match = re.fullmatch(r"([^\W\d_]+)(\d+)", name)
    if match:
        return match.group(1), match.group(2)
    # two letters, or a capital and what it is of (Tm, Mw, Tin); words stay whole (fold, len)
    match = re.fullmatch(r"([^\W\d_])([^\W_])|([A-Z])([a-z0-9]{1,3})", name)
    if match and name not in _GREEK:
        return match.group(1) or match.group(3), match.group(2) or match.group(4)
    for greek in sorted(_GREEK, key=len, reverse=True):
        if len(greek) > 2 and name.startswith(greek) and name != greek:
            return greek, name[len(greek) :]
    return name, ""


def _upright(text: str) -> str:
    escaped = text.replace("_", r"\_")
    return escaped if text.isdigit() else rf"\mathrm{{{escaped}}}"
