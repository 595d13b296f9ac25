"""Printed numbers read in again with their units, against what was computed.

Values come in through the unit grammar and `plant.values`, and go out through `tools.scales`: two
roads. Reading the printed matrices and vectors back in closes the loop, so that a wrong unit of a
row or a column shows.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from flint import arb

from tangentbook.calculus.evaluate import Function
from tangentbook.plant.values import read_value
from tangentbook.tools.numbers import rounded

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from tangentbook.plant.model import Plant
    from tangentbook.plant.units import Unit
    from tangentbook.tools.models import DeclaredModel


def reread_difference(model: DeclaredModel) -> tuple[float, str]:
    """The largest relative difference of a printed number read in again, and its place."""
    found = model.found.model
    assert found is not None  # noqa: S101 - a declared model has one
    plant = model.scales.plant
    clock = _one(plant, plant.clock)
    size = {n: _size(plant, n, clock) for n in (*model.states, *model.inputs)}
    out = {
        o.name: _one(plant, o.unit)
        if o.unit is not None
        else _size(plant, plant.graph.name_of(o.node) or "", clock)
        for o in plant.outputs
    }
    worst = _Worst()
    per_time = {name: size[name] / clock for name in model.states}
    worst.matrix("A", model.A, (per_time, model.states), (size, model.states), found.rates)
    worst.matrix("B", model.B, (per_time, model.states), (size, model.inputs), found.rates)
    worst.matrix("C", model.C, (out, model.outputs), (size, model.states), found.output_rows)
    worst.matrix("D", model.D, (out, model.outputs), (size, model.inputs), found.output_rows)
    values = model.found.point.values
    for name, value in zip((*model.states, *model.inputs), (*model.x0, *model.u0), strict=True):
        worst.add(f"value of {name}", _value(plant, name, rounded(value), size), values[name])
    return worst.value, worst.place


class _Worst:
    def __init__(self) -> None:
        self.value = 0.0
        self.place = ""

    def matrix(
        self,
        name: str,
        printed: Sequence[Sequence[arb]],
        rows: tuple[Mapping[str, arb], Sequence[str]],
        columns: tuple[Mapping[str, arb], Sequence[str]],
        computed: Mapping[str, Mapping[str, arb]],
    ) -> None:
        row_size, row_names = rows
        column_size, column_names = columns
        for line, row in zip(printed, row_names, strict=True):
            for entry, column in zip(line, column_names, strict=True):
                value = computed[row].get(column)
                if value is None or value.contains(0):
                    continue
                again = arb(rounded(entry)) * row_size[row] / column_size[column]
                self.add(f"{name}, {row} / {column}", again, value)

    def add(self, place: str, again: arb, value: arb) -> None:
        if value.contains(0) or again.is_zero():  # below the range of printed numbers
            return
        difference = float(abs(again / value - 1).upper())
        # ten digits are printed: only what goes beyond their rounding counts
        if difference > self.value:
            self.value, self.place = difference, place


def _read(plant: Plant, number: float, unit: Unit | None) -> arb:
    """A printed number as a value in SI, by way of the language."""
    text = repr(number) if unit is None or not unit.text else f"{number!r} {unit.text}"
    node, _ = read_value(plant.graph, text, unit=unit, names=(), where="printed number")
    return Function(plant.graph, (), [node]).balls(())[0]


def _value(plant: Plant, name: str, number: float, size: Mapping[str, arb]) -> arb:
    variable = plant.variables.get(name)
    if variable is None or variable.unit is None:
        return arb(number) * size[name]
    return _read(plant, number, variable.unit)


def _size(plant: Plant, name: str, clock: arb) -> arb:
    """The size of a quantity's unit; a rate without one of its own has its base's per time."""
    variable = plant.variables.get(name)
    if variable is not None and variable.unit is not None:
        return _one(plant, variable.unit)
    base = name.rstrip("'")
    parent = plant.variables.get(base)
    unit = parent.unit if parent is not None else None
    return _one(plant, unit) / clock ** (len(name) - len(base))


def _one(plant: Plant, unit: Unit | None) -> arb:
    """The size of a unit: the difference of two and one of it (a level has its own zero)."""
    return _read(plant, 2, unit) - _read(plant, 1, unit)
