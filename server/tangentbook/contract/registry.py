"""The one list of tools; server, command line, worker, reports and tests read it.

Modules are named as text: the parent process must not import what computes.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from tangentbook.contract.plant import BRIDGE
from tangentbook.contract.requests import CheckPlant, Linearize, Trim
from tangentbook.errors import RequestError, nearest

if TYPE_CHECKING:
    from tangentbook.contract.base import Model


@dataclass(frozen=True, slots=True, kw_only=True)
class Tool:
    """One tool: its name, what it says of itself, its arguments and the module that does it."""

    name: str
    title: str
    description: str
    request: type[Model]
    module: str
    example: dict[str, Any]


_POINT: dict[str, Any] = {"name": "leaf at 60 degrees", "hold": {"theta": "60 deg"}}

TOOLS: tuple[Tool, ...] = (
    Tool(
        name="check-plant",
        title="Check a plant",
        description=(
            "Reads a plant given as equations and says how it was understood: roles of the names, "
            "state order, normal form, what is missing. Use it first: the reply carries an id, and "
            'later calls may send {"ref": id} as plant. Errors name equation, column and remedy.'
        ),
        request=CheckPlant,
        module="tangentbook.tools.check_plant",
        example={"plant": BRIDGE},
    ),
    Tool(
        name="trim",
        title="Find an operating point",
        description=(
            "Finds the equilibrium of a plant: `hold` what is known, the rest is found; "
            "disturbances rest at 0 unless held. Answers values with units, residual, what is "
            'redundant or conflicting, or why there is no such point. point: {"hold": {"theta": '
            '"60 deg"}, "guess": {…}, "within": {…}}; {} means all rates zero, nothing held.'
        ),
        request=Trim,
        module="tangentbook.tools.trim",
        example={"plant": BRIDGE, "point": _POINT},
    ),
    Tool(
        name="linearize",
        title="Linear model at an operating point",
        description=(
            "Finds the operating point (as trim) and linearizes there: A, B, C, D with named rows "
            "and columns, x0, u0, y0, eigenvalues, every entry confirmed by a second route, and a "
            'report with the derivation. `also`: ["dc gain"].'
        ),
        request=Linearize,
        module="tangentbook.tools.linearize",
        example={"plant": BRIDGE, "point": _POINT, "also": ["dc gain"]},
    ),
)


def tool_named(name: str) -> Tool:
    """The tool of that name.

    Raises:
        RequestError: there is none; the hint offers the nearest.
    """
    for tool in TOOLS:
        if tool.name == name:
            return tool
    raise RequestError(
        "request.tool",
        f"there is no tool {name!r}",
        where="tool",
        hint=nearest(name, [tool.name for tool in TOOLS]),
    )
