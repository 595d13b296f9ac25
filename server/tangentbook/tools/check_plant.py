"""check-plant: how a plant was understood."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from tangentbook.calculus.derive import gradients
from tangentbook.calculus.typeset import plain_text
from tangentbook.tools.content import Content
from tangentbook.tools.derivation import normal_form
from tangentbook.tools.numbers import plural
from tangentbook.tools.understood import plant_summary, understand_plant, unit_texts
from tangentbook_reports import Code, heading, para, table

if TYPE_CHECKING:
    from tangentbook.contract.requests import CheckPlant
    from tangentbook.plant.model import Plant
    from tangentbook.tools.content import JSON
    from tangentbook_reports import Block

SHOWN_STATES = 12
MAX_SOLVED_TEXT = 400


def run(request: CheckPlant) -> Content:
    """Answer a check-plant call."""
    model: Any = request.plant
    plant, scales, findings = understand_plant(model)
    units = unit_texts(plant, scales)
    summary: JSON = plant_summary(model, plant) | {
        "states": list(plant.states),
        "inputs": list(plant.inputs),
        "outputs": [o.name for o in plant.outputs],
        "algebraic": list(plant.algebraic),
        "units": units,
        "normal_form": _normal_form(plant),
    }
    if not any(units.values()):
        findings.caution(
            "no-units",
            [],
            "no units were declared: numbers are taken as given, in one coherent set.",
        )
    answer = (
        f"The plant was understood: {plural(len(plant.states), 'state')}, "
        f"{plural(len(plant.inputs), 'input')}, {plural(len(plant.outputs), 'output')}"
        + (f", {plural(len(plant.algebraic), 'algebraic unknown')}" if plant.algebraic else "")
        + f"; {_kind(plant)}. Later calls may refer to it as {summary['id']}."
    )
    blocks = _sections(plant, summary)
    derivation: list[Block] = []
    if len(plant.states) <= SHOWN_STATES:
        derivation = [heading(2, "Derivation"), *normal_form(plant)]
    return Content(
        outcome="done",
        answer=answer,
        question="How is this plant understood, and is anything missing?",
        plant=summary,
        units=units,
        points=[],
        findings=findings,
        validity={
            "amplitude": [],
            "duration": None,
            "parameters": {},
            "not_checked": [
                "units were converted, not checked against each other term by term",
                "no operating point was sought and no value computed",
            ],
        },
        sections=blocks,
        derivation=derivation,
        files={},
        short=_short(plant, answer, [c["text"] for c in findings.cautions]),
    )


def _kind(plant: Plant) -> str:
    coupled = [b for b in plant.blocks if len(b.equations) > 1]
    if not coupled and all(b.linear for b in plant.blocks):
        return "every equation is solved for its own unknown"
    sizes = ", ".join(str(len(b.unknowns)) for b in coupled)
    implicit = sum(1 for b in plant.blocks if not b.linear)
    parts: list[str] = []
    if coupled:
        parts.append(f"coupled unknowns are solved together (blocks of {sizes})")
    if implicit:
        parts.append(f"{plural(implicit, 'block')} not linear in the unknowns")
    return "; ".join(parts)


def _normal_form(plant: Plant) -> JSON:
    blocks: list[JSON] = []
    for block in plant.blocks[:60]:
        entry: JSON = {
            "equations": [plant.equations[k].where for k in block.equations],
            "unknowns": list(block.unknowns),
            "linear": block.linear,
        }
        if block.solved is not None:
            solved = [plain_text(plant.graph, node) for node in block.solved]
            if all(len(text) <= MAX_SOLVED_TEXT for text in solved):
                entry["solved"] = solved
        blocks.append(entry)
    return {"unknowns": list(plant.unknowns), "blocks": blocks, "structure": _structure(plant)}


def _structure(plant: Plant) -> JSON:
    """Sparsity of the equations: what grows with the plant."""
    wanted = [*plant.states, *plant.inputs, *plant.unknowns]
    found = gradients(plant.graph, [e.residual for e in plant.equations], wanted)
    return {
        "nodes": len(plant.graph.reachable([e.residual for e in plant.equations])),
        "partial_derivatives": sum(len(row) for row in found),
    }


def _sections(plant: Plant, summary: JSON) -> list[Block]:
    rows: list[list[Any]] = [
        ["States, in order", ", ".join(plant.states)],
        ["Inputs", ", ".join(plant.inputs) or "none"],
        ["Outputs", ", ".join(f"{o.name} = {o.text}" for o in plant.outputs)],
        ["Algebraic unknowns", ", ".join(plant.algebraic) or "none"],
        ["Unit of time", plant.time.text],
        ["Nodes of the expression graph", str(summary["normal_form"]["structure"]["nodes"])],
    ]
    return [
        heading(2, "The plant as understood"),
        table(["Item", "Entry"], rows, align="ll"),
        para("Refer to this plant in later calls by the id ", Code(summary["id"]), "."),
    ]


def _short(plant: Plant, answer: str, cautions: list[str]) -> str:
    lines = [answer, f"states: {', '.join(plant.states[:40])}"]
    if plant.inputs:
        lines.append(f"inputs: {', '.join(plant.inputs[:40])}")
    lines.append(f"outputs: {', '.join(o.name for o in plant.outputs[:40])}")
    lines += [f"caution: {text}" for text in cautions]
    return "\n".join(lines)
