"""linearize: the linear model at each point, confirmed, with its derivation."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from tangentbook.analysis.linearize import linearize
from tangentbook.analysis.trim import NoPoint
from tangentbook.contract.identity import call_digest, report_stem
from tangentbook.errors import RequestError
from tangentbook.tools.content import Content
from tangentbook.tools.convert import not_available
from tangentbook.tools.derivation import derivation
from tangentbook.tools.located import locate, point_line, point_section, question, worst_outcome
from tangentbook.tools.models import (
    DENSE_STATES,
    DeclaredModel,
    eigenvalue_cautions,
    model_checks,
    model_file,
    model_result,
    stability_result,
)
from tangentbook.tools.numbers import plural, shown
from tangentbook.tools.tables import eigenvalue_table, matrix_tables, vectors_table
from tangentbook.tools.trim import answer_line
from tangentbook.tools.understood import plant_summary, understand_plant, unit_texts, validity
from tangentbook_reports import heading, para

if TYPE_CHECKING:
    from collections.abc import Sequence

    from tangentbook.contract.plant import Plant as PlantModel
    from tangentbook.contract.requests import Linearize
    from tangentbook.tools.content import JSON, Findings
    from tangentbook.tools.located import Located
    from tangentbook.tools.scales import Scales
    from tangentbook_reports import Block

_CONFIRMING = ("point.residual", "jacobian.second-route", "model.remainder")

SHORT_STATES = 6
"""Up to this many states the short text holds every matrix."""


def run(request: Linearize) -> Content:
    """Answer a linearize call."""
    _refuse_unhandled(request)
    model: Any = request.plant
    chosen = _with_outputs(model, request.outputs)
    plant, scales, findings = understand_plant(chosen)
    points = locate(plant, scales, findings, request.point)
    stem = report_stem(model.name, "linearize", call_digest("linearize", request)[:16])
    work = _Work(scales=scales, findings=findings, stem=stem, gain="dc gain" in request.also)
    for located in points:
        work.add(located)
    entries = [p.entry for p in points]
    cautions = [f"caution: {c['text']}" for c in findings.cautions]
    return Content(
        outcome=worst_outcome(entries),
        answer=" ".join(work.answers),
        question=question(request.point, "Which linear model do the equations have at rest"),
        plant=plant_summary(model, plant),
        units=unit_texts(plant, scales),
        points=entries,
        findings=findings,
        validity=validity(model, findings, "no verdict on stability was asked for or given"),
        sections=work.sections,
        derivation=work.derivation,
        files=work.files,
        short="\n".join([*work.lines, *cautions]),
    )


def _refuse_unhandled(request: Linearize) -> None:
    for what in request.also:
        if what != "dc gain":
            raise not_available(f"`also`: {what!r}", "also", 'this version gives ["dc gain"]')
    for name in ("frequencies", "held", "bilinear"):
        if getattr(request, name):
            raise not_available(f"`{name}`", name, "leave it out")


def _with_outputs(plant: PlantModel, outputs: dict[str, str] | list[str] | None) -> PlantModel:
    """The plant with the outputs of this call."""
    if outputs is None:
        return plant
    from tangentbook.contract.plant import Declaration  # the model is rebuilt, not mutated

    if isinstance(outputs, dict):
        declared = {
            name: Declaration.model_validate({"is": text}) for name, text in outputs.items()
        }
    else:
        declared = {
            name: plant.outputs.get(name) or Declaration.model_validate({}) for name in outputs
        }
    if not declared:
        raise RequestError(
            "request.field", "`outputs` is empty", where="outputs", hint="leave it out for all"
        )
    return plant.model_copy(update={"outputs": declared})


class _Work:
    """Collects entries, sections and lines over the points of a call."""

    def __init__(self, *, scales: Scales, findings: Findings, stem: str, gain: bool) -> None:
        self.scales = scales
        self.findings = findings
        self.stem = stem
        self.gain = gain
        self.sections: list[Block] = []
        self.derivation: list[Block] = []
        self.files: dict[str, str] = {}
        self.answers: list[str] = []
        self.lines: list[str] = []

    def add(self, located: Located) -> None:
        """Linearize at one point."""
        self.sections += point_section(located)
        self.lines.append(point_line(located, self.scales))
        if isinstance(located.found, NoPoint):
            self.answers.append(answer_line(located, self.scales, self.findings))
            return
        found = linearize(located.found, gain=self.gain)
        ident = located.entry["id"]
        if found.model is None:
            self._no_model(located, found.why, list(found.names), found.kinks.kind)
        else:
            self._model(located, DeclaredModel(found, self.scales), ident)
        if not self.derivation:
            self.derivation, files = derivation(found, self.stem)
            self.files |= files

    def _no_model(self, located: Located, why: str, names: list[str], kind: str) -> None:
        ident = located.entry["id"]
        located.entry["model"] = None
        located.entry["no_model"] = {"reason": why, "names": names}
        self.findings.caution("no-model", names, f"{ident}: no linear model: {why}.")
        self.answers.append(
            f"{located.title}: a rest point of the equations, but no linear model there: {why}."
        )
        self.lines.append(f"no linear model: {why}")
        title = "No linear model" if kind != "jump" else "A set of rest points"
        self.sections += [heading(3, title), para(f"{why}.")]

    def _model(self, located: Located, model: DeclaredModel, ident: str) -> None:
        findings, found = self.findings, model.found
        many = len(model.states) > DENSE_STATES
        file = f"{self.stem}.model-{ident}.json" if many else ""
        entry = model_result(model, file=file)
        located.entry["model"] = entry
        if many:
            self.files[f"model-{ident}.json"] = model_file(model)
            findings.caution(
                "large-plant", [], f"{ident}: the matrices stand in a file beside the report."
            )
        if found.kinks.kind == "single-valued":
            findings.caution(
                "switch-at-point", list(found.kinks.active), f"{ident}: {found.kinks.why}."
            )
        model_checks(found, model, findings, ident)
        stability = stability_result(found, self.scales)
        time = entry["time"]
        self.sections += [
            heading(3, "Linear model"),
            *matrix_tables(model, entry, file),
            *vectors_table(model),
        ]
        if stability is not None:
            located.entry["stability"] = stability
            eigenvalue_cautions(found, self.scales, findings, ident)
            self.sections += [heading(3, "Eigenvalues"), *eigenvalue_table(stability, time)]
        confirmed = findings.confirmed(_CONFIRMING, point=ident)
        self.answers.append(_answer(located, model, stability, confirmed=confirmed))
        self.lines += _lines(model, entry, stability)


def _answer(
    located: Located, model: DeclaredModel, stability: JSON | None, *, confirmed: bool
) -> str:
    time = model.scales.plant.time.text
    per = "" if time in ("1", "-") else f" per {time}"
    sizes = ", ".join(
        (
            plural(len(model.states), "state"),
            plural(len(model.inputs), "input"),
            plural(len(model.outputs), "output"),
        )
    )
    text = f"{located.title}: the equations as stated have the linear model below ({sizes}) there, "
    text += (
        "every entry confirmed by a second route"
        if confirmed
        else "BUT NOT EVERY ENTRY IS CONFIRMED: see the check values and cautions"
    )
    if stability and stability["eigenvalues"]:
        first = stability["eigenvalues"][0]
        imaginary = f" ± {first['im']:.6g}i" if first["im"] else ""
        text += f"; rightmost eigenvalue {first['re']:.6g}{imaginary}{per} (no verdict given)"
    return text + "."


def _lines(model: DeclaredModel, entry: JSON, stability: JSON | None) -> list[str]:
    lines: list[str] = []
    if len(model.states) <= SHORT_STATES:
        lines.append(
            f"states {_list(model.states)}, inputs {_list(model.inputs)}, "
            f"outputs {_list(model.outputs)}"
        )
        for name in "ABCD":
            rows = getattr(model, name)
            if rows and rows[0]:
                lines.append(f"{name} = {_matrix(rows)}")
        gain = model.gain()
        if gain is not None:
            lines.append(f"gain at rest = {_matrix(gain)}")
        lines.append(f"y0 = [{', '.join(shown(v) for v in model.y0)}]")
    else:
        lines.append(f"A {len(model.states)}x{len(model.states)}: see the structured content")
    if "dc_gain_note" in entry:
        lines.append(f"no gain at rest: {entry['dc_gain_note']}")
    if stability is not None:
        listed = stability["eigenvalues"][:8]
        shown_values = ", ".join(_complex(e) for e in listed)
        more = ", …" if len(stability["eigenvalues"]) > len(listed) else ""
        lines.append(f"eigenvalues per {model.scales.plant.time.text}: {shown_values}{more}")
    return lines


def _list(names: Sequence[str]) -> str:
    return f"[{', '.join(names)}]"


def _matrix(rows: Sequence[Sequence[Any]]) -> str:
    return "[" + "; ".join(", ".join(shown(v) for v in row) for row in rows) + "]"


def _complex(e: JSON) -> str:
    text = f"{e['re']:.6g}" + (f"{e['im']:+.6g}i" if e["im"] else "")
    return f"{text} (x{e['count']})" if e["count"] > 1 else text
