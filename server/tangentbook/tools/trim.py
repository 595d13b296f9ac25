"""trim: the operating point, its margins, and how it moves with the parameters."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from tangentbook.analysis.sensitivity import sensitivities
from tangentbook.analysis.trim import NoPoint, OperatingPoint
from tangentbook.tools.content import Content
from tangentbook.tools.derivation import FULL_STATES, normal_form
from tangentbook.tools.located import (
    locate,
    no_point_line,
    point_line,
    point_section,
    question,
    worst_outcome,
)
from tangentbook.tools.numbers import shown_float
from tangentbook.tools.points import quantity, sensitivity_result
from tangentbook.tools.understood import plant_summary, understand_plant, unit_texts, validity
from tangentbook_reports import Code, heading, para, table

if TYPE_CHECKING:
    from tangentbook.contract.requests import Trim
    from tangentbook.tools.content import Findings
    from tangentbook.tools.located import Located
    from tangentbook.tools.scales import Scales
    from tangentbook_reports import Block


def run(request: Trim) -> Content:
    """Answer a trim call."""
    model: Any = request.plant
    plant, scales, findings = understand_plant(model)
    points = locate(plant, scales, findings, request.point)
    sections: list[Block] = []
    for located in points:
        sections += point_section(located)
        if isinstance(located.found, OperatingPoint):
            sections += _sensitivity(located, scales)
    entries = [p.entry for p in points]
    answer = " ".join(answer_line(p, scales, findings) for p in points)
    derivation: list[Block] = []
    if len(plant.states) <= FULL_STATES:
        derivation = [heading(2, "Derivation"), *normal_form(plant)]
    cautions = [f"caution: {c['text']}" for c in findings.cautions]
    return Content(
        outcome=worst_outcome(entries),
        answer=answer,
        question=question(request.point, "Where are the equations at rest"),
        plant=plant_summary(model, plant),
        units=unit_texts(plant, scales),
        points=entries,
        findings=findings,
        validity=validity(model, findings),
        sections=sections,
        derivation=derivation,
        files={},
        short="\n".join([*(point_line(p, scales) for p in points), *cautions]),
    )


def answer_line(located: Located, scales: Scales, findings: Findings) -> str:
    """The answer about one point, with its scope."""
    if isinstance(located.found, NoPoint):
        return no_point_line(located) + "."
    point = located.found
    free = list(point.conditions.free)[:4]
    values = ", ".join(quantity(scales, n, point.values[n]) for n in free)
    found = f" at {values}" if values else ""
    how = "computed twice, not shown to be the only such point"
    if not findings.confirmed(("point.residual",), point=located.entry["id"]):
        how = "BUT THIS IS NOT CONFIRMED: see the check values and cautions"
    return f"{located.title}: the equations as stated are at rest{found}; {how}."


def _sensitivity(located: Located, scales: Scales) -> list[Block]:
    point = located.found
    assert isinstance(point, OperatingPoint)  # noqa: S101 - the caller looked
    found = sensitivities(point)
    if not found:
        return []
    units = {n: scales.unit(n) for n in point.constants.names}
    rows = sensitivity_result(found, scales, units)
    located.entry["sensitivity"] = rows
    body: list[list[Any]] = [
        [Code(name), Code(p), shown_float(value), _unit(scales, name, p)]
        for name, row in rows.items()
        for p, value in row.items()
    ]
    if not body:
        return []
    return [
        heading(3, "How the point moves with the parameters"),
        para("First derivatives at the point; derived parameters and held values move along."),
        table(["Quantity", "Parameter", "Derivative", "Unit"], body, align="llrl"),
    ]


def _unit(scales: Scales, name: str, parameter: str) -> str:
    above, below = scales.text(name) or "1", scales.text(parameter) or "1"
    if below in ("1", "-"):
        return "" if above in ("1", "-") else above
    return f"{above} per {below}"
