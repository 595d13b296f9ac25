# pyright: reportUnknownMemberType=false, reportUnknownVariableType=false
# pyright: reportUnknownArgumentType=false, reportUnknownLambdaType=false
"""A second road to every number: equations read anew, differences instead of derivatives.

Nothing of the program is used. A plant as written (equations, parameters with units) is parsed by
a small parser of its own and evaluated with mpmath; all highest rates and algebraic unknowns w are
found from F(w, x, u) = 0 by Newton's iteration, and A, B, C, D come from central differences of F
and of the outputs g:

    dw/dz = -F_w^-1 F_z,   dy/dz = g_z + g_w dw/dz,   z = (x, u)

With a step of 1e-25 sizes and 80 digits the differences are right to about 50 digits, since their
error is of the order of the square of the step.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import mpmath as mp

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping, Sequence

Number = Any  # mpmath has no types
Env = dict[str, Number]
Node = tuple[Any, ...]

DIGITS = 80
STEP = mp.mpf(10) ** -25

_TOKEN = re.compile(
    r"\s*(?:(\d+\.?\d*(?:[eE][+-]?\d+)?|\.\d+(?:[eE][+-]?\d+)?)|([A-Za-z_]\w*)('*)"
    r"|(\*\*|[-+*/^(),'])|(\[[^\]]*\]))"
)

_FUNCTIONS: dict[str, Callable[..., Number]] = {
    "sin": mp.sin,
    "cos": mp.cos,
    "tan": mp.tan,
    "asin": mp.asin,
    "acos": mp.acos,
    "atan": mp.atan,
    "sinh": mp.sinh,
    "cosh": mp.cosh,
    "tanh": mp.tanh,
    "exp": mp.exp,
    "log": mp.log,
    "sqrt": mp.sqrt,
    "abs": abs,
    "sign": mp.sign,
    "max": max,
    "min": min,
}

_SI = {
    **dict.fromkeys(("1", "-", "", "pu", "rad", "kg", "m", "s", "N", "J", "W", "V", "A", "K"), "1"),
    **dict.fromkeys(("Pa", "ohm", "H", "F", "mol", "Wb"), "1"),
    **dict.fromkeys(("kN", "kJ", "kW", "t", "kgmol", "kOhm"), "1e3"),
    **dict.fromkeys(("mm", "g", "mH", "ms", "mA"), "1e-3"),
    "cm": "0.01",
    "l": "1e-3",
    "min": "60",
    "h": "3600",
    "d": "86400",
    "yr": "31557600",
    "kcal": "4184",
    "bar": "1e5",
    "%": "0.01",
}


def unit_size(text: str | None) -> Number:
    """The size of a unit in coherent SI."""
    total = mp.mpf(1)
    sign = 1
    for part in re.findall(r"[^\s*/()]+|/", (text or "1").strip() or "1"):
        if part == "/":
            sign = -1
            continue
        symbol, _, power = part.partition("^")
        size = mp.pi / 180 if symbol == "deg" else mp.mpf(_SI[symbol])
        total *= size ** (sign * int(power or 1))
    return total


class _Reader:
    """Expression text -> nested tuples, by precedence climbing."""

    def __init__(self, text: str) -> None:
        text = re.sub(r"\bd\((\w+)\)\s*/\s*dt\b", r"\1'", text)
        self.tokens: list[tuple[str, str]] = []
        position = 0
        while position < len(text.rstrip()):
            match = _TOKEN.match(text, position)
            assert match is not None, text[position:]
            number, name, primes, operator, unit = match.groups()
            if number:
                self.tokens.append(("number", number))
            elif name:
                self.tokens.append(("name", name + (primes or "")))
            elif unit:
                self.tokens.append(("unit", unit[1:-1]))
            else:
                self.tokens.append((operator.replace("**", "^"), ""))
            position = match.end()
        self.at = 0

    def peek(self) -> str:
        return self.tokens[self.at][0] if self.at < len(self.tokens) else ""

    def take(self) -> tuple[str, str]:
        self.at += 1
        return self.tokens[self.at - 1]

    def sum(self) -> Node:
        node = self.product()
        while self.peek() in ("+", "-"):
            node = (self.take()[0], node, self.product())
        return node

    def product(self) -> Node:
        node = self.signed()
        while self.peek() in ("*", "/"):
            node = (self.take()[0], node, self.signed())
        return node

    def signed(self) -> Node:
        if self.peek() in ("+", "-"):
            sign = self.take()[0]
            inner = self.signed()
            return ("-", ("number", "0"), inner) if sign == "-" else inner
        return self.power()

    def power(self) -> Node:
        base = self.atom()
        if self.peek() == "^":
            self.take()
            return ("^", base, self.signed())
        return base

    def atom(self) -> Node:
        kind, text = self.take()
        if kind == "number":
            if self.peek() == "unit":
                return ("quantity", text, self.take()[1])
            return (kind, text)
        if kind == "name":
            if self.peek() == "(" and text in _FUNCTIONS:
                return ("call", text, *self.arguments())
            return (kind, text)
        assert kind == "(", kind
        node = self.sum()
        assert self.take()[0] == ")"
        while self.peek() == "'":
            self.take()
            node = ("rate", node)
        return node

    def arguments(self) -> list[Node]:
        self.take()
        found = [self.sum()]
        while self.take()[0] == ",":
            found.append(self.sum())
        return found


def parse(text: str) -> Node:
    """An expression as a tree."""
    reader = _Reader(text)
    node = reader.sum()
    assert not reader.peek(), text
    return node


def _names(node: Node) -> set[str]:
    if node[0] == "name":
        return {node[1]}
    inner = [n for n in node[1:] if isinstance(n, tuple)]
    found: set[str] = set()
    for child in inner:
        found |= _names(child)
    if node[0] == "rate":
        found |= {name + "'" for name in found}
    return found


def _text_of(item: object) -> str:
    return item["is"] if isinstance(item, dict) else str(item)


def _unit_of(item: object) -> str | None:
    if isinstance(item, str):
        return item
    return item.get("unit") if isinstance(item, dict) else None


@dataclass(frozen=True, slots=True, kw_only=True)
class Model:
    """The point and the matrices in declared units, and the eigenvalues per declared time."""

    values: Mapping[str, Number]
    A: list[list[Number]]
    B: list[list[Number]]
    C: list[list[Number]]
    D: list[list[Number]]
    eigenvalues: list[Number]


@dataclass(slots=True)
class OwnPlant:
    """A plant as this module reads it; all numbers in SI."""

    raw: Mapping[str, Any]
    set: Mapping[str, object] = field(default_factory=dict[str, object])
    equations: list[Node] = field(init=False)
    definitions: dict[str, Node] = field(init=False)
    states: list[str] = field(init=False)
    inputs: list[str] = field(init=False)
    algebraic: list[str] = field(init=False)
    outputs: dict[str, Node] = field(init=False)
    unknowns: list[str] = field(init=False)
    constants: Env = field(init=False)
    units: dict[str, Number] = field(init=False)

    def __post_init__(self) -> None:
        with mp.workdps(DIGITS):
            self._read()

    def _read(self) -> None:
        raw = self.raw
        groups = {g: raw.get(g) or {} for g in ("states", "inputs", "algebraic")}
        tables = {g: (v if isinstance(v, dict) else dict.fromkeys(v)) for g, v in groups.items()}
        self.inputs, self.algebraic = list(tables["inputs"]), list(tables["algebraic"])
        self.definitions = {
            n: parse(_text_of(d)) for n, d in (raw.get("definitions") or {}).items()
        }
        self.equations = []
        known = {*tables["states"], *self.inputs, *self.algebraic, *(raw.get("parameters") or {})}
        for item in raw["equations"]:
            left, right = _text_of(item).split("=")
            if re.fullmatch(r"\s*[A-Za-z_]\w*\s*", left) and left.strip() not in known:
                self.definitions[left.strip()] = parse(right)
            else:
                self.equations.append(("-", parse(left), parse(right)))
        self._order(tables["states"])
        self.units = {}
        for table in tables.values():
            for name, item in table.items():
                self.units[name] = unit_size(_unit_of(item))
        self.clock = unit_size(raw.get("time", "s"))
        for name in self.states:
            base = name.rstrip("'")
            primes = len(name) - len(base)
            self.units[name] = self.units.get(base, mp.mpf(1)) / self.clock**primes
        self._constants()
        self._outputs()

    clock: Number = field(init=False)
    output_units: dict[str, Number] = field(init=False)

    def _order(self, declared: Mapping[str, Any]) -> None:
        """States in order: the declared ones, else by first occurrence; x, then x'."""
        used: list[str] = []
        for node in [*self.equations, *self.definitions.values()]:
            used += sorted(_names(node))
        highest: dict[str, int] = {}
        for name in used:
            base = name.rstrip("'")
            highest[base] = max(highest.get(base, 0), len(name) - len(base))
        first: list[str] = []
        for item in self.raw["equations"]:
            first += re.findall(r"[A-Za-z_]\w*", _text_of(item))
        constant = {*(self.raw.get("parameters") or {}), *self.inputs, *self.definitions}
        candidates = [n for n in dict.fromkeys([*declared, *first]) if n not in constant]
        moving = [n for n in candidates if highest.get(n.rstrip("'"), 0)]
        moving = list(dict.fromkeys(n.rstrip("'") for n in moving))
        self.states = [n + "'" * k for n in moving for k in range(highest[n])]
        self.unknowns = [n + "'" * highest[n] for n in moving] + self.algebraic

    def _constants(self) -> None:
        given = {**(self.raw.get("parameters") or {}), **self.set}
        self.constants = {"pi": +mp.pi}
        waiting = dict(given)
        for _ in range(len(given) + 1):
            for name in list(waiting):
                value = self._constant(name, waiting[name])
                if value is not None:
                    self.constants[name] = value
                    del waiting[name]
        assert not waiting, waiting

    def _constant(self, name: str, item: object) -> Number | None:
        original = (self.raw.get("parameters") or {}).get(name)
        unit = original.get("unit") if isinstance(original, dict) else None
        if isinstance(item, dict):
            item = item.get("value", item.get("is"))
        return self.quantity(str(item), unit)

    def quantity(self, text: str, unit: str | None) -> Number | None:
        """A value ("52 kN", "pi/3", "9.81") in SI; None while a parameter it names is not known."""
        head, _, tail = text.strip().partition(" ")
        if tail and not re.match(r"[-+*/^]", tail):
            text, unit = head, tail
        node = parse(text)
        names = _names(node) - {"pi"}
        if not names <= self.constants.keys():
            return None
        value = self.value(node, self.constants)
        return value if names else value * unit_size(unit)

    def _outputs(self) -> None:
        given = self.raw.get("outputs") or {n: n for n in self.states}
        if isinstance(given, list):
            given = {n: n for n in given}
        self.outputs, self.output_units = {}, {}
        for name, item in given.items():
            text = _text_of(item)
            declared = item.get("unit") if isinstance(item, dict) else None
            self.outputs[name] = parse(text)
            plain = self.units.get(text.strip(), mp.mpf(1))
            self.output_units[name] = plain if declared is None else unit_size(declared)

    def value(self, node: Node, env: Env) -> Number:
        """The value of an expression; its rate is the derivative along the motion."""
        kind = node[0]
        if kind in ("number", "quantity"):
            return mp.mpf(node[1]) * unit_size(node[2] if kind == "quantity" else "1")
        if kind == "name":
            return self._named(node[1], env)
        if kind == "rate":
            return self._rate(node[1], env)
        arguments = [self.value(child, env) for child in node[1 + (kind == "call") :]]
        if kind == "call":
            return _FUNCTIONS[node[1]](*arguments)
        left, right = arguments
        return {
            "+": lambda: left + right,
            "-": lambda: left - right,
            "*": lambda: left * right,
            "/": lambda: left / right,
            "^": lambda: left**right,
        }[kind]()

    def _named(self, name: str, env: Env) -> Number:
        if name in env:
            return env[name]
        if name in self.definitions:
            return self.value(self.definitions[name], env)
        assert name.endswith("'"), name
        return self._rate(("name", name[:-1]), env)  # of a definition, or zero of a parameter

    def _rate(self, node: Node, env: Env) -> Number:
        def moved(time: Number) -> Number:
            there = {n: v + time * env[n + "'"] if n + "'" in env else v for n, v in env.items()}
            return self.value(node, there)

        return (moved(STEP) - moved(-STEP)) / (2 * STEP)

    def residuals(self, w: Sequence[Number], z: Mapping[str, Number]) -> list[Number]:
        """F at highest rates and algebraic unknowns w, states and inputs z."""
        env = {**self.constants, **z, **dict(zip(self.unknowns, w, strict=True))}
        return [self.value(node, env) for node in self.equations]

    def output_values(self, w: Sequence[Number], z: Mapping[str, Number]) -> list[Number]:
        """g, SI."""
        env = {**self.constants, **z, **dict(zip(self.unknowns, w, strict=True))}
        return [self.value(node, env) for node in self.outputs.values()]

    def _point(self, start: Mapping[str, Number], held: Mapping[str, Number]) -> Env:
        """States, inputs and algebraic unknowns at rest, by Newton's iteration from `start`."""
        columns = [*self.states, *self.algebraic, *self.inputs]
        at = {n: held.get(n, start[n]) for n in columns}
        free = [n for n in columns if n not in held]
        rates = len(self.unknowns) - len(self.algebraic)

        def rest(values: Sequence[Number]) -> list[Number]:
            z = {**at, **dict(zip(free, values, strict=True))}
            w = [mp.mpf(0)] * rates + [z[n] for n in self.algebraic]
            return self.residuals(w, z)

        values = [at[n] for n in free]
        present = [k for k in range(len(free)) if self._matters(rest, values, k)]
        for _ in range(12):
            if not present:
                break
            slopes = _differences(rest, values, present)
            step = mp.lu_solve(slopes, mp.matrix(rest(values)))
            for k, place in enumerate(present):
                values[place] -= step[k]
            if all(
                abs(step[k]) <= mp.mpf(10) ** -60 * (1 + abs(values[j]))
                for k, j in enumerate(present)
            ):
                break
        return {**at, **dict(zip(free, values, strict=True))}

    @staticmethod
    def _matters(
        rest: Callable[[Sequence[Number]], list[Number]], values: Sequence[Number], k: int
    ) -> bool:
        moved = [*values]
        moved[k] += mp.mpf("0.01") * (1 + abs(moved[k]))
        return rest(moved) != rest(values)

    def model(self, near: Mapping[str, float], hold: Mapping[str, object]) -> Model:
        """The linear model at the rest point near given values (in declared units).

        Args:
            near: a value of every state, algebraic unknown and input.
            hold: names held, with values as a request has them; x' of a state is held at 0.
        """
        with mp.workdps(DIGITS):
            return self._model(near, hold)

    def _model(self, near: Mapping[str, float], hold: Mapping[str, object]) -> Model:
        start = {n: mp.mpf(repr(float(v))) * self.units[n] for n, v in near.items()}
        held = {n: mp.mpf(0) for n in self.states if n.endswith("'")}
        for name, value in hold.items():
            text = value if isinstance(value, str) else repr(value)
            if re.fullmatch(r"\S+", text) and not _names(parse(text)) - {"pi"}:
                held[name] = self.value(parse(text), self.constants) * self.units[name]
            else:
                held[name] = self.quantity(text, None)
        at = self._point(start, held)
        z0 = {n: at[n] for n in (*self.states, *self.inputs)}
        rates = len(self.unknowns) - len(self.algebraic)
        w0 = [mp.mpf(0)] * rates + [at[n] for n in self.algebraic]
        columns = list(z0)
        base = list(z0.values())

        def by_z(function: Callable[..., list[Number]]) -> Number:
            return _differences(lambda v: function(w0, dict(zip(columns, v, strict=True))), base)

        Fw = _differences(lambda w: self.residuals(w, z0), w0)
        dw = -(mp.inverse(Fw) * by_z(self.residuals))
        gw = _differences(lambda w: self.output_values(w, z0), w0)
        dy = by_z(self.output_values) + gw * dw
        n, m = len(self.states), len(self.inputs)
        rows: list[list[Number]] = []
        for name in self.states:
            rate = name + "'"
            if rate in self.unknowns:
                row = [dw[self.unknowns.index(rate), j] for j in range(n + m)]
            else:
                row = [mp.mpf(int(c == rate)) for c in columns]
            scale = self.clock / self.units[name]
            rows.append([scale * v * self.units[c] for v, c in zip(row, columns, strict=True)])
        out = [
            [dy[i, j] * self.units[c] / size for j, c in enumerate(columns)]
            for i, size in enumerate(self.output_units.values())
        ]
        A = [row[:n] for row in rows]
        eigenvalues = spectrum(A)
        return Model(
            values={name: at[name] / self.units[name] for name in at},
            A=A,
            B=[row[n:] for row in rows],
            C=[row[:n] for row in out],
            D=[row[n:] for row in out],
            eigenvalues=eigenvalues,
        )


def spectrum(A: Sequence[Sequence[Number]]) -> list[Number]:
    """The eigenvalues of a matrix at the working precision (QR iteration of mpmath)."""
    if len(A) == 1:
        return [mp.mpc(A[0][0])]
    return list(mp.eig(mp.matrix([[mp.mpf(v) for v in row] for row in A]), left=False, right=False))


def _differences(
    function: Callable[[list[Number]], list[Number]],
    base: Sequence[Number],
    places: Sequence[int] | None = None,
) -> Number:
    """Central differences: a matrix of columns for `places` (all if None)."""
    places = range(len(base)) if places is None else places
    columns: list[list[Number]] = []
    for k in places:
        step = STEP * (abs(base[k]) + mp.mpf("1e-3"))
        ahead, back = [*base], [*base]
        ahead[k] += step
        back[k] -= step
        pairs = zip(function(ahead), function(back), strict=True)
        columns.append([(a - b) / (2 * step) for a, b in pairs])
    return mp.matrix(columns).T
