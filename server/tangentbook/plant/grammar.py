"""Precedence climbing: tokens -> a program for a stack machine (reverse Polish order).

The grammar, loosest first:

    condition  = and-chain { "or" and-chain }          only inside the first argument of if(…)
    comparison = sum ("<" | "<=" | ">" | ">=" | "==" | "!=") sum
    sum        = product { ("+" | "-") product }
    product    = signed { ("*" | "/") signed }
    signed     = ("+" | "-") signed | power
    power      = primary [ "^" signed ]                right to left; -x^2 is -(x^2)
    primary    = number [ "[" unit "]" ] | name { "'" } | function "(" … ")" | "(" sum ")" { "'" }
               | "d" "(" sum ")" "/" "dt"

A program, unlike a tree, needs no recursion to be walked, so a sum of thousands of terms is no
special case. Nothing is ever handed to an evaluator of the host language.
"""

from __future__ import annotations

import re
import sys
from typing import NoReturn

from tangentbook.errors import ExpressionError
from tangentbook.plant.program import (
    ALIASES,
    FUNCTIONS,
    RESERVED,
    EquationProgram,
    Program,
    Step,
)
from tangentbook.plant.tokens import Token, tokenize

MAX_DEPTH = 200

# the deepest legal text takes ten calls a level; the interpreter's usual limit is below that
sys.setrecursionlimit(max(sys.getrecursionlimit(), 20 * MAX_DEPTH))


def parse_expression(text: str, where: str) -> Program:
    """The program of an expression.

    Raises:
        ExpressionError: with equation and column, what was expected, and what to write instead.
    """
    parser = _Parser(text, where)
    parser.sum()
    if parser.token.text == "=":
        parser.fail("an expression has no equals sign", "equations belong into `equations`")
    parser.expect_end()
    return tuple(parser.steps)


def parse_leading(text: str, where: str) -> tuple[Program, str]:
    """The expression at the start of a text and what follows it ("2*pi*50 rad/s")."""
    parser = _Parser(text, where, lenient=True)
    parser.sum()
    rest = text[parser.token.at :] if parser.token.kind != "end" else ""
    return tuple(parser.steps), rest


def parse_equation(text: str, where: str) -> EquationProgram:
    """The two programs of "left = right".

    Raises:
        ExpressionError: also for a missing or a second equals sign.
    """
    parser = _Parser(text, where)
    parser.sum()
    if parser.token.text == "==":
        parser.fail("an equation has one equals sign", "write = here; == compares inside if(…)")
    if parser.token.text != "=":
        if parser.token.kind == "end":
            parser.fail('an equation is "left = right"; the equals sign is missing', "add = …")
        parser.expect_end()
    left = tuple(parser.steps)
    parser.steps.clear()
    parser.advance()
    parser.sum()
    if parser.token.text == "=":
        parser.fail("a second equals sign", "one equation an entry; == compares inside if(…)")
    parser.expect_end()
    return EquationProgram(left, tuple(parser.steps))


_COMPARISONS = {"<": "lt", "<=": "le", ">": "gt", ">=": "ge", "==": "eq", "!=": "ne"}


class _Parser:
    def __init__(self, text: str, where: str, *, lenient: bool = False) -> None:
        self.where = where
        self.tokens = _lenient_tokens(text, where) if lenient else tokenize(text, where)
        self.index = 0
        self.depth = 0
        self.lenient = lenient
        self.steps: list[Step] = []

    @property
    def token(self) -> Token:
        return self.tokens[self.index]

    def advance(self) -> Token:
        token = self.tokens[self.index]
        self.index = min(self.index + 1, len(self.tokens) - 1)
        return token

    def fail(self, message: str, hint: str, *, at: int | None = None) -> NoReturn:
        column = (self.token.at if at is None else at) + 1
        raise ExpressionError(
            "expression.syntax", message, where=f"{self.where}, column {column}", hint=hint
        )

    def expect_end(self) -> None:
        token = self.token
        if token.kind == "end":
            return
        if token.kind in ("name", "number") or token.text == "(":
            self._no_operator(self.tokens[self.index - 1], token)
        if token.text == ")":
            self.fail("a closing bracket without an opening one", "remove it or open one before")
        if token.text in _COMPARISONS:
            self.fail(
                "a comparison stands only in the first argument of if(…)", "write if(a < b, x, y)"
            )
        if token.text == ",":
            self.fail("a comma outside a function", "the decimal sign is a point: 3.5")
        if token.kind == "unit":
            self._no_operand(token)
        self.fail(f"unexpected {token.text!r}", "expected an operator or the end")

    def _no_operator(self, before: Token, token: Token) -> NoReturn:
        if before.kind == "name" and before.text in FUNCTIONS:
            self.fail(
                f"a function needs brackets: {before.text} {token.text}",
                f"write {before.text}({token.text}…)",
            )
        left = "(…)" if before.text == ")" else before.text
        right = "(…)" if token.text == "(" else token.text
        self.fail(
            f"expected an operator between {before.text!r} and {token.text!r}",
            f"multiplication is written with *: {left}{before.primes * chr(39)}*{right}",
        )

    def _enter(self) -> None:
        self.depth += 1
        if self.depth > MAX_DEPTH:
            self.fail(f"nested more than {MAX_DEPTH} deep", "name inner parts in `definitions`")

    def _leave(self) -> None:
        self.depth -= 1

    def sum(self) -> None:
        self._product()
        while self.token.kind == "op" and self.token.text in "+-":
            operator = self.advance()
            self._product()
            self._binary("add" if operator.text == "+" else "sub", operator)

    def _binary(self, name: str, token: Token) -> None:
        self.steps.append(Step("binary", name, 2, token.at))

    def _product(self) -> None:
        self._signed()
        while self.token.kind == "op" and self.token.text in "*/":
            operator = self.advance()
            self._signed()
            self._binary("mul" if operator.text == "*" else "div", operator)

    def _signed(self) -> None:
        if self.token.kind == "op" and self.token.text in "+-":
            sign = self.advance()
            self._enter()
            self._signed()
            self._leave()
            if sign.text == "-":
                self.steps.append(Step("neg", at=sign.at))
            return
        self._power()

    def _power(self) -> None:
        self._primary()
        if self.token.text == "^" and self.token.kind == "op":
            operator = self.advance()
            self._enter()
            self._signed()
            self._leave()
            self._binary("pow", operator)

    def _primary(self) -> None:
        token = self.token
        if token.kind == "number":
            self._number()
        elif token.kind == "name":
            self._name()
        elif token.text == "(":
            self._bracket()
        else:
            self._no_operand(token)

    def _no_operand(self, token: Token) -> NoReturn:
        if token.kind == "end":
            self.fail("the expression ends where a value is expected", "add a number, name or (…)")
        if token.kind == "unit":
            self.fail("a unit in square brackets follows a number", "write 64.94[1/s]")
        if token.text in ("<", ">", "=", "<=", ">=", "==", "!="):
            self.fail(f"nothing stands before {token.text!r}", "add the left side")
        self.fail(f"a value is expected, got {token.text!r}", "add a number, name or (…)")

    def _number(self) -> None:
        token = self.advance()
        self.steps.append(Step("number", token.text, at=token.at))
        follower = self.token
        if follower.kind == "unit":
            self.advance()
            self.steps.append(Step("unit", follower.text, at=follower.at))
        elif follower.kind == "name" and not self.lenient and follower.text not in ("and", "or"):
            self.fail(
                f"expected an operator between {token.text!r} and {follower.text!r}",
                f"multiplication is written with *: {token.text}*{follower.text}",
            )

    def _bracket(self) -> None:
        opening = self.advance()
        self._enter()
        self.sum()
        closing = self._close(opening)
        self._leave()
        if closing.primes:
            self.steps.append(Step("rate", count=closing.primes, at=opening.at))

    def _close(self, opening: Token) -> Token:
        if self.token.text != ")":
            if self.token.kind == "end":
                self.fail("a bracket is not closed", "add )", at=opening.at)
            self.expect_end()
        return self.advance()

    def _name(self) -> None:
        token = self.advance()
        follows_bracket = self.token.text == "(" and not token.primes
        if follows_bracket and token.text not in RESERVED:
            self._call(token)
        elif token.text == "pi":
            if token.primes:
                self.fail("pi has no rate", "remove the prime", at=token.at)
            self.steps.append(Step("pi", at=token.at))
        elif token.text in ("and", "or", "not"):
            self.fail(
                f"{token.text!r} stands only in the first argument of if(…)",
                "write if(a < b and c < d, x, y)",
                at=token.at,
            )
        else:
            self.steps.append(Step("name", token.text, token.primes, token.at))

    def _call(self, token: Token) -> None:
        opening = self.advance()
        self._enter()
        name = ALIASES.get(token.text, token.text)
        if name == "if":
            self._condition()
            self._comma("if(condition, value, otherwise)")
            self.sum()
            self._comma("if(condition, value, otherwise)")
            self.sum()
            if self.token.text == ",":
                self.fail("if takes 3 arguments, got more", "write if(condition, value, otherwise)")
            self._close(opening)
            self.steps.append(Step("if", "if", 3, token.at))
        elif name == "d":
            self._rate(token, opening)
        else:
            self._function(token, name, opening)
        self._leave()

    def _function(self, token: Token, name: str, opening: Token) -> None:
        count = 0
        if self.token.text != ")":
            self.sum()
            count = 1
            while self.token.text == ",":
                self.advance()
                self.sum()
                count += 1
        closing = self._close(opening)
        self.steps.append(Step("call", name, count, token.at))
        if name in FUNCTIONS:
            least, most = FUNCTIONS[name]
            if not least <= count <= most:
                self.fail(
                    f"{name} takes {least if least == most else f'{least} to {most}'} "
                    f"argument{'s' if most > 1 else ''}, got {count}",
                    "the decimal sign is a point; arguments are separated by commas",
                    at=token.at,
                )
        if closing.primes:
            self.steps.append(Step("rate", count=closing.primes, at=token.at))

    def _rate(self, token: Token, opening: Token) -> None:
        """d(x)/dt."""
        self.sum()
        self._close(opening)
        slash, dt = self.token, self.tokens[min(self.index + 1, len(self.tokens) - 1)]
        if slash.text == "/" and dt.text == "dt":
            self.advance()
            self.advance()
            self.steps.append(Step("rate", count=1, at=token.at))
        else:
            self.fail(
                "d(…) is a time derivative only as d(…)/dt",
                "write d(x)/dt or x'; write d*(…) for a product with a quantity d",
                at=token.at,
            )

    def _comma(self, form: str) -> None:
        if self.token.text != ",":
            if self.token.text in (")", ""):
                self.fail(f"too few arguments: {form}", "add the missing argument")
            if self.token.text in _COMPARISONS:
                self.fail("comparisons do not chain", "write a < b and b < c")
            self.expect_end()
        self.advance()

    def _condition(self) -> None:
        self._conjunction()
        while self.token.text == "or":
            operator = self.advance()
            self._conjunction()
            self._binary("or", operator)

    def _conjunction(self) -> None:
        self._negation()
        while self.token.text == "and":
            operator = self.advance()
            self._negation()
            self._binary("and", operator)

    def _negation(self) -> None:
        if self.token.text == "not":
            token = self.advance()
            self._enter()
            self._negation()
            self._leave()
            self.steps.append(Step("not", at=token.at))
        elif self.token.text == "(" and self._holds_comparison():
            opening = self.advance()
            self._enter()
            self._condition()
            self._close(opening)
            self._leave()
        else:
            self._comparison()

    def _holds_comparison(self) -> bool:
        """Whether the bracket that opens here encloses a condition rather than a value."""
        level = 0
        for token in self.tokens[self.index :]:
            level += (token.text == "(") - (token.text == ")")
            if level == 0:
                return False
            if level == 1 and (token.text in _COMPARISONS or token.text in ("and", "or", "not")):
                return True
        return False

    def _comparison(self) -> None:
        self.sum()
        operator = self.token
        if operator.text not in _COMPARISONS:
            hint = "== compares" if operator.text == "=" else "write if(a < b, x, y)"
            self.fail("a comparison is expected in the first argument of if(…)", hint)
        self.advance()
        self.sum()
        self._binary(_COMPARISONS[operator.text], operator)


_NUMBER = re.compile(r"[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?(?![\w.*/^(+\[-])")


def _lenient_tokens(text: str, where: str) -> list[Token]:
    """Tokens of a text whose tail is a unit: the tail need not be made of tokens."""
    try:
        return tokenize(text, where)
    except ExpressionError:
        # cut at the first space, where "number unit" splits, or behind the number of "20°C"
        lead = len(text) - len(text.lstrip())
        number = _NUMBER.match(text, lead)
        cut = number.end() if number is not None else text.find(" ", lead)
        cut = cut if cut >= 0 else len(text)
        tokens = tokenize(text[:cut], where)
        return [*tokens[:-1], Token("rest", text[cut:].strip(), cut), Token("end", "", len(text))]
