"""Which names the equations and outputs use, and the role each name is shown with."""

from __future__ import annotations

from typing import TYPE_CHECKING

from tangentbook.plant.grammar import parse_expression
from tangentbook.plant.program import names_in

if TYPE_CHECKING:
    from collections.abc import Iterable

    from tangentbook.calculus.graph import Graph
    from tangentbook.plant.model import Equation, Output, Parameter
    from tangentbook.plant.scope import Scope


def used_names(
    graph: Graph,
    equations: Iterable[Equation],
    outputs: Iterable[Output],
    parameters: dict[str, Parameter],
    scope: Scope,
) -> set[str]:
    """The names that equations and outputs need, directly, by a definition or by a parameter."""
    roots = [*(e.residual for e in equations), *(o.node for o in outputs)]
    used = graph.leaves(roots)
    growing = True
    while growing:
        more = graph.leaves([parameters[n].value for n in used if n in parameters]) - used
        used |= more
        growing = bool(more)
    kept = [scope.programs[k] for k in scope.equation_indices()]
    programs = [program for equation in kept for program in (equation.left, equation.right)]
    texts = [parse_expression(o.text, "output") for o in outputs]
    waiting = [name.rstrip("'") for p in (*programs, *texts) for name, _ in names_in(p)]
    while waiting:
        name = waiting.pop()
        if name in scope.definitions and name not in used:
            used.add(name)
            waiting.extend(n.rstrip("'") for n, _ in names_in(scope.definitions[name][0]))
    return used


def is_unused(name: str, role: str, used: set[str]) -> bool:
    """Whether a declared name serves nothing."""
    return role in ("parameter", "input", "definition", "algebraic") and name not in used


def role_words(
    scope: Scope, states: tuple[str, ...], outputs: Iterable[Output], used: set[str]
) -> dict[str, str]:
    """The role of every name of the plant, "unused" among them; an output's own name last."""
    roles: dict[str, str] = dict.fromkeys(states, "state")
    for name, role in scope.roles.items():
        roles[name] = "unused" if is_unused(name, role, used) else role
    for name in scope.definitions:
        roles[name] = "definition" if name in used else "unused"
    for output in outputs:
        roles.setdefault(output.name, "output")
    return roles
