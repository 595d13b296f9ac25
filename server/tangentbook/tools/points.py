"""Operating points as results: values with units, margins, what is assumed or redundant."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from flint import arb

from tangentbook.analysis.constants import exact_text
from tangentbook.analysis.settings import (
    MULTIPLE_ROOT_LIMIT,
    POINT_LIMIT,
    REFINED_RESIDUAL_LIMIT,
    RESIDUAL_LIMIT,
)
from tangentbook.tools.numbers import rounded, shown, shown_float
from tangentbook.tools.scales import size

if TYPE_CHECKING:
    from collections.abc import Mapping

    from tangentbook.analysis.trim import NoPoint, OperatingPoint
    from tangentbook.tools.content import JSON, Findings
    from tangentbook.tools.scales import Scales

ILL_CONDITIONED = 1e8
"""Above this condition number half the digits of double precision are gone (common practice)."""


def point_result(
    point: OperatingPoint, scales: Scales, findings: Findings, *, place: tuple[int, str, str]
) -> JSON:
    """The entry of `points` for a point that was found; checks and cautions go to `findings`.

    Args:
        point: the point.
        scales: declared units.
        findings: where checks and cautions are collected.
        place: index of the request, id of the point, name given to it.
    """
    index, ident, name = place
    values = {n: _value(point, scales, n) for n in point.conditions.columns}
    _checks(point, scales, findings, ident)
    _cautions(point, scales, findings, ident)
    return {
        "request": index,
        "id": ident,
        **({"name": name} if name else {}),
        "outcome": "done",
        "kind": "equilibrium",
        "known": "computed twice" if point.conditions.free else "exact",
        "redundant": list(point.redundant),
        "dropped": [],
        "values": values,
        "rates": {},
        "conditioning": _number(point.conditioning),
        "margins": margins(point, scales),
    }


def _number(value: float) -> float | None:
    return None if value == float("inf") else float(rounded(arb(value), 3))


def _value(point: OperatingPoint, scales: Scales, name: str) -> JSON:
    conditions = point.conditions
    value: JSON = {"value": rounded(scales.value(name, point.values[name]))}
    value["unit"] = scales.text(name)
    if name in conditions.fixed:
        value["known"] = "exact"
        exact = _exact(point, scales, name)
        if exact is not None:
            value["exact"] = exact
    else:
        value["known"] = "assumed" if name in conditions.assumed else "computed twice"
    return value


def _exact(point: OperatingPoint, scales: Scales, name: str) -> str | None:
    """The exact value in the declared unit, where it is short."""
    graph = point.plant.graph
    unit = scales.unit(name)
    node = point.conditions.fixed[name]
    if unit is not None:
        if unit.offset != 0:
            node = graph.sub(node, graph.const(unit.offset))
        node = graph.div(node, graph.const(unit.factor))
        if unit.pi_power:
            return exact_text(point.plant, point.constants, node, without_pi=unit.pi_power)
    return exact_text(point.plant, point.constants, node)


def margins(point: OperatingPoint, scales: Scales) -> list[JSON]:
    """Distances from declared limits, upper then lower, in the order of the quantities."""
    found: list[JSON] = []
    for name in point.conditions.columns:
        variable = point.plant.variables.get(name)
        if variable is None:
            continue
        for side, node in (("upper", variable.upper), ("lower", variable.lower)):
            if node is None:
                continue
            limit = point.constants.value(node)
            distance = point.values[name] - limit if side == "lower" else limit - point.values[name]
            found.append(
                {
                    "name": name,
                    "side": side,
                    "limit": rounded(scales.value(name, limit)),
                    "margin": rounded(distance / scales.per(name)),
                    "unit": scales.text(name),
                }
            )
    return found


def _checks(point: OperatingPoint, scales: Scales, findings: Findings, ident: str) -> None:
    limit = REFINED_RESIDUAL_LIMIT if point.settled else RESIDUAL_LIMIT
    findings.check("point.residual", point.residual, limit, point=ident)
    if not point.conditions.free:
        return
    worst = 0.0
    for name in point.conditions.free:
        refined = float(point.values[name].mid())
        scale = max(abs(refined), float(scales.per(name).mid()))
        worst = max(worst, abs(point.first[name] - refined) / scale)
    # at a multiple root double precision keeps only a part of its digits
    limit = MULTIPLE_ROOT_LIMIT if point.singular else POINT_LIMIT
    findings.check("point.second-route", worst, limit, point=ident)


def _cautions(point: OperatingPoint, scales: Scales, findings: Findings, ident: str) -> None:
    conditions = point.conditions
    if conditions.assumed:
        names = list(conditions.assumed)
        findings.caution(
            "assumed",
            names,
            f"{ident}: no condition depends on {', '.join(names)}; the guess, else 0, was taken, "
            "and the linear model is the same for every value.",
        )
    if point.redundant:
        findings.caution(
            "redundant",
            list(point.redundant),
            f"{ident}: {', '.join(point.redundant)} already follow"
            f"{'s' if len(point.redundant) == 1 else ''} from the other conditions (they agree).",
        )
    if point.singular:
        findings.caution(
            "singular-point",
            list(conditions.free),
            f"{ident}: the conditions are singular at this point (a double root or a limit point): "
            "small changes of the plant move it far or make it vanish.",
        )
    elif point.conditioning > ILL_CONDITIONED:
        findings.caution(
            "ill-conditioned",
            list(conditions.free),
            f"{ident}: the point is ill-conditioned (condition number {point.conditioning:.1g} "
            "after scaling).",
        )
    if not point.settled:
        findings.caution(
            "not-settled",
            list(conditions.free),
            f"{ident}: the digits of the point did not settle; fewer are given.",
        )
    if point.others:
        findings.caution("other-points", [], _others_text(point, scales, ident))
    _limit_cautions(point, scales, findings, ident)


def _others_text(point: OperatingPoint, scales: Scales, ident: str) -> str:
    described = [
        _described(point.others[k], point, scales) for k in range(min(3, len(point.others)))
    ]
    more = f" and {len(point.others) - 3} more" if len(point.others) > 3 else ""
    return (
        f"{ident}: other starts led to other points that meet the same conditions: "
        f"{'; '.join(described)}{more}. Give a guess for the one that is meant; that these are all "
        "is not shown."
    )


def _described(values: Mapping[str, float], point: OperatingPoint, scales: Scales) -> str:
    names = [n for n in point.conditions.free if n in values][:4]
    return ", ".join(quantity(scales, n, arb(values[n])) for n in names)


def quantity(scales: Scales, name: str, value: arb) -> str:
    """`name = value unit` for people."""
    unit = scales.text(name)
    shown_unit = f" {unit}" if unit not in (None, "1", "-") else ""
    return f"{name} = {shown(scales.value(name, value))}{shown_unit}"


def _limit_cautions(point: OperatingPoint, scales: Scales, findings: Findings, ident: str) -> None:
    for entry in margins(point, scales):
        if entry["margin"] < 0:
            unit = f" {entry['unit']}" if entry["unit"] else ""
            findings.caution(
                "outside-limits",
                [entry["name"]],
                f"{ident}: {entry['name']} lies outside its {entry['side']} limit "
                f"{shown_float(entry['limit'])}{unit} by {shown_float(-entry['margin'])}{unit}.",
            )


def no_point_result(missing: NoPoint, scales: Scales, *, place: tuple[int, str, str]) -> JSON:
    """The entry of `points` where there is no operating point."""
    index, ident, name = place
    entry: JSON = {
        "request": index,
        "id": ident,
        **({"name": name} if name else {}),
        "outcome": "no-point",
        "reason": missing.reason,
        "why": missing.why,
    }
    if missing.blocking:
        entry["blocking"] = list(missing.blocking)
    if missing.undetermined:
        entry["undetermined"] = list(missing.undetermined)
    if missing.residual is not None:
        entry["residual"] = float(f"{missing.residual:.1e}")
    if missing.closest:
        entry["closest"] = {
            n: {
                "value": _rough(missing, scales, n, v),
                "unit": scales.text(n),
                "known": "exact" if n in missing.conditions.fixed else "measured",
            }
            for n, v in missing.closest.items()
        }
    return entry


def _rough(missing: NoPoint, scales: Scales, name: str, value: float) -> float | int:
    """A value of the closest approach: six digits, and 0 where only rounding is left."""
    variable = missing.plant.variables.get(name)
    typical = scales.per(name)
    if variable is not None and variable.typical is not None:
        typical = abs(missing.constants.value(variable.typical))
    floor = float(typical.mid()) * 1e-9
    return rounded(scales.value(name, arb(0 if abs(value) < floor else value)), 6)


def sensitivity_result(
    found: Mapping[str, Mapping[str, float]], scales: Scales, units: Mapping[str, Any]
) -> dict[str, dict[str, float]]:
    """dx0/dp in declared units, to 6 digits."""
    return {
        name: {
            p: float(rounded(arb(value) * size(units[p]) / scales.per(name), 6))
            for p, value in row.items()
        }
        for name, row in found.items()
        if row
    }
