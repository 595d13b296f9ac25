"""What one `time` of the plant is in the numbers of its equations.

Where no unit of the plant contains time, nothing ties its rates to the second: they are per `time`
as written. Else the quantities are in SI and one `time` is so many seconds.
"""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

from tangentbook.errors import DeclarationError
from tangentbook.plant.grammar import parse_leading
from tangentbook.plant.units import ONE, Unit, parse_unit

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator

    from tangentbook.plant.source import PlantText, Scalar

_BRACKETS = re.compile(r"\[([^\[\]]*)\]")


def time_unit(text: str) -> Unit:
    """The unit in which rates are read and shown.

    Raises:
        DeclarationError: not a unit of time, and not 1.
    """
    unit = parse_unit(text, where="time")
    if unit.dimension == (("s", 1),) or (unit.dimension == () and unit.text in ("1", "-", "")):
        return unit
    raise DeclarationError(
        "unit.text",
        f"time is {text!r}, which is no unit of time",
        where="time",
        hint='write "s", "min", "h", "d", or "1" where time is dimensionless',
    )


def clock(text: PlantText, time: Unit, declared: Iterable[Unit | None]) -> Unit:
    """One `time` in the numbers of the equations (see the module docstring).

    Args:
        text: the plant as written, for units in literals and values.
        time: the plant's unit of time.
        declared: the units of its quantities.
    """
    units = [unit for unit in declared if unit is not None]
    units += [parse_unit(written) for written in _written_units(text)]
    return time if any(unit.has_time for unit in units) else ONE


def _written_units(text: PlantText) -> Iterator[str]:
    """Units in literals, as 64.94[1/s], and behind values, as "52 kN"."""
    expressions = [
        *(e.text for e in text.equations),
        *(d.text for d in text.definitions),
        *(o.expression or "" for o in text.outputs),
    ]
    for expression in expressions:
        yield from _BRACKETS.findall(expression)
    for value in _values(text):
        if isinstance(value, str):
            yield from _BRACKETS.findall(value)
            yield parse_leading(value, "value")[1]


def _values(text: PlantText) -> Iterator[Scalar | None]:
    for parameter in text.parameters:
        yield parameter.value
    for item in (*text.states, *text.inputs, *text.algebraic):
        yield from (item.typical, item.period, *item.limits, item.rest)
