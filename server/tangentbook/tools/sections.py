"""Sections of a report that every tool shares, in the order in which they are read.

Identity, question, answer, cautions, validity; then what the tool found; then check values, the
plant as read, and the call with its result. Nothing here computes.
"""

from __future__ import annotations

import json
from typing import TYPE_CHECKING, Any

from tangentbook._version import __version__
from tangentbook.contract.cautions import GENERAL, trade_cautions
from tangentbook.contract.identity import call_digest, plant_digest, resolved_arguments
from tangentbook.contract.plain import is_array, is_object
from tangentbook_reports import Code, Document, Fence, Strong, Text, bullets, heading, para, table

if TYPE_CHECKING:
    from tangentbook.contract.base import Model
    from tangentbook.contract.plant import Plant
    from tangentbook.tools.content import JSON, Content
    from tangentbook_reports import Block

TITLES = {
    "check-plant": "plant as understood",
    "trim": "operating point",
    "linearize": "linear model",
}


def report(tool: str, request: Model, content: Content, result: JSON) -> Document:
    """The whole document of a call."""
    plant: Plant = getattr(request, "plant")  # noqa: B009 - every request has one
    blocks: list[Block] = [heading(1, f"{plant.name}: {TITLES[tool]}")]
    blocks += _identity(tool, request, plant)
    blocks += [heading(2, "Question"), para(content.question)]
    blocks += [heading(2, "Answer"), para(Strong((Text(content.answer),)))]
    blocks += _failed(content)
    blocks += _cautions(content, plant)
    blocks += _validity(content, plant)
    blocks += content.sections
    blocks += _checks(content)
    blocks += _plant_as_read(plant, content)
    blocks += content.derivation
    blocks += _call(tool, request, result)
    return Document(tuple(blocks))


def _identity(tool: str, request: Model, plant: Plant) -> list[Block]:
    rows: list[list[Any]] = [
        ["Plant", plant.name],
        ["Revision", plant.revision or "not stated"],
        ["Source", plant.source or "not stated"],
        ["Digest of the plant (sha256)", Code(plant_digest(plant))],
        ["Tool", f"{tool}, version {__version__}"],
        ["Digest of the call (sha256)", Code(call_digest(tool, request))],
    ]
    if plant.about:
        rows.insert(1, ["About", plant.about])
    names = [p.name for p in getattr(request, "point", ()) if p.name]
    if names:
        rows.append(["Operating point", "; ".join(names)])
    return [heading(2, "Identity"), table(["Item", "Entry"], rows, align="ll")]


def _failed(content: Content) -> list[Block]:
    failed = [c for c in content.findings.checks if not c["holds"]]
    if not failed:
        return []
    items = [f"{c['point']}: {c['what']}: {c['value']:g} is beyond {c['limit']:g}" for c in failed]
    return [para(Strong((Text("Check values that failed:"),))), bullets(*items)]


def _cautions(content: Content, plant: Plant) -> list[Block]:
    blocks: list[Block] = [heading(2, "Cautions")]
    found = [c["text"] for c in content.findings.cautions]
    if found:
        blocks += [para("What was found:"), bullets(*found)]
    blocks.append(para("What always applies (common practice, not findings):"))
    blocks.append(bullets(*trade_cautions(plant.field), *GENERAL))
    return blocks


def _validity(content: Content, plant: Plant) -> list[Block]:
    blocks: list[Block] = [heading(2, "Validity and assumptions")]
    assumptions = [
        *plant.assumptions,
        *(f"{name}: {line}" for name, p in plant.parameters.items() for line in p.assumptions),
        *(f"{e.label or e.is_}: {line}" for e in plant.equations for line in e.assumptions),
    ]
    if assumptions:
        blocks += [para("Assumptions stated with the plant:"), bullets(*assumptions)]
    else:
        blocks.append(para("No assumptions were stated with the plant."))
    blocks.append(table(["Evidence", "Supplied"], _evidence(plant), align="ll"))
    blocks.append(para("Not checked here:"))
    blocks.append(bullets(*content.validity["not_checked"]))
    return blocks


def _evidence(plant: Plant) -> list[list[str]]:
    """Which evidence came with the plant (in the spirit of NASA-STD-7009A)."""
    sourced = sum(1 for p in plant.parameters.values() if p.source)
    toleranced = sum(1 for p in plant.parameters.values() if p.tolerance is not None)
    count = len(plant.parameters)
    equations = sum(1 for e in plant.equations if e.source)
    return [
        ["Source of the plant model", "yes" if plant.source else "no"],
        ["Sources of equations", f"{equations} of {len(plant.equations)}"],
        ["Sources of parameters", f"{sourced} of {count}"],
        ["Tolerances of parameters", f"{toleranced} of {count}"],
        ["Comparison with measurements of the machine", "no"],
    ]


def _checks(content: Content) -> list[Block]:
    checks = content.findings.checks
    if not checks:
        return []
    rows = [
        [
            c["point"],
            Code(c["code"]),
            c["what"],
            _small(c["value"]),
            f"{c['limit']:g}",
            "holds" if c["holds"] else Strong((Text("FAILS"),)),
        ]
        for c in checks
    ]
    return [
        heading(2, "Check values"),
        para(
            "Each number was compared with a second route; the value is the largest disagreement "
            "(relative where not said otherwise), rounded up to a power of ten."
        ),
        table(["Point", "Check", "What is compared", "Value", "Limit", ""], rows, align="lllrrl"),
    ]


def _small(value: float) -> str:
    return "0" if value == 0 else f"{value:.0e}"


def _plant_as_read(plant: Plant, content: Content) -> list[Block]:
    blocks: list[Block] = [heading(2, "The plant as read")]
    rows = [[str(k + 1), Code(e.is_), e.label, e.source] for k, e in enumerate(plant.equations)]
    blocks.append(table(["No.", "Equation", "Label", "Source"], rows, align="rlll"))
    blocks += _quantities(plant, content)
    if plant.definitions:
        rows = [
            [Code(name), Code(d.is_), d.unit or "", d.about, d.source]
            for name, d in plant.definitions.items()
        ]
        blocks.append(
            table(["Definition", "Expression", "Unit", "Meaning", "Source"], rows, align="lllll")
        )
    if plant.parameters:
        rows = [
            [Code(name), _value(p), str(p.tolerance or ""), p.about, p.source]
            for name, p in plant.parameters.items()
        ]
        blocks.append(
            table(
                ["Parameter", "Value as given", "Tolerance", "Meaning", "Source"],
                rows,
                align="lllll",
            )
        )
    return blocks


def _value(parameter: Any) -> str:  # noqa: ANN401 - a contract parameter
    value = parameter.value if parameter.value is not None else parameter.is_
    shown = value if isinstance(value, str) else format(value, "")
    return f"{shown} {parameter.unit}" if parameter.unit else str(shown)


def _quantities(plant: Plant, content: Content) -> list[Block]:
    roles: dict[str, str] = content.plant["roles"]
    declared = {**plant.states, **plant.algebraic, **plant.inputs, **plant.outputs}
    rows: list[list[Any]] = []
    for name, role in roles.items():
        if role in ("parameter", "definition") or (
            role == "unused" and name in {*plant.parameters, *plant.definitions}
        ):
            continue
        item = declared.get(name)
        word = "disturbance" if item is not None and item.role == "disturbance" else role
        rows.append(
            [
                Code(name),
                word,
                content.units.get(name) or "",
                item.about if item else "",
                item.positive if item else "",
                item.source if item else "",
            ]
        )
    header = ["Quantity", "Role", "Unit", "Meaning", "Positive sense", "Source"]
    return [table(header, rows, align="llllll")] if rows else []


def _call(tool: str, request: Model, result: JSON) -> list[Block]:
    call = {"tool": tool, "tool_version": __version__, "arguments": resolved_arguments(request)}
    return [
        heading(2, "Call and result"),
        para(
            "The first block is the call, complete in itself; the second is its result. To repeat "
            "the call and compare every number: ",
            Code("tangentbook audit REPORT"),
            ", with this file as REPORT.",
        ),
        Fence(language="json", text=json.dumps(call, ensure_ascii=False, indent=1)),
        Fence(language="json", text=compact_json(result)),
    ]


def compact_json(value: JSON) -> str:
    """JSON with one line for each short list or object, so that matrices read as matrices."""
    return _lines(value, 0)


def _lines(value: Any, depth: int) -> str:  # noqa: ANN401 - JSON
    flat = json.dumps(value, ensure_ascii=False, allow_nan=False)
    if len(flat) + depth <= 100 or not (is_object(value) or is_array(value)):
        return flat
    pad = " " * (depth + 1)
    if is_object(value):
        items = [
            f"{pad}{json.dumps(k, ensure_ascii=False)}: {_lines(v, depth + 1)}"
            for k, v in value.items()
        ]
        return "{\n" + ",\n".join(items) + "\n" + " " * depth + "}"
    return "[\n" + ",\n".join(pad + _lines(v, depth + 1) for v in value) + "\n" + " " * depth + "]"
