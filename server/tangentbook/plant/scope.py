"""Who a name is: the roles declared, the definitions found, and what a name with primes means."""

from __future__ import annotations

from typing import TYPE_CHECKING

from tangentbook.calculus.derive import rate
from tangentbook.errors import DeclarationError, ExpressionError, nearest
from tangentbook.plant.grammar import parse_equation, parse_expression
from tangentbook.plant.lower import Lowering
from tangentbook.plant.program import FUNCTIONS, RESERVED, EquationProgram, Program, names_in

if TYPE_CHECKING:
    from collections.abc import Iterable

    from tangentbook.calculus.graph import Graph, Node
    from tangentbook.plant.source import PlantText


_SPELLED = {
    "π": "write pi",
    "e": "e is an ordinary name; powers of the number e are written exp(…)",
}
"""What some undeclared names were meant to be."""


def equation_place(text: PlantText, index: int) -> str:
    """How messages call an equation: by number and label."""
    label = text.equations[index].label
    return f"equation {index + 1} ({label})" if label else f"equation {index + 1}"


class Scope:
    """Names of one plant: declared roles, parsed definitions and equations, and their nodes."""

    def __init__(self, text: PlantText, graph: Graph) -> None:
        self.text = text
        self.graph = graph
        self.roles: dict[str, str] = {}
        self._declare()
        self.programs = [
            parse_equation(item.text, equation_place(text, k))
            for k, item in enumerate(text.equations)
        ]
        self.definitions: dict[str, tuple[Program, str, int | None]] = {}
        self._collect_definitions()
        self.nodes: dict[str, Node] = {}
        self.first_seen: dict[str, str] = {}
        self._lower_definitions()

    # roles

    def _declare(self) -> None:
        text = self.text
        groups = (
            ("algebraic", [d.name for d in text.algebraic]),
            ("state", [d.name for d in text.states]),
            ("input", [d.name for d in text.inputs]),
            ("parameter", [p.name for p in text.parameters]),
            ("definition", [d.name for d in text.definitions]),
        )
        for role, names in groups:
            for name in names:
                self._declare_one(name, role)

    def _declare_one(self, name: str, role: str) -> None:
        base = name.rstrip("'")
        if not base.isidentifier() or base in RESERVED:
            problem = "is a reserved word" if base in RESERVED else "is not a name"
            raise DeclarationError(
                "name.form",
                f"{name!r} {problem}",
                where=f"{role} {name}",
                hint="a name is letters, digits and _, beginning with a letter",
            )
        if base != name and role != "state":
            raise DeclarationError(
                "name.rate",
                f"{name} is a rate; only states may list their rates",
                where=f"{role} {name}",
                hint=f"declare {base}",
            )
        earlier = self.roles.get(name)
        if earlier is not None:
            raise DeclarationError(
                "name.two-roles",
                f"{name} is declared as {earlier} and as {role}",
                where=name,
                hint="keep one of the two declarations, or rename one of the quantities",
            )
        self.roles[name] = role

    def role_of(self, name: str) -> str | None:
        """The declared role of a base name, or "definition" for one found in the equations."""
        if name in self.definitions:
            return "definition"
        role = self.roles.get(name)
        if role is None and name + "'" in self.roles:
            return "state"
        return role

    # definitions

    def _collect_definitions(self) -> None:
        for item in self.text.definitions:
            where = f"definition {item.name}"
            self.definitions[item.name] = (parse_expression(item.text, where), where, None)
        for index, program in enumerate(self.programs):
            name = self._defined_name(program)
            if name is None:
                continue
            where = equation_place(self.text, index)
            if name in self.definitions:
                raise DeclarationError(
                    "name.defined-twice",
                    f"{name} is defined by {self.definitions[name][1]} and by {where}",
                    where=where,
                    hint=f"if {name} is an unknown, list it under `algebraic` or `states`",
                )
            self.definitions[name] = (program.right, where, index)

    def _defined_name(self, program: EquationProgram) -> str | None:
        """The one undeclared name at the left of an equation, which makes it a definition."""
        if len(program.left) != 1:
            return None
        (step,) = program.left
        if step.op != "name" or step.count or self.roles.get(step.text) is not None:
            return None
        return None if step.text + "'" in self.roles else step.text

    def equation_indices(self) -> list[int]:
        """The equations that are not definitions."""
        defining = {index for _, _, index in self.definitions.values()}
        return [k for k in range(len(self.programs)) if k not in defining]

    def _lower_definitions(self) -> None:
        for name in self._definition_order():
            program, where, _ = self.definitions[name]
            self.nodes[name] = self.lower(program, where)

    def _definition_order(self) -> list[str]:
        """Definitions so that each stands behind those it uses.

        Raises:
            DeclarationError: a cycle, with its names in order.
        """
        uses = {
            name: [
                used.rstrip("'")
                for used, _ in names_in(program)
                if used.rstrip("'") in self.definitions
            ]
            for name, (program, _, _) in self.definitions.items()
        }
        order: list[str] = []
        state: dict[str, int] = {}
        for root in uses:
            stack: list[tuple[str, int]] = [(root, 0)]
            while stack:
                name, position = stack.pop()
                if position == 0:
                    if state.get(name) == 2:
                        continue
                    state[name] = 1
                if position < len(uses[name]):
                    stack.append((name, position + 1))
                    used = uses[name][position]
                    if state.get(used) == 1:
                        raise self._cycle([n for n, _ in stack], used)
                    if state.get(used) != 2:
                        stack.append((used, 0))
                else:
                    state[name] = 2
                    order.append(name)
        return order

    def _cycle(self, path: list[str], back: str) -> DeclarationError:
        ring = [*path[path.index(back) :], back]
        return DeclarationError(
            "definition.cycle",
            f"definitions go round in a circle: {' -> '.join(ring)}",
            where=self.definitions[back][1],
            hint=f"if {back} is an unknown of the equations, list it under `algebraic` or `states`",
        )

    # nodes

    def lower(self, program: Program, where: str) -> Node:
        """The node of a program within this scope."""
        return Lowering(self.graph, self._resolve, self._rate_of).node(program, where)

    def _resolve(self, name: str, primes: int, place: str) -> Node:
        if name in self.nodes:
            node = self.nodes[name]
            for _ in range(primes):
                node = rate(self.graph, node, lambda base: self._rate_of(base, place))
            return node
        role = self.roles.get(name)
        if primes:
            self._refuse_rate(name, role, place)
        self.first_seen.setdefault(name, place)
        return self.graph.var(name + "'" * primes)

    def _rate_of(self, name: str, place: str) -> Node:
        base = name.rstrip("'")
        role = self.roles.get(base)
        if role == "parameter":
            return self.graph.const(0)
        if base == "t" and role is None:
            return self.graph.const(1)
        self._refuse_rate(base, role, place)
        return self.graph.var(name + "'")

    def _refuse_rate(self, name: str, role: str | None, place: str) -> None:
        if role == "input":
            raise ExpressionError(
                "expression.rate-of-input",
                f"the rate of input {name} is not a quantity of the plant",
                where=place,
                hint=f"make {name} a state with an equation of its own (a lag, say), driven by a "
                f"new input, or shift the rate into a new state such as z = x - c*{name}",
            )
        if role == "algebraic":
            raise ExpressionError(
                "expression.rate-of-algebraic",
                f"{name} is declared algebraic, so its rate does not occur",
                where=place,
                hint=f"declare {name} under `states`, or write the equation without {name}'",
            )
        if role == "parameter":
            raise ExpressionError(
                "expression.rate-of-parameter",
                f"{name} is a parameter: it is constant",
                where=place,
                hint=f"remove the prime, or declare {name} under `states`",
            )

    def _primed(self) -> list[str]:
        """Base names that occur with a prime: undeclared states."""
        names = {
            name
            for program in self.programs
            for name, _ in (*names_in(program.left), *names_in(program.right))
        }
        return sorted({name.rstrip("'") for name in names if name.endswith("'")})

    def _meant_as_rate(self, name: str, known: list[str]) -> str:
        """The quantity whose rate a name like dx or xdot was meant to be, "" for none."""
        spelled = (f"d{name}", f"d{name}dt", f"d{name}_dt", f"{name}dot", f"{name}_dot")
        if any(form in self.definitions for form in spelled):
            return name
        if name == "dt":
            return "x"
        base = name[1:] if name.startswith("d") else ""
        return base if base in known or "dt" in self.first_seen else ""

    def undeclared(self, name: str, place: str, *, also: Iterable[str] = ()) -> ExpressionError:
        """The error for a name that no declaration and no equation explains."""
        known = [*self.roles, *self.definitions, *self._primed(), *also]
        hint = nearest(name, known)
        rate_of = self._meant_as_rate(name, known)
        if rate_of:
            hint = f"a rate is written {rate_of}' or d({rate_of})/dt"
        elif name in _SPELLED:
            hint = _SPELLED[name]
        elif name in FUNCTIONS:
            hint = f"{name} is a function: write {name}(…)"
        elif not hint.startswith("did you mean"):
            declare = f"declare {name} under `parameters`, `inputs` or `algebraic`"
            hint = f"{declare}; {hint}" if hint else declare
        return ExpressionError(
            "expression.undeclared",
            f"{name} is not declared, and no equation defines it or its rate",
            where=place,
            hint=hint,
        )
