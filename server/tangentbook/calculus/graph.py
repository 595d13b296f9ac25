"""One hash-consed expression graph per call, with exact rational constants.

A node is an integer; its children have smaller numbers, so "in order of number" is a valid
order of evaluation and no pass over the graph needs recursion. Equal expressions are one node.
Only exact rationals are folded, and only up to a size: everything else stays as written.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from flint import fmpq

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Mapping

Node = int

# A folded constant may grow to this many bits; beyond, the operation stays a node (nested
# quadratic steps on decimals would otherwise double their digits each time).
MAX_CONSTANT_BITS = 4096
MAX_EXPONENT = 400

UNARY = [
    "neg",
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
    "not",
]
BINARY = [
    "add",
    "sub",
    "mul",
    "div",
    "pow",
    "atan2",
    "min",
    "max",
    "lt",
    "le",
    "eq",
    "ne",
    "and",
    "or",
]


_EXACT: dict[str, Callable[[fmpq, fmpq], fmpq]] = {
    "add": fmpq.__add__,
    "sub": fmpq.__sub__,
    "mul": fmpq.__mul__,
    "div": fmpq.__truediv__,
}


class Graph:
    """Nodes of one call: `op[k]` and `args[k]` describe node k.

    Leaves are `const` (an fmpq), `pi` and `var` (a name). `ipow` holds an integer exponent,
    `if` holds condition and two branches. All other operations have nodes as arguments.
    """

    __slots__ = ("_known", "args", "op")

    def __init__(self) -> None:
        self.op: list[str] = []
        # nodes, except in leaves (a value, a name) and for the exponent of an integer power
        self.args: list[tuple[Any, ...]] = []
        self._known: dict[tuple[object, ...], Node] = {}

    def __len__(self) -> int:
        return len(self.op)

    def _node(self, op: str, *args: object) -> Node:
        return self._kept((op, *args), op, args)

    def _kept(self, key: tuple[object, ...], op: str, args: tuple[object, ...]) -> Node:
        found = self._known.get(key)
        if found is None:
            found = len(self.op)
            self.op.append(op)
            self.args.append(args)
            self._known[key] = found
        return found

    # leaves

    def const(self, value: fmpq | int) -> Node:
        """An exact rational constant."""
        exact = fmpq(value)
        return self._kept(("const", int(exact.p), int(exact.q)), "const", (exact,))

    def pi(self) -> Node:
        """The circle number, exact as a symbol."""
        return self._node("pi")

    def var(self, name: str) -> Node:
        """The quantity of that name; a rate carries its primes in the name."""
        return self._node("var", name)

    def value_of(self, node: Node) -> fmpq | None:
        """The rational value of a constant node, else None."""
        return self.args[node][0] if self.op[node] == "const" else None

    def name_of(self, node: Node) -> str | None:
        """The name of a variable node, else None."""
        return str(self.args[node][0]) if self.op[node] == "var" else None

    def children(self, node: Node) -> tuple[Node, ...]:
        """The nodes this node is made of."""
        op = self.op[node]
        if op in ("const", "pi", "var"):
            return ()
        return self.args[node][:1] if op == "ipow" else self.args[node]

    def exponent(self, node: Node) -> int:
        """The exponent of an integer power."""
        return self.args[node][1]

    def is_zero(self, node: Node) -> bool:
        """Whether the node is the constant 0."""
        return self.op[node] == "const" and self.args[node][0] == 0

    def is_one(self, node: Node) -> bool:
        """Whether the node is the constant 1."""
        return self.op[node] == "const" and self.args[node][0] == 1

    # arithmetic

    def _folded(self, op: str, a: Node, b: Node) -> Node | None:
        x, y = self.value_of(a), self.value_of(b)
        if x is None or y is None:
            return None
        result = _EXACT[op](x, y)
        return self.const(result) if result.height_bits() <= MAX_CONSTANT_BITS else None

    def add(self, a: Node, b: Node) -> Node:
        """The sum."""
        if self.is_zero(a):
            return b
        if self.is_zero(b):
            return a
        if self.op[b] == "neg":
            return self.sub(a, self.children(b)[0])
        folded = self._folded("add", a, b)
        return folded if folded is not None else self._node("add", a, b)

    def sub(self, a: Node, b: Node) -> Node:
        """The difference."""
        if self.is_zero(b):
            return a
        if self.is_zero(a):
            return self.neg(b)
        if a == b and self.op[a] in ("var", "const", "pi"):
            return self.const(0)
        if self.op[b] == "neg":
            return self.add(a, self.children(b)[0])
        folded = self._folded("sub", a, b)
        return folded if folded is not None else self._node("sub", a, b)

    def neg(self, a: Node) -> Node:
        """The negative."""
        value = self.value_of(a)
        if value is not None:
            return self.const(-value)
        if self.op[a] == "neg":
            return self.children(a)[0]
        if self.op[a] == "sub":
            left, right = self.children(a)
            return self.sub(right, left)
        return self._node("neg", a)

    def mul(self, a: Node, b: Node) -> Node:
        """The product; 0*x stays as written, since x may have no value."""
        if self.is_one(a) or self.is_one(b):
            return b if self.is_one(a) else a
        folded = self._folded("mul", a, b)
        if folded is not None:
            return folded
        if self.op[a] == "neg":
            return self.neg(self.mul(self.children(a)[0], b))
        if self.op[b] == "neg":
            return self.neg(self.mul(a, self.children(b)[0]))
        for factor, other in ((a, b), (b, a)):
            if self.value_of(factor) == -1:
                return self.neg(other)
        return self._node("mul", a, b)

    def times(self, a: Node, b: Node) -> Node:
        """The product where 0 annihilates: for derivatives and substitution, not for user text."""
        return self.const(0) if self.is_zero(a) or self.is_zero(b) else self.mul(a, b)

    def div(self, a: Node, b: Node) -> Node:
        """The quotient.

        Raises:
            ZeroDivisionError: the divisor is the constant 0.
        """
        if self.is_zero(b):
            raise ZeroDivisionError
        if self.is_one(b):
            return a
        folded = self._folded("div", a, b)
        if folded is not None:
            return folded
        if self.op[a] == "neg":
            return self.neg(self.div(self.children(a)[0], b))
        return self._node("div", a, b)

    def power(self, a: Node, b: Node) -> Node:
        """a^b: integer exponents are products, 1/2 is the square root, else a^b for a > 0.

        Raises:
            OverflowError: an integer exponent beyond the limit.
            ZeroDivisionError: 0 to a negative power.
        """
        exponent = self.value_of(b)
        if exponent is None:
            return self._node("pow", a, b)
        if exponent.q == 1:
            return self.ipow(a, int(exponent.p))
        if exponent == fmpq(1, 2):
            return self.unary("sqrt", a)
        return self._node("pow", a, b)

    def ipow(self, a: Node, n: int) -> Node:
        """The integer power a^n; see `power` for what is raised.

        a^0 is 1 only where a has a value: for a compound it is kept as 0*a + 1.
        """
        if abs(n) > MAX_EXPONENT:
            raise OverflowError
        if n == 0:
            one = self.const(1)
            return self.add(self.mul(self.const(0), a), one) if self.children(a) else one
        if n == 1:
            return a
        value = self.value_of(a)
        if value is not None:
            if value == 0 and n < 0:
                raise ZeroDivisionError
            if value.height_bits() * abs(n) <= MAX_CONSTANT_BITS:
                return self.const(value**n)
        return self._node("ipow", a, n)

    def unary(self, op: str, a: Node) -> Node:
        """A function of one argument, by its name."""
        if op == "neg":
            return self.neg(a)
        value = self.value_of(a)
        if value is not None and op in ("abs", "sign"):
            sign = (value > 0) - (value < 0)
            return self.const(value * sign if op == "abs" else sign)
        if value == 0 and op in ("sin", "tan", "asin", "atan", "sinh", "tanh", "sqrt"):
            return a
        if value == 0 and op in ("cos", "cosh", "exp"):
            return self.const(1)
        if value == 1 and op in ("log", "log10"):
            return self.const(0)
        return self._node(op, a)

    def binary(self, op: str, a: Node, b: Node) -> Node:
        """A two-place operation, by its name."""
        method = _ARITHMETIC.get(op)
        return method(self, a, b) if method is not None else self._node(op, a, b)

    def choose(self, condition: Node, a: Node, b: Node) -> Node:
        """`a` where the condition holds, else `b`."""
        return a if a == b else self._node("if", condition, a, b)

    # walks

    def reachable(self, roots: Iterable[Node]) -> list[Node]:
        """All nodes the roots are made of, in an order of evaluation."""
        seen: set[Node] = set()
        stack = list(roots)
        children = self.children
        while stack:
            node = stack.pop()
            if node not in seen:
                seen.add(node)
                stack.extend(children(node))
        return sorted(seen)

    def leaves(self, roots: Iterable[Node]) -> set[str]:
        """The names the roots depend on, by structure."""
        return {str(self.args[node][0]) for node in self.reachable(roots) if self.op[node] == "var"}

    def substitute(self, roots: Iterable[Node], mapping: Mapping[Node, Node]) -> list[Node]:
        """The roots with some nodes replaced; 0 annihilates in products."""
        roots = list(roots)
        new: dict[Node, Node] = {}
        for node in self.reachable(roots):
            replaced = mapping.get(node)
            if replaced is not None:
                new[node] = replaced
                continue
            children = self.children(node)
            moved = tuple(new[child] for child in children)
            new[node] = node if moved == children else self._rebuilt(node, moved)
        return [new[root] for root in roots]

    def _rebuilt(self, node: Node, args: tuple[Node, ...]) -> Node:
        op = self.op[node]
        if op == "mul":
            return self.times(*args)
        if op == "div" and self.is_zero(args[1]):
            return self._node(op, *args)  # no value there; maybe in a branch that is not in force
        if op == "div" and self.is_zero(args[0]):
            return args[0]
        if op == "ipow":
            return self.ipow(args[0], self.exponent(node))
        if op == "if":
            return self.choose(*args)
        return self.unary(op, *args) if len(args) == 1 else self.binary(op, *args)

    def terms(self, node: Node) -> list[Node]:
        """The additive terms of an expression (signs dropped), left to right."""
        found: list[Node] = []
        stack = [node]
        while stack:
            current = stack.pop()
            if self.op[current] in ("add", "sub"):
                stack.extend(reversed(self.children(current)))
            elif self.op[current] == "neg":
                stack.extend(self.children(current))
            else:
                found.append(current)
        return found


_ARITHMETIC: dict[str, Callable[[Graph, Node, Node], Node]] = {
    "add": Graph.add,
    "sub": Graph.sub,
    "mul": Graph.mul,
    "div": Graph.div,
    "pow": Graph.power,
}
