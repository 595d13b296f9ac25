"""How the numbers follow from the equations: normal form, conditions of the point, partials.

Expressions are printed from the graph that was evaluated, in chain-rule form: a definition keeps
its name. Numbers of the derivation are in coherent SI; the matrices in declared units.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from flint import arb

from tangentbook.calculus.evaluate import Function
from tangentbook.calculus.typeset import latex, latex_name
from tangentbook.tools.numbers import shown
from tangentbook_reports import Code, DisplayMath, Math, bullets, heading, para, table, write
from tangentbook_reports import Document as ReportDocument

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from tangentbook.analysis.linearize import Linearization
    from tangentbook.calculus.graph import Node
    from tangentbook.plant.model import Plant
    from tangentbook_reports import Block

FULL_STATES = 6
"""Up to this many states the derivation stands in the report; beyond, in a file beside it."""

LONG = 900
"""A longer formula is not read by anybody; its value is in the table."""


def _names(plant: Plant) -> dict[Node, str]:
    """Nodes that have a name of their own: the definitions."""
    graph = plant.graph
    return {
        d.node: latex_name(d.name)
        for d in plant.definitions.values()
        if graph.op[d.node] not in ("var", "const", "pi")
    }


def _formula(left: str, right: str) -> Block:
    if len(left) + len(right) > LONG:
        return para("(too long to read; see the numbers below)")
    return DisplayMath(f"{left} = {right}")


def normal_form(plant: Plant) -> list[Block]:
    """From the equations as written to the unknown rates, block by block."""
    graph, known = plant.graph, _names(plant)
    blocks: list[Block] = [heading(3, "Equations"), para("As read:")]
    for definition in plant.definitions.values():
        body = latex(
            graph, definition.node, {n: t for n, t in known.items() if n != definition.node}
        )
        blocks.append(_formula(latex_name(definition.name), body))
    for equation in plant.equations:
        left, right = latex(graph, equation.left, known), latex(graph, equation.right, known)
        blocks.append(_formula(left, right))
    unknowns = ", ".join(plant.unknowns)
    blocks.append(heading(3, "Normal form"))
    blocks.append(
        para(
            f"Solved for {unknowns}, in this order (each block needs only what stands before it; "
            "the states and inputs are given):"
        )
    )
    for block in plant.blocks:
        blocks += _block(plant, block.equations, block.unknowns, block.solved, known)
    return blocks


def _block(
    plant: Plant,
    equations: Sequence[int],
    unknowns: Sequence[str],
    solved: Sequence[Node] | None,
    known: Mapping[Node, str],
) -> list[Block]:
    where = ", ".join(plant.equations[k].where for k in equations)
    if solved is not None:
        formulas = [
            _formula(latex_name(name), latex(plant.graph, node, known))
            for name, node in zip(unknowns, solved, strict=True)
        ]
        return [para(f"from {where}:"), *formulas]
    return [
        para(
            f"{where} fix{'es' if len(equations) == 1 else ''} {', '.join(unknowns)}"
            f"{' together' if len(unknowns) > 1 else ''}, not in closed form; the derivatives "
            "follow by implicit differentiation, ",
            Math(r"\mathrm{d}w = -F_w^{-1} (F_x \mathrm{d}x + F_u \mathrm{d}u)"),
            ".",
        )
    ]


def point_conditions(found: Linearization) -> list[Block]:
    """What was required at the point, and what that left to be found."""
    point = found.point
    conditions = point.conditions
    labels = [
        row.label if row.hold is None else conditions.asked[row.hold]
        for row in conditions.rows
        if not row.label.endswith("= 0 at rest")
    ]
    blocks: list[Block] = [
        heading(3, "Conditions of the point"),
        para("All rates are zero. The conditions:"),
        bullets(*labels),
    ]
    if conditions.free:
        blocks.append(
            para(
                f"They were solved for {', '.join(conditions.free)} by damped Newton iteration "
                "from several starts in a fixed order, then refined in 256-bit arithmetic."
            )
        )
    return blocks


def partial_derivatives(found: Linearization) -> list[Block]:
    """Every partial derivative with its value at the point, in chain-rule form."""
    from tangentbook.analysis.linear import Partials  # avoids a second evaluation path

    point, plant = found.point, found.point.plant
    partials = Partials(plant, point.constants.names)
    at_rest = {name: point.values.get(name, arb(0)) for name in plant.unknowns}
    values = [
        *point.constants.balls(),
        *(point.values[n] for n in partials.columns),
        *(at_rest[n] for n in plant.unknowns),
    ]
    at = dict(found.kinks.partials) if found.kinks.partials else partials.evaluate(values)
    known = _names(plant)
    blocks: list[Block] = [
        heading(3, "Partial derivatives"),
        para(
            "Of each equation, written as left minus right, with their values at the point in "
            "coherent SI units:"
        ),
    ]
    roots = [(f"F_{{{k + 1}}}", row) for k, row in enumerate(partials.equations)]
    roots += [
        (latex_name(o.name), row) for o, row in zip(plant.outputs, partials.outputs, strict=True)
    ]
    for label, row in roots:
        for name, node in row.items():
            left = rf"\frac{{\partial {label}}}{{\partial {latex_name(name)}}}"
            body = latex(plant.graph, node, known)
            value = _tex_number(shown(at[node]))
            if len(body) > LONG:
                blocks.append(DisplayMath(f"{left} = {value}"))
            elif body == value:
                blocks.append(DisplayMath(f"{left} = {body}"))
            else:
                blocks.append(DisplayMath(f"{left} = {body} = {value}"))
    blocks += _intermediates(found, values, partials.names)
    return blocks


def _tex_number(text: str) -> str:
    mantissa, e, exponent = text.partition("e")
    return rf"{mantissa} \cdot 10^{{{exponent}}}" if e else text


def _intermediates(
    found: Linearization, values: Sequence[arb], names: Sequence[str]
) -> list[Block]:
    plant = found.point.plant
    if not plant.definitions:
        return []
    nodes = [d.node for d in plant.definitions.values()]
    numbers = Function(plant.graph, names, nodes).balls(values)
    rows = [
        [Code(name), shown(value)] for name, value in zip(plant.definitions, numbers, strict=True)
    ]
    return [
        para("Values of the definitions at the point, in coherent SI units:"),
        table(["Definition", "Value"], rows, align="lr"),
    ]


def assembly(found: Linearization) -> list[Block]:
    """How A, B, C, D follow from the partial derivatives."""
    plant = found.point.plant
    text = (
        "The rates follow from the implicit function theorem: with the unknowns w, the equations "
        "F(w, x, u) = 0 give "
    )
    blocks: list[Block] = [
        heading(3, "Assembly"),
        para(
            text,
            Math(r"\partial w/\partial x = -F_w^{-1} F_x"),
            ", ",
            Math(r"\partial w/\partial u = -F_w^{-1} F_u"),
            ", and the outputs y = g(w, x, u) give ",
            Math(r"C = g_x + g_w \partial w/\partial x"),
            ", ",
            Math(r"D = g_u + g_w \partial w/\partial u"),
            ". A row of A for a state whose rate is itself a state is, in SI, a row of the unit "
            "matrix. An entry in SI becomes the printed one by the unit of its column over that of "
            "its row (A and B: times the unit of time).",
        ),
    ]
    if found.kinks.kind == "single-valued":
        blocks.append(para(f"{found.kinks.why}."))
    if plant.clock.text != plant.time.text:
        blocks.append(
            para(
                "No unit of the plant contains time, so rates are per unit of its time as written."
            )
        )
    return blocks


def derivation(found: Linearization, stem: str) -> tuple[list[Block], dict[str, str]]:
    """The derivation, in the report or as a file beside it (second value) for larger plants."""
    plant = found.point.plant
    blocks = [*normal_form(plant), *point_conditions(found)]
    if found.model is not None:
        blocks += [*partial_derivatives(found), *assembly(found)]
    if len(plant.states) <= FULL_STATES:
        return [heading(2, "Derivation"), *blocks], {}
    name = f"{stem}.derivation.md"
    document = ReportDocument((heading(1, f"{plant.name}: derivation"), *blocks))
    return [
        heading(2, "Derivation"),
        para(
            f"The derivation for {len(plant.states)} states stands in the file ",
            Code(name),
            " beside this report.",
        ),
    ], {"derivation.md": write(document)}
