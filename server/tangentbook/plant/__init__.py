"""Text to plant: grammar, units, values, roles, and the order in which the equations are solved."""

from tangentbook.plant.build import build_plant, read_output
from tangentbook.plant.model import Block, Definition, Equation, Output, Parameter, Plant, Variable
from tangentbook.plant.source import (
    DeclaredText,
    DefinitionText,
    EquationText,
    ParameterText,
    PlantText,
    Scalar,
)
from tangentbook.plant.units import ONE, Unit, parse_unit
from tangentbook.plant.values import read_value

__all__ = [
    "ONE",
    "Block",
    "DeclaredText",
    "Definition",
    "DefinitionText",
    "Equation",
    "EquationText",
    "Output",
    "Parameter",
    "ParameterText",
    "Plant",
    "PlantText",
    "Scalar",
    "Unit",
    "Variable",
    "build_plant",
    "parse_unit",
    "read_output",
    "read_value",
]
