"""Tables of a report: the point, the matrices with named rows and columns, the eigenvalues."""

from __future__ import annotations

import cmath
from typing import TYPE_CHECKING, Any

from flint import arb

from tangentbook.tools.models import DENSE_STATES
from tangentbook.tools.numbers import shown, shown_float
from tangentbook_reports import Code, Math, heading, para, table

if TYPE_CHECKING:
    from collections.abc import Sequence

    from tangentbook.tools.content import JSON
    from tangentbook.tools.models import DeclaredModel
    from tangentbook_reports import Block

MATRIX_COLUMNS = 10
"""Wider matrices are printed in groups of this many columns."""


def unit_text(unit: str | None) -> str:
    """A unit for a table cell."""
    return "" if unit in (None, "1", "-") else str(unit)


def point_table(entry: JSON) -> list[Block]:
    """The values of a point, with what is known of them and their margins."""
    margins: dict[str, list[str]] = {}
    for margin in entry["margins"]:
        text = f"{margin['side']} {shown_float(margin['limit'])}: {shown_float(margin['margin'])}"
        margins.setdefault(margin["name"], []).append(text)
    rows: list[list[Any]] = [
        [
            Code(name),
            shown_float(value["value"]),
            unit_text(value["unit"]),
            value["known"],
            value.get("exact", ""),
            "; ".join(margins.get(name, [])),
        ]
        for name, value in entry["values"].items()
    ]
    header = ["Quantity", "Value", "Unit", "How known", "Exact", "Limit: margin"]
    return [table(header, rows, align="lrllll")]


def closest_table(entry: JSON) -> list[Block]:
    """The closest approach where there is no point."""
    if "closest" not in entry:
        return []
    rows = [
        [Code(name), shown_float(value["value"]), unit_text(value["unit"])]
        for name, value in entry["closest"].items()
    ]
    title = (
        "One of the points that meet the conditions (what is undetermined could be otherwise):"
        if entry["reason"] == "undetermined"
        else "Closest approach (not an operating point; largest residual relative to its row "
        f"{entry.get('residual', 0):.1g}):"
    )
    return [
        para(title),
        table(["Quantity", "Value", "Unit"], rows, align="lrl"),
    ]


def matrix_tables(model: DeclaredModel, entry: JSON, file: str) -> list[Block]:
    """A, B, C, D and the gain at rest, with how to read them."""
    time = entry["time"]
    per = "" if time in ("1", "-") else f" per {time}"
    blocks: list[Block] = [
        para(
            "Deviation form, with ",
            Math(r"\Delta x = x - x_0"),
            ", ",
            Math(r"\Delta u = u - u_0"),
            ": ",
            Math(r"\Delta\dot{x} = f_0 + A \Delta x + B \Delta u"),
            ", ",
            Math(r"y = y_0 + C \Delta x + D \Delta u"),
            f". An entry is the unit of its row{per} (A, B) or the unit of its row (C, D), over "
            "the unit of its column.",
        )
    ]
    if len(model.states) > DENSE_STATES:
        blocks.append(
            para(
                f"The matrices of {len(model.states)} states stand in the file ",
                Code(file),
                " beside this report.",
            )
        )
        return blocks
    parts = (
        ("A", model.A, model.states, model.states),
        ("B", model.B, model.states, model.inputs),
        ("C", model.C, model.outputs, model.states),
        ("D", model.D, model.outputs, model.inputs),
    )
    for name, rows, row_names, column_names in parts:
        if row_names and column_names:
            blocks += _matrix(name, rows, row_names, column_names)
    gain = model.gain()
    if gain is not None:
        blocks.append(heading(4, "Gain at rest"))
        blocks.append(
            para("Output per input once everything has settled: ", Math(r"D - C A^{-1} B"), ".")
        )
        blocks += _matrix("y/u", gain, model.outputs, model.inputs)
    elif "dc_gain_note" in entry:
        blocks.append(heading(4, "Gain at rest"))
        blocks.append(para(f"Not given: {entry['dc_gain_note']}."))
    return blocks


def _matrix(
    name: str,
    rows: Sequence[Sequence[arb]],
    row_names: Sequence[str],
    column_names: Sequence[str],
) -> list[Block]:
    blocks: list[Block] = []
    for start in range(0, len(column_names), MATRIX_COLUMNS):
        stop = start + MATRIX_COLUMNS
        header: list[Any] = [name, *(Code(c) for c in column_names[start:stop])]
        body: list[list[Any]] = [
            [Code(label), *(shown(v) for v in row[start:stop])]
            for label, row in zip(row_names, rows, strict=True)
        ]
        blocks.append(table(header, body, align="l" + "r" * (len(header) - 1)))
    return blocks


def vectors_table(model: DeclaredModel) -> list[Block]:
    """x0, u0, y0 and f0 by name."""
    scales = model.scales
    rows: list[list[Any]] = []
    rows += [
        ["x0", Code(n), shown(v), unit_text(scales.text(n)), "0"]
        for n, v in zip(model.states, model.x0, strict=True)
    ]
    rows += [
        ["u0", Code(n), shown(v), unit_text(scales.text(n)), ""]
        for n, v in zip(model.inputs, model.u0, strict=True)
    ]
    rows += [
        ["y0", Code(n), shown(v), unit_text(scales.output_text(n)), ""]
        for n, v in zip(model.outputs, model.y0, strict=True)
    ]
    return [table(["Vector", "Quantity", "Value", "Unit", "Rate f0"], rows, align="llrlr")]


def eigenvalue_table(stability: JSON, time: str) -> list[Block]:
    """Eigenvalues with what they mean as times."""
    per = "" if time in ("1", "-") else f", rad per {time}"
    rows: list[list[Any]] = []
    for e in stability["eigenvalues"]:
        value = complex(e["re"], e["im"])
        rows.append(
            [
                shown_float(value.real),
                shown_float(value.imag),
                str(e["count"]),
                shown_float(abs(1 / value.real)) if value.real else "",
                shown_float(2 * cmath.pi / value.imag) if value.imag > 0 else "",
                shown_float(-value.real / abs(value)) if value.imag > 0 else "",
                f"{e['radius']:.0e}" if e["radius"] else "0",
            ]
        )
    header = [
        f"Real part{per}",
        "Imaginary part",
        "Count",
        "Time constant",
        "Period",
        "Damping ratio",
        "Radius",
    ]
    return [
        para(
            "Computed twice; rightmost first. Time constant (of decay, or of growth where the real "
            "part is positive) and period in the unit of time of the plant. Radius: estimated "
            "distance of the true value from the printed one. No verdict on stability is given "
            "here."
        ),
        table(header, rows, align="rrrrrrr"),
    ]
