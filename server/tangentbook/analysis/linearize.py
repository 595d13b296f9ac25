"""Linearize at an operating point: model, second routes, eigenvalues, gain at rest."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from flint import arb, ctx

from tangentbook.analysis.confirm import (
    Confirmation,
    Surroundings,
    by_differences,
    by_remainder,
)
from tangentbook.analysis.gain import Gain, dc_gain
from tangentbook.analysis.kinks import Kinks, examine
from tangentbook.analysis.linear import LinearModel, Partials, SingularError, linear_model
from tangentbook.analysis.rates import Rates
from tangentbook.analysis.settings import PRECISION, SYMBOLIC_NODES
from tangentbook.analysis.spectrum import Spectrum, spectrum
from tangentbook.calculus.evaluate import Function

if TYPE_CHECKING:
    from collections.abc import Mapping

    from tangentbook.analysis.trim import OperatingPoint
    from tangentbook.plant.model import Plant


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Linearization:
    """What was found at the point; `model` is None where there is no linear model (`why`)."""

    point: OperatingPoint
    kinks: Kinks
    model: LinearModel | None
    why: str = ""
    names: tuple[str, ...] = ()
    outputs: Mapping[str, arb] | None = None
    differences: Confirmation | None = None
    remainder: Confirmation | None = None
    symbolic: Confirmation | None = None
    spectrum: Spectrum | None = None
    gain: Gain | None = None


def linearize(point: OperatingPoint, *, gain: bool = False) -> Linearization:
    """The linear model at a point, confirmed; all in SI and 256-bit balls.

    Args:
        point: from `find_point`.
        gain: whether the gain at rest is wanted.
    """
    ctx.prec = PRECISION
    plant, constants = point.plant, point.constants
    partials = Partials(plant, constants.names)
    at_rest = {name: point.values.get(name, arb(0)) for name in plant.unknowns}
    base = [*constants.balls(), *(point.values[n] for n in partials.columns)]
    values = [*base, *(at_rest[n] for n in plant.unknowns)]
    kinks = examine(partials, values)
    if kinks.kind in ("kink", "jump", "undecided"):
        return Linearization(
            point=point, kinks=kinks, model=None, why=kinks.why, names=kinks.active
        )
    at = dict(kinks.partials) if kinks.partials is not None else partials.evaluate(values)
    infinite = _infinite(partials, at)
    if infinite:
        return Linearization(
            point=point,
            kinks=kinks,
            model=None,
            why=f"a partial derivative with respect to {', '.join(infinite)} is not finite at the "
            "point (a root or a power at zero, say)",
            names=infinite,
        )
    try:
        model = linear_model(partials, at)
    except SingularError as error:
        return _singular(point, kinks, error)
    around = _surroundings(point, partials)
    return Linearization(
        point=point,
        kinks=kinks,
        model=model,
        outputs=_outputs(plant, partials, values),
        differences=by_differences(around, model),
        remainder=by_remainder(around, model),
        symbolic=_symbolic(partials, values, at) if kinks.kind == "none" else None,
        spectrum=spectrum(model) if model.states else None,
        gain=dc_gain(model) if gain else None,
    )


def _infinite(partials: Partials, at: Mapping[int, arb]) -> tuple[str, ...]:
    names = {
        name
        for row in (*partials.equations, *partials.outputs)
        for name, node in row.items()
        if not at[node].is_finite()
    }
    return tuple(sorted(names))


def _singular(point: OperatingPoint, kinks: Kinks, error: SingularError) -> Linearization:
    return Linearization(
        point=point,
        kinks=kinks,
        model=None,
        why=f"at this point {', '.join(error.equations)} cannot be solved for "
        f"{', '.join(error.unknowns)}: their Jacobian is singular there (two branches meet, or a "
        "mass matrix loses rank)",
        names=error.unknowns,
    )


def _surroundings(point: OperatingPoint, partials: Partials) -> Surroundings:
    plant = point.plant
    base = [*point.constants.balls(), *(point.values[n] for n in partials.columns)]
    return Surroundings(
        rates=Rates(plant, point.constants.names),
        base=[value.mid() for value in base],
        unknowns={n: point.values.get(n, arb(0)).mid() for n in plant.unknowns},
        columns=partials.columns,
        typical={n: _typical(point, n) for n in partials.columns},
    )


def _typical(point: OperatingPoint, name: str) -> arb:
    """The size of a quantity near the point, for the steps of the second routes."""
    variable = point.plant.variables.get(name)
    size = abs(point.values[name]).mid()
    if variable is not None and variable.typical is not None:
        size = size.max(abs(point.constants.value(variable.typical)).mid())
    if size > 0:
        return size
    unit = point.plant.unit_of(name)
    return arb(1) if unit is None else (arb(unit.factor) * arb.pi() ** unit.pi_power).mid()


def _outputs(plant: Plant, partials: Partials, values: list[arb]) -> dict[str, arb]:
    nodes = [o.node for o in plant.outputs]
    found = Function(plant.graph, partials.names, nodes).balls(values)
    return {o.name: value for o, value in zip(plant.outputs, found, strict=True)}


def _symbolic(partials: Partials, values: list[arb], at: Mapping[int, arb]) -> Confirmation | None:
    plant = partials.plant
    roots = [*(e.residual for e in plant.equations), *(o.node for o in plant.outputs)]
    if len(plant.graph.reachable(roots)) > SYMBOLIC_NODES:
        return None
    from tangentbook.calculus.symbolic import differ  # loads the symbolic library

    rows = [*partials.equations, *partials.outputs]
    value, entry = differ(
        plant.graph, roots, rows, dict(zip(partials.names, values, strict=True)), at
    )
    return Confirmation(value=value, entry=entry)
