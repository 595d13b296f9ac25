"""Linear models as results: matrices in declared units, eigenvalues, gain at rest, their checks."""

from __future__ import annotations

import json
import math
from typing import TYPE_CHECKING

from flint import arb

from tangentbook.analysis.settings import (
    EIGENVALUE_LIMIT,
    PRINTED_UNITS_LIMIT,
    PRINTED_ZERO_LIMIT,
    REMAINDER_LIMIT,
    SECOND_ROUTE_LIMIT,
)
from tangentbook.contract.codes import CHECKS
from tangentbook.tools.numbers import plural, rounded, shown
from tangentbook.tools.reread import reread_difference

if TYPE_CHECKING:
    from collections.abc import Sequence

    from flint import acb

    from tangentbook.analysis.confirm import Confirmation
    from tangentbook.analysis.linearize import Linearization
    from tangentbook.analysis.spectrum import Eigenvalue
    from tangentbook.tools.content import JSON, Findings
    from tangentbook.tools.scales import Scales

DENSE_STATES = 40
"""Up to this many states the result holds dense lists; beyond, entries and a side file."""

Rows = list[list[arb]]


class DeclaredModel:
    """The matrices of a linearization in declared units, as balls."""

    def __init__(self, found: Linearization, scales: Scales) -> None:
        model = found.model
        assert model is not None  # noqa: S101 - callers check
        self.found = found
        self.scales = scales
        self.states, self.inputs, self.outputs = model.states, model.inputs, model.outputs
        per = {n: scales.per(n) for n in (*model.states, *model.inputs)}
        rate = {n: scales.clock / per[n] for n in model.states}
        out = {n: 1 / scales.output_per(n) for n in model.outputs}
        entry, output = model.rate_entry, model.output_entry
        self.A = [[entry(r, c) * per[c] * rate[r] for c in self.states] for r in self.states]
        self.B = [[entry(r, c) * per[c] * rate[r] for c in self.inputs] for r in self.states]
        self.C = [[output(r, c) * per[c] * out[r] for c in self.states] for r in self.outputs]
        self.D = [[output(r, c) * per[c] * out[r] for c in self.inputs] for r in self.outputs]
        values = found.point.values
        self.x0 = [scales.value(n, values[n]) for n in self.states]
        self.u0 = [scales.value(n, values[n]) for n in self.inputs]
        outputs = found.outputs or {}
        self.y0 = [scales.output_value(n, outputs[n]) for n in self.outputs]

    def gain(self) -> Rows | None:
        """The gain at rest in output unit per input unit."""
        gain = self.found.gain
        if gain is None or gain.matrix is None:
            return None
        scales = self.scales
        return [
            [
                gain.matrix[i, j] * scales.per(u) / scales.output_per(y)
                for j, u in enumerate(self.inputs)
            ]
            for i, y in enumerate(self.outputs)
        ]


def model_result(model: DeclaredModel, *, file: str) -> JSON:
    """The `model` of a point."""
    sparse = len(model.states) > DENSE_STATES
    shape = _sparse if sparse else _dense
    result: JSON = {
        "kind": "continuous",
        "time": model.scales.plant.time.text,
        "states": list(model.states),
        "inputs": list(model.inputs),
        "outputs": list(model.outputs),
    }
    columns = {"A": model.states, "B": model.inputs, "C": model.states, "D": model.inputs}
    for name, names in columns.items():
        result[name] = shape(getattr(model, name), len(names), file)
    result |= {
        "x0": [rounded(v) for v in model.x0],
        "u0": [rounded(v) for v in model.u0],
        "y0": [rounded(v) for v in model.y0],
        "f0": [0] * len(model.states),
        "known": "computed twice",
    }
    if model.found.gain is not None:
        gain = model.gain()
        result["dc_gain"] = None if gain is None else _dense(gain, len(model.inputs), file)
        if gain is None:
            result["dc_gain_note"] = model.found.gain.why
    return result


def _dense(rows: Rows, _columns: int, _file: str) -> list[list[float | int]]:
    return [[rounded(v) for v in row] for row in rows]


def _sparse(rows: Rows, columns: int, file: str) -> JSON:
    entries = [
        [i, j, number]
        for i, row in enumerate(rows)
        for j, value in enumerate(row)
        if (number := rounded(value)) != 0
    ]
    return {"shape": [len(rows), columns], "entries": entries, "file": file}


def model_file(model: DeclaredModel) -> str:
    """The whole model as a JSON side file: names, matrices as entries, the point."""
    content: JSON = {
        "states": list(model.states),
        "inputs": list(model.inputs),
        "outputs": list(model.outputs),
    }
    for name, names in (
        ("A", model.states),
        ("B", model.inputs),
        ("C", model.states),
        ("D", model.inputs),
    ):
        matrix = _sparse(getattr(model, name), len(names), "")
        content[name] = {"shape": matrix["shape"], "entries": matrix["entries"]}
    for name in ("x0", "u0", "y0"):
        content[name] = [rounded(v) for v in getattr(model, name)]
    return json.dumps(content, ensure_ascii=False, indent=1) + "\n"


def stability_result(found: Linearization, scales: Scales) -> JSON | None:
    """Eigenvalues in rad per `time`, rightmost first; no verdict is given here."""
    if found.spectrum is None:
        return None
    listed: list[JSON] = []
    for eigenvalue in found.spectrum.eigenvalues:
        entry = _eigenvalue(eigenvalue, scales.clock)
        twin = next((e for e in listed if (e["re"], e["im"]) == (entry["re"], entry["im"])), None)
        if twin is None:
            listed.append(entry)
        else:
            twin["count"] += 1
            twin["radius"] = max(twin["radius"], entry["radius"])
    return {"eigenvalues": listed, "known": "computed twice"}


def _eigenvalue(eigenvalue: Eigenvalue, clock: arb) -> JSON:
    value: acb = eigenvalue.value * clock
    real, imag = _within(value.real, eigenvalue, clock), _within(value.imag, eigenvalue, clock)
    entry: JSON = {"re": rounded(real), "im": rounded(imag), "radius": 0, "count": 1}
    if eigenvalue.exact:
        entry["exact"] = "0"
        return entry
    printed_error = abs(value.real.mid() - arb(entry["re"])) + abs(
        value.imag.mid() - arb(entry["im"])
    )
    # at least what 25 digits would leave: the bits below differ between machines
    least = abs(value).upper() * arb("1e-25")
    entry["radius"] = _up(float((printed_error + eigenvalue.radius * clock + least).upper()))
    return entry


def _within(part: arb, eigenvalue: Eigenvalue, clock: arb) -> arb:
    """A part with the estimated error as its radius, so that only known digits are printed."""
    if part.is_zero():
        return part
    return part.mid() + arb(0, (eigenvalue.radius * clock).upper())


def _up(value: float) -> float:
    """One significant digit, rounded up."""
    if value <= 0:
        return 0
    exponent = max(math.floor(math.log10(value)), -300)
    return float(f"{math.ceil(value / 10.0**exponent * (1 - 1e-12))}e{exponent}")


def model_checks(
    found: Linearization, model: DeclaredModel, findings: Findings, ident: str
) -> None:
    """Second routes, remainder, eigenvalues and printed zeros."""
    routes: Sequence[tuple[str, Confirmation | None, float]] = (
        ("jacobian.second-route", found.differences, SECOND_ROUTE_LIMIT),
        ("model.remainder", found.remainder, REMAINDER_LIMIT),
        ("jacobian.symbolic", found.symbolic, SECOND_ROUTE_LIMIT),
    )
    for code, confirmation, limit in routes:
        if confirmation is None:
            findings.not_checked.append(
                f"{ident}: {CHECKS[code]} (left out for larger plants and at switches)"
            )
            continue
        if confirmation.value is None:
            findings.missing(code, confirmation.why, point=ident)
        else:
            beyond = confirmation.value > limit
            note = f"largest at {confirmation.entry}" if beyond else ""
            findings.check(code, confirmation.value, limit, point=ident, note=note)
    if found.spectrum is not None:
        findings.check(
            "eigenvalues.second-route", found.spectrum.disagreement, EIGENVALUE_LIMIT, point=ident
        )
    if len(model.states) <= DENSE_STATES:
        again, place = reread_difference(model)
        beyond = again > PRINTED_UNITS_LIMIT
        note = f"largest at {place}" if beyond else ""
        findings.check("printed.units", again, PRINTED_UNITS_LIMIT, point=ident, note=note)
    zero = _printed_zero(model)
    if zero > 0:
        findings.check("printed.bound", zero, PRINTED_ZERO_LIMIT, point=ident)


def _printed_zero(model: DeclaredModel) -> float:
    """The largest bound of an entry printed as 0 that is not exactly 0, relative to its row."""
    worst = 0.0
    for rows in (model.A, model.B, model.C, model.D):
        for row in rows:
            # a row without any nonzero entry is judged as it stands
            largest = max((float(abs(v).upper()) for v in row if not v.contains(0)), default=1.0)
            for value in row:
                if value.contains(0) and not value.is_zero():
                    worst = max(worst, float(abs(value).upper()) / largest)
    return worst


def eigenvalue_cautions(
    found: Linearization, scales: Scales, findings: Findings, ident: str
) -> None:
    """What the eigenvalues alone already call for (sides by their full digits, not as printed)."""
    if found.spectrum is None:
        return
    values = found.spectrum.eigenvalues
    time = scales.plant.time.text
    per = "" if time in ("1", "-") else f" per {time}"
    right = [e for e in values if float(e.value.real.mid()) > e.radius]
    near = [e for e in values if abs(float(e.value.real.mid())) <= e.radius]
    if right:
        rightmost = shown((right[0].value.real * scales.clock).mid())
        findings.caution(
            "eigenvalue-right",
            [],
            f"{ident}: {plural(len(right), 'eigenvalue')} with positive real part, the rightmost "
            f"{rightmost}{per}: with inputs held, deviations grow.",
        )
    if near:
        findings.caution(
            "eigenvalue-near-axis",
            [],
            f"{ident}: {plural(len(near), 'eigenvalue')} with a real part that is zero or too "
            "close to zero to tell its side: the linear model alone cannot decide stability.",
        )
