"""A plant as it was written: plain records, nothing understood yet."""

from __future__ import annotations

from dataclasses import dataclass, field

Scalar = int | float | str


@dataclass(frozen=True, slots=True, kw_only=True)
class EquationText:
    """One equation as written."""

    text: str
    label: str = ""
    source: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class DeclaredText:
    """What was declared of a state, input, output or algebraic unknown."""

    name: str
    unit: str | None = None
    expression: str | None = None
    about: str = ""
    positive: str = ""
    typical: Scalar | None = None
    period: Scalar | None = None
    limits: tuple[Scalar | None, Scalar | None] = (None, None)
    disturbance: bool = False
    rest: Scalar | None = None
    source: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class ParameterText:
    """A parameter as written: a number or expression in `unit`, or a quantity."""

    name: str
    value: Scalar
    unit: str | None = None
    is_quantity: bool = True
    about: str = ""
    tolerance: Scalar | None = None
    source: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class DefinitionText:
    """A named expression as written."""

    name: str
    text: str
    unit: str | None = None
    about: str = ""
    source: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class PlantText:
    """A plant as written."""

    name: str
    equations: tuple[EquationText, ...]
    time: str = "s"
    algebraic: tuple[DeclaredText, ...] = ()
    states: tuple[DeclaredText, ...] = ()
    inputs: tuple[DeclaredText, ...] = ()
    outputs: tuple[DeclaredText, ...] = ()
    parameters: tuple[ParameterText, ...] = ()
    definitions: tuple[DefinitionText, ...] = field(default=())
