"""What an operating point is asked to be -> rows of equations over named columns.

Rows: the plant's equations with all rates zero, then rates, disturbances and inputs at rest or
held. A held plain name is substituted; everything else (a held expression, a name held twice)
stays a row. Not the count decides but rank and consistency (see `trim`).
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from tangentbook.errors import PointError, nearest
from tangentbook.plant.lower import in_si
from tangentbook.plant.units import ONE
from tangentbook.plant.values import read_value

if TYPE_CHECKING:
    from collections.abc import Mapping

    from tangentbook.calculus.graph import Node
    from tangentbook.plant.model import Plant
    from tangentbook.plant.source import Scalar
    from tangentbook.plant.units import Unit


@dataclass(frozen=True, slots=True, kw_only=True)
class PointText:
    """A point as asked for (plain values, nothing understood yet)."""

    name: str = ""
    hold: tuple[tuple[str, Scalar], ...] = ()
    find: tuple[str, ...] = ()
    guess: Mapping[str, Scalar] = field(default_factory=dict[str, "Scalar"])
    within: Mapping[str, tuple[Scalar | None, Scalar | None]] = field(
        default_factory=dict[str, "tuple[Scalar | None, Scalar | None]"]
    )
    set: Mapping[str, Scalar] = field(default_factory=dict[str, "Scalar"])


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """One condition: `residual` shall be zero; `hold` is the index of the hold it comes from."""

    label: str
    residual: Node
    hold: int | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Conditions:
    """A point as understood.

    `columns` are all quantities of the point, `fixed` those whose value is given (nodes over the
    parameters), `free` those to be found, `assumed` free ones on which no row depends. `rows` is
    the full system over `columns` (fixed ones included, each with its own row), `open_rows` those
    that remain once the fixed values are put in, `asked` the holds as written.
    """

    columns: tuple[str, ...]
    fixed: Mapping[str, Node]
    free: tuple[str, ...]
    assumed: tuple[str, ...]
    rows: tuple[Row, ...]
    open_rows: tuple[int, ...]
    guess: Mapping[str, Node]
    bounds: Mapping[str, tuple[Node | None, Node | None]]
    asked: tuple[str, ...] = ()


def understand_point(plant: Plant, text: PointText) -> Conditions:
    """The rows and columns of a point.

    Raises:
        PointError: an unknown name, or a name used in two ways.
        PlantError: a text that is no expression or value.
    """
    columns = (*plant.states, *plant.algebraic, *plant.inputs)
    _check_names(plant, text, columns)
    fixed: dict[str, Node] = {}
    rows = [Row(label=e.where, residual=e.residual) for e in plant.equations]
    open_rows = list(range(len(rows)))
    _add_rest(plant, text, fixed, rows)
    _add_holds(plant, text, fixed, rows, open_rows)
    free = tuple(name for name in columns if name not in fixed)
    present = plant.graph.leaves([rows[k].residual for k in open_rows])
    return Conditions(
        columns=columns,
        fixed=fixed,
        free=tuple(n for n in free if n in present),
        assumed=tuple(n for n in free if n not in present),
        rows=tuple(rows),
        open_rows=tuple(open_rows),
        guess={n: _value(plant, n, v, f"guess.{n}") for n, v in text.guess.items()},
        bounds={n: _bounds(plant, n, pair) for n, pair in text.within.items()},
        asked=tuple(f"{name} = {value}" for name, value in text.hold),
    )


def _check_names(plant: Plant, text: PointText, columns: tuple[str, ...]) -> None:
    for what, names in (("find", text.find), ("guess", text.guess), ("within", text.within)):
        for name in names:
            if name not in columns:
                raise PointError(
                    "point.name",
                    f"{name} is not a state, input or algebraic unknown of the plant",
                    where=f"point.{what}",
                    hint=_rate_hint(name, columns) or nearest(name, columns),
                )
    holds = {expression.strip() for expression, _ in text.hold}
    for name in text.find:
        if name in holds:
            raise PointError(
                "point.two-uses",
                f"{name} is named in `find` and in `hold`",
                where="point.find",
                hint="a quantity is either held or found; keep one of the two",
            )
        if name not in plant.inputs:
            raise PointError(
                "point.name",
                f"{name} is found in any case: `find` is for inputs that would otherwise rest",
                where="point.find",
                hint="leave it out of `find`",
            )


def _rate_hint(name: str, columns: tuple[str, ...]) -> str:
    for ending in ("_dot", "dot"):
        if name.endswith(ending) and name.removesuffix(ending) in columns:
            return f"a rate is written {name.removesuffix(ending)}'"
    return ""


def _add_rest(plant: Plant, text: PointText, fixed: dict[str, Node], rows: list[Row]) -> None:
    """Rates are zero; disturbances are at rest unless held or found."""
    graph = plant.graph
    zero = graph.const(0)
    holds = {expression.strip() for expression, _ in text.hold}
    for name in plant.states:
        if name.endswith("'"):
            fixed[name] = zero
            rows.append(Row(label=f"{name} = 0 at rest", residual=graph.var(name)))
    for name in plant.inputs:
        variable = plant.variables[name]
        if variable.disturbance and name not in text.find and name not in holds:
            nothing = in_si(graph, zero, variable.unit)  # 0 degC, not 0 K
            fixed[name] = variable.rest if variable.rest is not None else nothing
            residual = graph.sub(graph.var(name), fixed[name])
            rows.append(Row(label=f"{name} at rest", residual=residual))


def _add_holds(
    plant: Plant,
    text: PointText,
    fixed: dict[str, Node],
    rows: list[Row],
    open_rows: list[int],
) -> None:
    graph = plant.graph
    for index, (expression, value) in enumerate(text.hold):
        name = expression.strip().replace("′", "'").replace("’", "'")
        where = f"hold {name}"
        if name in plant.parameters:
            raise PointError(
                "point.name",
                f"{name} is a parameter, so it cannot be held",
                where=where,
                hint=f'give it another value in `set`: {{"set": {{"{name}": …}}}}',
            )
        left = plant.expression(name, where)
        right = _held_value(plant, name, value, where)
        row = Row(label=where, residual=graph.sub(left, right), hold=index)
        plain = graph.name_of(left)
        rows.append(row)
        if plain in (*plant.states, *plant.inputs, *plant.algebraic) and plain not in fixed:
            fixed[str(plain)] = right
        else:
            open_rows.append(len(rows) - 1)


def _held_value(plant: Plant, name: str, value: Scalar, where: str) -> Node:
    unit: Unit | None = plant.unit_of(name)
    known = unit is not None or name in plant.variables or name.rstrip("'") in plant.variables
    if not known and not isinstance(value, str):
        unit = ONE
    return _read(plant, name, value, unit, where)


def _value(plant: Plant, name: str, value: Scalar, where: str) -> Node:
    return _read(plant, name, value, plant.unit_of(name), where)


def _read(plant: Plant, name: str, value: Scalar, unit: Unit | None, where: str) -> Node:
    """A value as a node; a rate with a unit of its own counts time as the equations do."""
    node, written = read_value(
        plant.graph, value, unit=unit, names=tuple(plant.parameters), where=where
    )
    if written is not unit and written is not None and written.has_time and name.endswith("'"):
        return plant.graph.times(node, plant.graph.const(plant.per_clock(name)))
    return node


def _bounds(
    plant: Plant, name: str, pair: tuple[Scalar | None, Scalar | None]
) -> tuple[Node | None, Node | None]:
    where = f"within.{name}"
    low, high = (None if v is None else _value(plant, name, v, where) for v in pair)
    return low, high
