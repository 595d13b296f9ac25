"""What all tools do first: the plant as understood, its summary, the points asked for."""

from __future__ import annotations

from typing import TYPE_CHECKING

from tangentbook.analysis.conditions import PointText
from tangentbook.contract.identity import plant_id
from tangentbook.plant.build import build_plant
from tangentbook.tools.content import Findings
from tangentbook.tools.convert import not_available, plant_text
from tangentbook.tools.scales import Scales

if TYPE_CHECKING:
    from tangentbook.contract.plant import Plant as PlantModel
    from tangentbook.contract.point import Point
    from tangentbook.plant.model import Plant
    from tangentbook.tools.content import JSON

_NOT_CHECKED = (
    "units were converted, not checked against each other term by term",
    "existence and uniqueness of the point were not proved",
    "the size of deviations for which the linear model holds was not examined",
    "tolerances of the parameters were not propagated",
)


def understand_plant(model: PlantModel) -> tuple[Plant, Scales, Findings]:
    """Build the plant and note what is odd about it."""
    plant = build_plant(plant_text(model))
    findings = Findings()
    if plant.unused:
        names = list(plant.unused)
        findings.caution(
            "unused-name",
            names,
            f"declared but used by no equation or output: {', '.join(names)}.",
        )
    if plant.undeclared:
        names = list(plant.undeclared)
        findings.caution(
            "undeclared-state",
            names,
            f"states that the equations have but `states` does not list: {', '.join(names)}.",
        )
    if plant.explicit_time:
        findings.caution(
            "explicit-time",
            ["t"],
            "the equations contain the time t explicitly: nothing is at rest.",
        )
    return plant, Scales(plant), findings


def plant_summary(model: PlantModel, plant: Plant) -> JSON:
    """The `plant` of a result."""
    return {"name": plant.name, "id": plant_id(model), "roles": dict(plant.roles)}


def validity(model: PlantModel, findings: Findings, *more: str) -> JSON:
    """What an answer holds for (stated tolerances stand beside it), and what was not looked at."""
    tolerances = {
        name: {"tolerance": str(p.tolerance)}
        for name, p in model.parameters.items()
        if p.tolerance is not None
    }
    return {
        "amplitude": [],
        "duration": None,
        "parameters": tolerances,
        "not_checked": [*findings.not_checked, *_NOT_CHECKED, *more],
    }


def unit_texts(plant: Plant, scales: Scales) -> dict[str, str | None]:
    """The units of states, algebraic unknowns, inputs and outputs by name."""
    return {
        **{o.name: scales.output_text(o.name) for o in plant.outputs},
        **{n: scales.text(n) for n in (*plant.states, *plant.algebraic, *plant.inputs)},
    }


def point_text(point: Point) -> PointText:
    """The point of a request as plain values.

    Raises:
        RequestError: a part of the language that this version does not handle.
    """
    _refuse_unhandled(point)
    return PointText(
        name=point.name,
        hold=tuple((h.is_, h.equals) for h in point.hold),
        find=point.find,
        guess=point.guess,
        within=point.within,
        set=point.set,
    )


def _refuse_unhandled(point: Point) -> None:
    refusals = (
        (point.moving, "moving", "hold what is constant; a steady motion needs a later version"),
        (point.frozen, "frozen", "make the frozen quantity a parameter"),
        (point.least is not None, "least", "hold the quantity that shall be least"),
        (point.most is not None, "most", "hold the quantity that shall be greatest"),
        (point.every, "every", "ask for one point each with a guess"),
    )
    for asked, name, instead in refusals:
        if asked:
            raise not_available(f"`{name}`", f"point.{name}", instead)
