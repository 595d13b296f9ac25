"""The points of a call: found one by one, as entries, report sections and lines of text."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from tangentbook.analysis.trim import NoPoint, OperatingPoint, find_point
from tangentbook.tools.points import no_point_result, point_result, quantity
from tangentbook.tools.tables import closest_table, point_table
from tangentbook.tools.understood import point_text
from tangentbook_reports import Code, heading, para, table

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from tangentbook.contract.point import Point
    from tangentbook.plant.model import Plant
    from tangentbook.tools.content import JSON, Findings
    from tangentbook.tools.scales import Scales
    from tangentbook_reports import Block

WORST = ("done", "no-point", "stopped")


@dataclass(slots=True, kw_only=True)
class Located:
    """One point of a call: what was found, its entry, its title."""

    found: OperatingPoint | NoPoint
    entry: JSON
    title: str
    overrides: Mapping[str, float | str]


def locate(
    plant: Plant, scales: Scales, findings: Findings, points: Sequence[Point]
) -> list[Located]:
    """Find every point of a call, in order."""
    located: list[Located] = []
    for index, request in enumerate(points):
        ident = f"p{index + 1}"
        found = find_point(plant, point_text(request))
        place = (index, ident, request.name)
        if isinstance(found, NoPoint):
            entry = no_point_result(found, scales, place=place)
        else:
            entry = point_result(found, scales, findings, place=place)
        title = f"{ident}: {request.name}" if request.name else ident
        located.append(Located(found=found, entry=entry, title=title, overrides=request.set))
    return located


def worst_outcome(entries: Sequence[JSON]) -> str:
    """The call's outcome is the worst of its points'."""
    return max((e["outcome"] for e in entries), key=WORST.index)


def point_section(located: Located) -> list[Block]:
    """The section of one point."""
    entry = located.entry
    blocks: list[Block] = [heading(2, f"Operating point {located.title}")]
    if isinstance(located.found, NoPoint):
        blocks.append(para(f"No operating point ({entry['reason']}): {entry['why']}."))
        blocks += closest_table(entry)
        return blocks
    blocks.append(para(f"{entry['kind'].capitalize()}: all rates are zero."))
    if located.overrides:
        blocks.append(
            para("Parameters of this configuration that differ from the plant as read below:")
        )
        rows = [[Code(name), str(value)] for name, value in located.overrides.items()]
        blocks.append(table(["Parameter", "Value here"], rows, align="ll"))
    blocks += point_table(entry)
    return blocks


def question(points: Sequence[Point], what: str) -> str:
    """The question of a call in words."""
    asked = [_asked(p) for p in points]
    return f"{what} {'; '.join(asked)}?"


def _asked(point: Point) -> str:
    held = ", ".join(f"{h.is_} = {h.equals}" for h in point.hold)
    text = f"with {held} held" if held else "with nothing held"
    if point.name:
        text = f"“{point.name}”, {text}"
    if point.find:
        text += f", {', '.join(point.find)} found"
    if point.guess:
        text += ", near " + ", ".join(f"{n} = {v}" for n, v in point.guess.items())
    if point.within:
        text += ", within bounds of " + ", ".join(point.within)
    if point.set:
        text += ", with " + ", ".join(f"{n} = {v}" for n, v in point.set.items())
    return text


def no_point_line(located: Located) -> str:
    """Why there is no operating point, in a line of text."""
    entry = located.entry
    return f"{located.title}: no operating point ({entry['reason']}): {entry['why']}"


def point_line(located: Located, scales: Scales) -> str:
    """One point in a line of text."""
    if isinstance(located.found, NoPoint):
        return no_point_line(located)
    point = located.found
    names = point.conditions.columns
    shown = [quantity(scales, n, point.values[n]) for n in names[:16]]
    more = f", … ({len(names)} values)" if len(names) > 16 else ""
    return f"{located.title}: {', '.join(shown)}{more}"
