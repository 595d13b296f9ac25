"""PlantText -> Plant: roles, orders, states, equations, outputs, solving order."""

from __future__ import annotations

from typing import TYPE_CHECKING

from tangentbook.calculus.graph import Graph
from tangentbook.errors import DeclarationError, StructureError
from tangentbook.plant.clock import clock, time_unit
from tangentbook.plant.grammar import parse_expression
from tangentbook.plant.model import Definition, Equation, Output, Parameter, Plant, Variable
from tangentbook.plant.program import names_in
from tangentbook.plant.scope import Scope, equation_place
from tangentbook.plant.structure import solve_order
from tangentbook.plant.units import Unit, parse_unit
from tangentbook.plant.usage import is_unused, role_words, used_names
from tangentbook.plant.values import read_value

if TYPE_CHECKING:
    from collections.abc import Iterable

    from tangentbook.calculus.graph import Node
    from tangentbook.plant.source import DeclaredText, ParameterText, PlantText, Scalar

MAX_STATES = 2000


def build_plant(text: PlantText) -> Plant:
    """Understand a plant.

    Raises:
        PlantError: with place and remedy, whatever is wrong first in reading order.
    """
    graph = Graph()
    scope = Scope(text, graph)
    equations = _equations(scope)
    parameters = {p.name: _parameter(graph, p, text) for p in text.parameters}
    _check_parameter_cycles(graph, parameters)
    orders = _orders(scope, equations)
    states = _state_names(scope, orders)
    unknowns = (*_rate_names(states, orders), *(d.name for d in text.algebraic))
    outputs = _outputs(scope, orders, states)
    variables = _variables(scope, states)
    time = time_unit(text.time)
    blocks = solve_order(graph, equations, unknowns)
    used = used_names(graph, equations, outputs, parameters, scope)
    definitions = _definitions(scope)
    declared = [q.unit for group in (variables, parameters, definitions) for q in group.values()]
    declared += [output.unit for output in outputs]
    return Plant(
        name=text.name,
        graph=graph,
        time=time,
        clock=clock(text, time, declared),
        variables=variables,
        parameters=parameters,
        definitions=definitions,
        outputs=outputs,
        equations=equations,
        orders=orders,
        states=states,
        inputs=tuple(d.name for d in text.inputs),
        algebraic=tuple(d.name for d in text.algebraic),
        unknowns=unknowns,
        blocks=blocks,
        roles=role_words(scope, states, outputs, used),
        unused=tuple(n for n, role in scope.roles.items() if is_unused(n, role, used)),
        undeclared=tuple(b for b in orders if text.states and scope.role_of(b) is None),
        explicit_time="t" not in scope.roles and _depends_on_time(graph, equations, outputs),
        scope=scope,
    )


def _depends_on_time(
    graph: Graph, equations: Iterable[Equation], outputs: Iterable[Output]
) -> bool:
    return "t" in graph.leaves([*(e.residual for e in equations), *(o.node for o in outputs)])


def _equations(scope: Scope) -> tuple[Equation, ...]:
    found: list[Equation] = []
    for index in scope.equation_indices():
        program, where = scope.programs[index], equation_place(scope.text, index)
        left, right = scope.lower(program.left, where), scope.lower(program.right, where)
        item = scope.text.equations[index]
        found.append(
            Equation(
                where=where,
                text=item.text.strip(),
                left=left,
                right=right,
                residual=scope.graph.sub(left, right),
                label=item.label,
                source=item.source,
            )
        )
    return tuple(found)


def _unit(text: str | None, where: str) -> Unit | None:
    return None if text is None else parse_unit(text, where=where)


def _parameter(graph: Graph, item: ParameterText, text: PlantText) -> Parameter:
    where = f"parameter {item.name}"
    declared = _unit(item.unit, where)
    names = [p.name for p in text.parameters]
    node, written = read_value(graph, item.value, unit=declared, names=names, where=where)
    unit = declared or written
    return Parameter(
        name=item.name,
        value=node,
        unit=unit,
        text=_value_text(item.value, declared if written is declared else None),
        about=item.about,
        tolerance="" if item.tolerance is None else str(item.tolerance),
        source=item.source,
    )


def _value_text(value: Scalar, unit: Unit | None) -> str:
    shown = value if isinstance(value, str) else repr(value)
    return f"{shown} {unit.text}" if unit is not None and unit.text not in ("1", "-") else shown


def _check_parameter_cycles(graph: Graph, parameters: dict[str, Parameter]) -> None:
    remaining = {name: graph.leaves([p.value]) for name, p in parameters.items()}
    while remaining:
        ready = [name for name, needs in remaining.items() if not needs & remaining.keys()]
        if not ready:
            ring = _ring(remaining)
            raise DeclarationError(
                "parameter.cycle",
                f"parameters are given by each other in a circle: {', '.join(ring)}",
                where=f"parameter {ring[0]}",
                hint="give one of them a number",
            )
        for name in ready:
            del remaining[name]


def _ring(needs: dict[str, set[str]]) -> list[str]:
    """The names of a circle, without those that only lead into it."""
    path = [next(iter(needs))]
    while True:
        needed = next(name for name in needs if name in needs[path[-1]])
        if needed in path:
            return path[path.index(needed) :]
        path.append(needed)


def _orders(scope: Scope, equations: Iterable[Equation]) -> dict[str, int]:
    """Base name of each state -> order of its highest rate, by first occurrence.

    Raises:
        ExpressionError: a name that nothing explains.
        StructureError: a declared state without a rate.
    """
    leaves = scope.graph.leaves([e.residual for e in equations])
    found: dict[str, int] = {}
    rated = {name.rstrip("'") for name in leaves if name.endswith("'")}
    for name in dict.fromkeys((*_order_of_appearance(scope), *sorted(leaves))):
        base = name.rstrip("'")
        if len(name) > len(base) and name in leaves:
            found[base] = max(found.get(base, 0), len(name) - len(base))
        elif scope.roles.get(base) == "state" or base in rated:
            found.setdefault(base, 0)
    for item in scope.text.states:
        base = item.name.rstrip("'")
        if not found.get(base):
            raise StructureError(
                "structure.state-without-rate",
                f"state {base} has no rate {base}' in any equation",
                where=f"state {item.name}",
                hint=f"add its equation {base}' = …, or list {base} under `algebraic`",
            )
    _check_explained(scope, found, leaves)
    return found


def _order_of_appearance(scope: Scope) -> list[str]:
    names: list[str] = []
    for index in scope.equation_indices():
        program = scope.programs[index]
        names.extend(name for name, _ in (*names_in(program.left), *names_in(program.right)))
    return names


def _check_explained(scope: Scope, orders: dict[str, int], leaves: set[str]) -> None:
    everything = leaves | scope.graph.leaves(scope.nodes.values())
    for name, place in scope.first_seen.items():
        if name not in everything or scope.role_of(name) is not None or name in orders:
            continue
        if name != "t":
            raise scope.undeclared(name, place)


def _state_names(scope: Scope, orders: dict[str, int]) -> tuple[str, ...]:
    """The state vector: declared order, else first appearance; x then x' unless x' is listed."""
    listed = [d.name for d in scope.text.states]
    bases = [n.rstrip("'") for n in listed]
    result: list[str] = []
    for name, base in zip(listed, bases, strict=True):
        if name == base or base not in listed:
            own = [base + "'" * k for k in range(orders[base])]
            result.extend(n for n in own if n == name or n not in listed)
            if name == base:
                continue
        if len(name) - len(base) >= orders[base]:
            raise DeclarationError(
                "name.rate",
                f"{name} is the highest rate of {base}, not a state",
                where=f"state {name}",
                hint=f"list {base} only" + (f" up to {base + chr(39) * (orders[base] - 1)}"),
            )
        if name not in result:
            result.append(name)
    result.extend(
        base + "'" * k for base, order in orders.items() if base not in bases for k in range(order)
    )
    unique = tuple(dict.fromkeys(result))
    if len(unique) > MAX_STATES:
        raise StructureError(
            "structure.size",
            f"{len(unique)} states; at most {MAX_STATES} are handled",
            where="equations",
            hint="split the plant",
        )
    return unique


def _rate_names(states: tuple[str, ...], orders: dict[str, int]) -> list[str]:
    bases = dict.fromkeys(name.rstrip("'") for name in states)
    return [base + "'" * orders[base] for base in bases]


def _outputs(scope: Scope, orders: dict[str, int], states: tuple[str, ...]) -> tuple[Output, ...]:
    if not scope.text.outputs:
        units = {d.name: d.unit for d in scope.text.states}
        return tuple(
            Output(
                name=name,
                node=scope.graph.var(name),
                text=name,
                unit=_unit(units.get(name), f"state {name}"),
            )
            for name in states
        )
    return tuple(read_output(scope, item, orders) for item in scope.text.outputs)


def read_output(scope: Scope, item: DeclaredText, orders: dict[str, int]) -> Output:
    """An output of the plant or of a call.

    Raises:
        DeclarationError: its name already means something else.
        StructureError: it would need the rate of an input (improper).
    """
    where = f"output {item.name}"
    text = item.expression if item.expression is not None else item.name
    taken = scope.role_of(item.name.rstrip("'")) or (item.name.rstrip("'") in orders and "state")
    if taken and text.strip() != item.name:
        raise DeclarationError(
            "name.two-roles",
            f"{item.name} is a {taken} and the name of an output that is something else ({text})",
            where=where,
            hint="rename the output",
        )
    node = scope.lower(parse_expression(text, where), where)
    _check_proper(scope, node, item.name, text, orders)
    unit = _unit(item.unit, where)
    plain = _plain_unit(scope, text.strip())
    if unit is None:
        unit = plain
    elif plain is not None and plain.dimension != unit.dimension:
        raise DeclarationError(
            "unit.dimension",
            f"output {item.name} is {text.strip()}, which is in {plain.text}; {unit.text} is not "
            "of that kind",
            where=where,
            hint="give it a unit of the same kind (Hz and rpm count cycles, rad/s does not)",
        )
    return Output(name=item.name, node=node, text=text.strip(), unit=unit, about=item.about)


def _plain_unit(scope: Scope, name: str) -> Unit | None:
    """The unit of an output that is just a declared quantity."""
    text = scope.text
    for item in (*text.states, *text.inputs, *text.algebraic, *text.definitions):
        if item.name == name and item.unit is not None:
            return parse_unit(item.unit)
    return None


def _check_proper(scope: Scope, node: Node, name: str, text: str, orders: dict[str, int]) -> None:
    for leaf in sorted(scope.graph.leaves([node])):
        base = leaf.rstrip("'")
        order = len(leaf) - len(base)
        if base in orders and order > orders[base]:
            highest = base + "'" * orders[base]
            raise StructureError(
                "structure.improper-output",
                f"output {name} = {text} needs {leaf}, beyond the highest rate {highest} of the "
                "equations: it would contain the rate of an input (improper)",
                where=f"output {name}",
                hint=f"take an output of at most {highest}, or give the sensor its own lag",
            )
        if base not in orders and scope.role_of(base) is None and leaf != "t":
            raise scope.undeclared(leaf, scope.first_seen.get(base, f"output {name}"))


def _variables(scope: Scope, states: tuple[str, ...]) -> dict[str, Variable]:
    text = scope.text
    declared = {d.name: d for d in (*text.states, *text.inputs, *text.algebraic)}
    found: dict[str, Variable] = {}
    for name in states:
        if name in declared:
            found[name] = _variable(scope, declared[name], "state")
        elif name.endswith("'"):
            continue
        else:
            found[name] = Variable(name=name, role="state")
    for role, group in (("input", text.inputs), ("algebraic", text.algebraic)):
        for item in group:
            found[item.name] = _variable(scope, item, role)
    return found


def _variable(scope: Scope, item: DeclaredText, role: str) -> Variable:
    where = f"{role} {item.name}"
    unit = _unit(item.unit, where)
    names = [p.name for p in scope.text.parameters]

    def read(value: Scalar | None, what: str) -> Node | None:
        if value is None:
            return None
        place = f"{where}, {what}"
        return read_value(scope.graph, value, unit=unit, names=names, where=place)[0]

    return Variable(
        name=item.name,
        role=role,
        unit=unit,
        about=item.about,
        positive=item.positive,
        source=item.source,
        typical=read(item.typical, "typical"),
        period=read(item.period, "period"),
        lower=read(item.limits[0], "limits"),
        upper=read(item.limits[1], "limits"),
        disturbance=item.disturbance,
        rest=read(item.rest, "rest"),
    )


def _definitions(scope: Scope) -> dict[str, Definition]:
    declared = {d.name: d for d in scope.text.definitions}
    found: dict[str, Definition] = {}
    for name, (_, where, index) in scope.definitions.items():
        item = declared.get(name)
        text = item.text if item is not None else _right_side(scope, index)
        found[name] = Definition(
            name=name,
            node=scope.nodes[name],
            text=text,
            unit=_unit(item.unit, where) if item is not None else None,
            about=item.about if item is not None else "",
            source=item.source if item is not None else "",
            equation=index,
        )
    return found


def _right_side(scope: Scope, index: int | None) -> str:
    return "" if index is None else scope.text.equations[index].text.partition("=")[2].strip()
