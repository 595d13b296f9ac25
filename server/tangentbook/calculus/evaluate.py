"""Everything that evaluates is generated from the graph: one point, many points, balls, series.

`Function` holds outputs over an ordered list of names. Each kind of number has one generated
function, made when first used: the statements are the same, only the namespace and the spelling
of operations differ. The generated text consists of node numbers and literals of this module's
own making; no user text ever reaches the compiler.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import TYPE_CHECKING, Any, TypeAlias

import numpy as np
import numpy.typing as npt
from flint import arb, ctx

from tangentbook.calculus import balls

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from flint import fmpq

    from tangentbook.calculus.graph import Graph, Node

FloatArray: TypeAlias = npt.NDArray[np.float64]

_INFIX = {"add": "+", "sub": "-", "mul": "*", "div": "/"}
# what is used once is written where it is used: fewer statements to compile and fewer stores to
# run; nested brackets stay far below the limit of the compiler
MAX_NESTING = 12
_COMPARE = {"lt": "<", "le": "<=", "eq": "==", "ne": "!="}


class DomainError(ArithmeticError):
    """An expression has no (finite) value at the given point."""


class Function:
    """Outputs of a graph as functions of the named variables, in that order.

    Args:
        graph: where the nodes live.
        names: the variables, in the order in which values are passed.
        outputs: the nodes to evaluate.
        switches: nodes whose values are passed in after the variables instead of being computed
            (one-sided evaluation at a kink).
    """

    def __init__(
        self,
        graph: Graph,
        names: Sequence[str],
        outputs: Sequence[Node],
        *,
        switches: Sequence[Node] = (),
    ) -> None:
        self.graph = graph
        self.names = tuple(names)
        self.outputs = tuple(outputs)
        self.switches = tuple(switches)
        self._made: dict[str, Callable[..., Any]] = {}
        self._constants: dict[int, list[arb]] = {}

    def floats(self, x: Sequence[float]) -> list[float]:
        """Values at one point in double precision.

        Raises:
            DomainError: an output has no finite value there.
        """
        try:
            values = self._function("float", _FLOAT)(x)
        except (ValueError, ZeroDivisionError, OverflowError):
            # an untaken branch of if/min/max may lack a value: evaluate with NaN instead of raising
            values = self._function("safe", _SAFE)(x)
        if not all(map(math.isfinite, values)):
            raise DomainError
        return values

    def batch(self, x: FloatArray) -> list[FloatArray]:
        """Values at many points: `x` is (names, points); not finite where there is no value."""
        with np.errstate(all="ignore"):
            values = self._function("batch", _BATCH)(x)
        # an output without a variable is one number for all points
        return [np.broadcast_to(np.asarray(v, dtype=np.float64), x.shape[1:]) for v in values]

    def balls(self, x: Sequence[Any]) -> list[arb]:
        """Enclosures over balls at the current precision; not finite where there is no value."""
        constants = self._ball_constants()
        return [arb(v) for v in self._function("ball", _BALL)(x, constants)]

    def series(self, x: Sequence[Any]) -> list[Any]:
        """Truncated power series over balls (or balls, where an output is constant)."""
        return self._function("ball", _BALL)(x, self._ball_constants())

    def _ball_constants(self) -> list[arb]:
        precision = ctx.prec
        if precision not in self._constants:
            self._constants[precision] = [arb.pi(), *(arb(c) for c in self._exact_constants())]
        return self._constants[precision]

    def _exact_constants(self) -> list[fmpq]:
        nodes = self.graph.reachable(self.outputs)
        found = [self.graph.value_of(node) for node in nodes]
        return [value for value in found if value is not None]

    def _function(self, kind: str, dialect: _Dialect) -> Callable[..., Any]:
        made = self._made.get(kind)
        if made is None:
            made = self._made[kind] = self._generate(dialect)
        return made

    def _generate(self, dialect: _Dialect) -> Callable[..., Any]:
        lines = ["def generated(x, c=()):"]
        position = {name: k for k, name in enumerate(self.names)}
        switched = {node: len(self.names) + k for k, node in enumerate(self.switches)}
        needed = self._needed(switched)
        uses = self._uses(needed, switched)
        texts: dict[Node, str] = {}
        depths: dict[Node, int] = {}
        constants = 0
        for node in needed:
            if node in switched:
                texts[node] = f"x[{switched[node]}]"
            elif (value := self.graph.value_of(node)) is not None:
                constants += 1
                texts[node] = dialect.constant(value, constants)
            else:
                text = self._statement(node, position, dialect, texts)
                depth = 1
                for child in self.graph.children(node):
                    if child in depths and depths[child] >= depth:
                        depth = depths[child] + 1
                if uses[node] == 1 and depth <= MAX_NESTING:
                    texts[node], depths[node] = f"({text})", depth
                else:
                    lines.append(f" v{node}={text}")
                    texts[node] = f"v{node}"
        outputs = "".join(f"{texts[node]}," for node in self.outputs)
        lines.append(f" return [{outputs}]")
        namespace: dict[str, Any] = {
            f"f_{name}": function for name, function in dialect.functions.items()
        }
        namespace["np"] = np
        exec(compile("\n".join(lines), "<generated>", "exec"), namespace)  # noqa: S102 - own text only, see module docstring
        return namespace["generated"]

    def _uses(self, needed: Sequence[Node], switched: Mapping[int, int]) -> dict[Node, int]:
        """How often each node is written; the base of a power is repeated, so it counts twice."""
        uses = dict.fromkeys(needed, 0)
        for node in needed:
            if node not in switched:
                times = 2 if self.graph.op[node] == "ipow" else 1
                for child in self.graph.children(node):
                    uses[child] += times
        for node in self.outputs:
            uses[node] += 1
        return uses

    def _needed(self, switched: Mapping[int, int]) -> list[Node]:
        seen: set[Node] = set()
        stack = list(self.outputs)
        while stack:
            node = stack.pop()
            if node not in seen:
                seen.add(node)
                if node not in switched:
                    stack.extend(self.graph.children(node))
        return sorted(seen)

    def _statement(
        self,
        node: Node,
        position: Mapping[str, int],
        dialect: _Dialect,
        texts: Mapping[Node, str],
    ) -> str:
        op = self.graph.op[node]
        if op == "var":
            return f"x[{position[str(self.graph.args[node][0])]}]"
        if op == "pi":
            return dialect.pi
        args = [texts[child] for child in self.graph.children(node)]
        if op == "ipow":
            return dialect.integer_power(args[0], self.graph.exponent(node))
        return dialect.operation(op, args)


class _Dialect:
    """How one kind of number spells constants and operations."""

    pi = repr(math.pi)

    def __init__(self, functions: Mapping[str, Callable[..., Any]]) -> None:
        self.functions = functions

    def constant(self, value: fmpq, _index: int) -> str:
        # the quotient of two integers is correctly rounded
        try:
            number = repr(int(value.p) / int(value.q))
        except OverflowError:
            return "float('inf')"
        return f"({number})" if number.startswith("-") else number

    def operation(self, op: str, args: list[str]) -> str:
        if op in _INFIX:
            return _INFIX[op].join(args)
        if op == "neg":
            return f"-{args[0]}"
        return f"f_{op}({','.join(args)})"

    def integer_power(self, a: str, n: int) -> str:
        if n < 0:
            return f"1/({self.integer_power(a, -n)})"
        return "*".join([a] * n) if n <= 4 else f"f_ipow({a},{n})"


class _ScalarDialect(_Dialect):
    def operation(self, op: str, args: list[str]) -> str:
        if op == "if":
            return f"({args[1]} if {args[0]} else {args[2]})"
        if op in _COMPARE:
            return f"({args[0]}{_COMPARE[op]}{args[1]})"
        if op in ("and", "or"):
            return f"({args[0]} {op} {args[1]})"
        return f"(not {args[0]})" if op == "not" else super().operation(op, args)


class _SafeDialect(_ScalarDialect):
    def operation(self, op: str, args: list[str]) -> str:
        return f"f_div({args[0]},{args[1]})" if op == "div" else super().operation(op, args)

    def integer_power(self, a: str, n: int) -> str:
        return f"f_div(1.0,f_ipow({a},{-n}))" if n < 0 else f"f_ipow({a},{n})"


class _BatchDialect(_Dialect):
    def operation(self, op: str, args: list[str]) -> str:
        if op in _COMPARE:
            return f"({args[0]}{_COMPARE[op]}{args[1]})"
        return super().operation(op, args)


class _BallDialect(_Dialect):
    pi = "c[0]"

    def constant(self, value: fmpq, index: int) -> str:  # noqa: ARG002 - the value is in the list
        return f"c[{index}]"

    def operation(self, op: str, args: list[str]) -> str:
        return f"f_div({args[0]},{args[1]})" if op == "div" else super().operation(op, args)

    def integer_power(self, a: str, n: int) -> str:
        return f"f_div(1,f_ipow({a},{-n}))" if n < 0 else f"f_ipow({a},{n})"


_CIRCULAR = ("sin", "cos", "tan")
_INVERSE = ("asin", "acos", "atan", "atan2")
_OTHERS = ("sinh", "cosh", "tanh", "exp", "log", "log10", "sqrt")


def _real_power(a: float, b: float) -> float:
    if a < 0:
        raise ValueError
    return math.pow(a, b)


def _quotient(a: float, b: float) -> float:
    return a / b


def _integer_power(a: float, n: int) -> float:
    return a**n


# of a number and NaN there is no least, no greatest and no sign: NaN comes out
def _least(a: float, b: float) -> float:
    return a if a <= b else b if b < a else math.nan


def _greatest(a: float, b: float) -> float:
    return a if a >= b else b if b > a else math.nan


def _sign(a: float) -> float:
    return 1.0 if a > 0 else -1.0 if a < 0 else 0.0 if a == 0 else math.nan


_SCALAR_FUNCTIONS: dict[str, Callable[..., float]] = {
    **{name: getattr(math, name) for name in (*_CIRCULAR, *_INVERSE, *_OTHERS)},
    "abs": math.fabs,
    "sign": _sign,
    "min": _least,
    "max": _greatest,
    "pow": _real_power,
    "ipow": _integer_power,
}


def _overflown(a: float, n: int = 0) -> float:
    """What an overflowing exp, sinh, cosh, pow or integer power tends to."""
    return -math.inf if a < 0 and n % 2 else math.inf


def _safe(name: str, function: Callable[..., float]) -> Callable[..., float]:
    """NaN or the infinite value where the function would raise: another branch may be in force."""

    def safe(*args: float) -> float:
        try:
            return function(*args)
        except (ValueError, ZeroDivisionError):
            return math.nan
        except OverflowError:
            odd = {"sinh": 1, "ipow": int(args[-1])}.get(name, 0)
            return _overflown(args[0], odd)

    return safe


def _batch_power(a: FloatArray, b: FloatArray) -> FloatArray:
    return np.where(np.asarray(a) < 0, np.nan, np.power(np.abs(a), b))


def _batch_integer_power(a: FloatArray, n: int) -> FloatArray:
    return np.asarray(a) ** n


_BATCH_FUNCTIONS: dict[str, Callable[..., Any]] = {
    **{name: getattr(np, name) for name in (*_CIRCULAR, *_OTHERS, "abs", "sign")},
    "asin": np.arcsin,
    "acos": np.arccos,
    "atan": np.arctan,
    "atan2": np.arctan2,
    "min": np.minimum,
    "max": np.maximum,
    "pow": _batch_power,
    "ipow": _batch_integer_power,
    "and": np.logical_and,
    "or": np.logical_or,
    "not": np.logical_not,
    "if": np.where,
}

_FLOAT = _ScalarDialect(_SCALAR_FUNCTIONS)
_SAFE = _SafeDialect(
    {
        name: _safe(name, function)
        for name, function in {**_SCALAR_FUNCTIONS, "div": _quotient}.items()
    }
)
_BATCH = _BatchDialect(_BATCH_FUNCTIONS)
_BALL = _BallDialect(balls.FUNCTIONS)
