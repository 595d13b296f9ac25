"""SI balls -> declared units: one place where quantities get the units they are shown in."""

from __future__ import annotations

from typing import TYPE_CHECKING

from flint import arb

if TYPE_CHECKING:
    from tangentbook.plant.model import Plant
    from tangentbook.plant.units import Unit


class Scales:
    """The declared units of one plant's quantities."""

    def __init__(self, plant: Plant) -> None:
        self.plant = plant
        self._outputs = {o.name: plant.output_unit(o) for o in plant.outputs}
        self.clock = size(plant.clock)

    def unit(self, name: str) -> Unit | None:
        """The declared unit of a state, input, algebraic unknown or parameter."""
        return self.plant.unit_of(name)

    def text(self, name: str) -> str | None:
        """Its text, None where none was declared."""
        unit = self.unit(name)
        return None if unit is None or not unit.text else unit.text

    def output_text(self, name: str) -> str | None:
        """The unit text of an output."""
        unit = self._outputs[name]
        return None if unit is None or not unit.text else unit.text

    def value(self, name: str, value: arb) -> arb:
        """A quantity in its declared unit (a level from its own zero)."""
        return in_unit(self.unit(name), value)

    def output_value(self, name: str, value: arb) -> arb:
        """An output in its unit."""
        return in_unit(self._outputs[name], value)

    def per(self, name: str) -> arb:
        """The size of the declared unit in SI (differences: a level has none)."""
        return size(self.unit(name))

    def output_per(self, name: str) -> arb:
        """The size of an output's unit."""
        return size(self._outputs[name])


def size(unit: Unit | None) -> arb:
    """The size of a unit in SI as a ball."""
    if unit is None:
        return arb(1)
    factor = arb(unit.factor)
    return factor * arb.pi() ** unit.pi_power if unit.pi_power else factor


def in_unit(unit: Unit | None, value: arb) -> arb:
    """An SI value in a unit."""
    if unit is None:
        return value
    return (value - arb(unit.offset)) / size(unit)
