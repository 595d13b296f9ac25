"""The plant of a request -> the plant as written (contract models stay at the edge)."""

from __future__ import annotations

from typing import TYPE_CHECKING

from tangentbook.errors import RequestError
from tangentbook.plant.source import (
    DeclaredText,
    DefinitionText,
    EquationText,
    ParameterText,
    PlantText,
)

if TYPE_CHECKING:
    from tangentbook.contract.plant import Declaration, Parameter, Plant


def plant_text(plant: Plant) -> PlantText:
    """The plant as written.

    Raises:
        RequestError: a part of the language that this version does not handle.
    """
    _refuse_unhandled(plant)
    return PlantText(
        name=plant.name,
        time=plant.time,
        equations=tuple(
            EquationText(text=e.is_, label=e.label, source=e.source) for e in plant.equations
        ),
        algebraic=_declared(plant.algebraic),
        states=_declared(plant.states),
        inputs=_declared(plant.inputs),
        outputs=_declared(plant.outputs),
        parameters=tuple(_parameter(name, p) for name, p in plant.parameters.items()),
        definitions=tuple(
            DefinitionText(name=name, text=d.is_, unit=d.unit, about=d.about, source=d.source)
            for name, d in plant.definitions.items()
        ),
    )


def not_available(what: str, where: str, instead: str) -> RequestError:
    """Understood, but not handled by this version."""
    return RequestError(
        "request.not-available",
        f"{what} is part of the language, but this version does not handle it",
        where=where,
        hint=instead,
    )


def _refuse_unhandled(plant: Plant) -> None:
    if plant.settings:
        raise not_available(
            "settings", "plant.settings", "list the names under `inputs`, or as parameters"
        )
    if plant.tables:
        raise not_available(
            "tables", "plant.tables", "write the curve as an expression in `definitions`"
        )
    for k, equation in enumerate(plant.equations):
        if equation.numeric:
            raise not_available(
                "numeric = true",
                f"plant.equations.{k}",
                "write the equation between quantities, with unit literals as 64.94[1/s]",
            )
    for name, definition in plant.definitions.items():
        if definition.numeric:
            raise not_available(
                "numeric = true",
                f"plant.definitions.{name}",
                "write it between quantities, with unit literals as 64.94[1/s]",
            )


def _declared(group: dict[str, Declaration]) -> tuple[DeclaredText, ...]:
    return tuple(declared_text(name, item) for name, item in group.items())


def declared_text(name: str, item: Declaration) -> DeclaredText:
    """One declaration as written."""
    return DeclaredText(
        name=name,
        unit=item.unit,
        expression=item.is_,
        about=item.about,
        positive=item.positive,
        typical=item.typical,
        period=item.period,
        limits=item.limits or (None, None),
        disturbance=item.role == "disturbance",
        rest=item.rest,
        source=item.source,
    )


def _parameter(name: str, item: Parameter) -> ParameterText:
    value = item.value if item.value is not None else item.is_
    assert value is not None  # noqa: S101 - the model has exactly one of the two
    return ParameterText(
        name=name,
        value=value,
        unit=item.unit,
        about=item.about,
        tolerance=item.tolerance,
        source=item.source,
    )
