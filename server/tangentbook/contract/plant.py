"""The plant of a request: what may be written, before anything is understood of it."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, ConfigDict, Field, model_validator

from tangentbook.contract.base import Line, Model, Name, Scalar, Text
from tangentbook.contract.plain import is_array, is_object

Texts = Annotated[tuple[Text, ...], BeforeValidator(lambda v: [v] if isinstance(v, str) else v)]


class Equation(Model):
    """One equation with its label and source."""

    is_: Text = Field(alias="is", description='"left = right"; a prime is d/dt')
    label: Line = Field(default="", description="a short name for messages and the report")
    about: Text = ""
    source: Text = ""
    assumptions: Texts = ()
    numeric: bool = Field(default=False, description="numbers in the declared units")


class Declaration(Model):
    """What is declared of a state, input, output, setting or algebraic unknown."""

    is_: Text | None = Field(default=None, alias="is", description="outputs only: the expression")
    unit: Text | None = Field(default=None, description='SI text such as "kg m^2", "deg", "1/s"')
    about: Text = ""
    positive: Text = Field(default="", description="what a positive value means")
    typical: Scalar | None = Field(default=None, description="typical size, for scaling")
    period: Scalar | None = Field(default=None, description='period of an angle, as "360 deg"')
    limits: tuple[Scalar | None, Scalar | None] | None = Field(
        default=None, description="[lower, upper], null for none"
    )
    role: Literal["control", "disturbance"] = "control"
    rest: Scalar | None = Field(default=None, description="value of a disturbance at rest")
    source: Text = ""
    assumptions: Texts = ()


class Parameter(Model):
    """A constant of the plant."""

    value: Scalar | None = Field(default=None, description="number or numeric expression in `unit`")
    is_: Scalar | None = Field(default=None, alias="is", description="quantity expression")
    unit: Text | None = None
    about: Text = ""
    tolerance: Scalar | None = Field(default=None, description='as "20 %" or "0.1 m"')
    source: Text = ""
    assumptions: Texts = ()

    @model_validator(mode="after")
    def _one_value(self) -> Parameter:
        if (self.value is None) == (self.is_ is None):
            msg = "give either `value` or `is`"
            raise ValueError(msg)
        return self


class Definition(Model):
    """A named expression."""

    is_: Text = Field(alias="is")
    unit: Text | None = None
    about: Text = ""
    source: Text = ""
    assumptions: Texts = ()
    numeric: bool = False


def _worded(value: object, field: str) -> object:
    """Texts of a list or map become {field: text}; whatever is a table already stays."""
    if is_array(value):
        return [{field: item} if isinstance(item, str) else item for item in value]
    if is_object(value):
        return {
            key: {field: item} if isinstance(item, str) else item for key, item in value.items()
        }
    return value


def _equations(value: object) -> object:
    return _worded(value, "is")


def _declarations(value: object) -> object:
    """A list of names, or name -> "unit" | {…}: both become name -> {…}."""
    return _from_names(value) if is_array(value) else _worded(value, "unit")


def _outputs(value: object) -> object:
    """Outputs: a text is the expression, not the unit."""
    return _from_names(value) if is_array(value) else _worded(value, "is")


def _definitions(value: object) -> object:
    return _worded(value, "is")


def _parameters(value: object) -> object:
    if is_object(value):
        return {key: item if is_object(item) else {"is": item} for key, item in value.items()}
    return value


def _from_names(value: list[Any]) -> dict[str, Any]:
    named: dict[str, Any] = {}
    for item in value:
        if not isinstance(item, str):
            msg = "a list of names is expected"
            raise ValueError(msg)  # noqa: TRY004 - pydantic turns ValueError into its own error
        if item in named:
            msg = f"the name {item} is listed twice"
            raise ValueError(msg)
        named[item] = {}
    return named


Declarations = Annotated[dict[Name, Declaration], BeforeValidator(_declarations)]
Outputs = Annotated[dict[Name, Declaration], BeforeValidator(_outputs)]

BRIDGE: dict[str, Any] = {
    "name": "Lift bridge leaf",
    "about": "Leaf of a small lift bridge, driven at the hinge through a motor with lag.",
    "field": "machinery",
    "equations": [
        "J*theta'' + b*theta' + W*r*cos(theta) = M + Mw",
        "Tm*M' = Mc - M",
    ],
    "states": {
        "theta": {"unit": "rad", "about": "leaf angle above the horizontal", "positive": "opening"},
        "M": "N m",
    },
    "inputs": {
        "Mc": {"unit": "N m", "about": "motor torque asked for", "limits": [0, "20 kN m"]},
        "Mw": {"unit": "N m", "about": "wind moment", "role": "disturbance", "rest": 0},
    },
    "outputs": {"angle": "theta"},
    "parameters": {
        "J": "2.4e5 kg m^2",
        "b": {"value": 1800, "unit": "N m s", "tolerance": "20 %"},
        "W": "52 kN",
        "r": "0.35 m",
        "Tm": "0.4 s",
    },
}
"""The complete example of the plant schema."""


class Plant(Model):
    """A plant as equations: only `name`, `equations` and what they need is required."""

    model_config = ConfigDict(json_schema_extra={"examples": [BRIDGE]})

    name: Line = Field(min_length=1, description="what the plant is called")
    about: Text = ""
    field: Text = Field(
        default="", description="trade, selects cautions: flight, process, marine, …"
    )
    time: Text = Field(default="s", description='unit of rates and eigenvalues; "1": dimensionless')
    revision: Text = ""
    source: Text = ""
    assumptions: Texts = ()
    equations: Annotated[tuple[Equation, ...], BeforeValidator(_equations)] = Field(
        min_length=1,
        max_length=10_000,
        description='each "left = right"; x\' is dx/dt, any order, need not be solved; '
        "+ - * / ^ ( ) sin cos tan asin acos atan atan2 sinh cosh tanh exp log log10 sqrt abs sign "
        "min max clip if(cond, a, b); pi; literals with a unit as 64.94[1/s]",
    )
    algebraic: Declarations = Field(
        default_factory=dict,
        description='unknowns without a rate ("0 = …"): names or table',
    )
    states: Declarations = Field(
        default_factory=dict, description="optional: units, order, typical sizes"
    )
    inputs: Declarations = Field(
        default_factory=dict,
        description='names, or name -> {unit, role: "control" | "disturbance", limits, rest}',
    )
    outputs: Outputs = Field(
        default_factory=dict, description="name -> expression; none given: all states"
    )
    settings: Declarations = Field(default_factory=dict)
    parameters: Annotated[dict[Name, Parameter], BeforeValidator(_parameters)] = Field(
        default_factory=dict,
        description='name -> number | "number unit" | constant expression | {value, unit, …}',
    )
    definitions: Annotated[dict[Name, Definition], BeforeValidator(_definitions)] = Field(
        default_factory=dict, description="name -> expression, any order, may contain rates"
    )
    tables: dict[Name, Any] = Field(default_factory=dict)


class PlantRef(Model):
    """A plant given by the id of an earlier reply (or a name of the served folder)."""

    ref: Text = Field(description="plant id from an earlier reply, or a name of the served folder")
    set: dict[Name, Scalar] = Field(
        default_factory=dict, description='parameters that differ, as {"J": "2.6e5 kg m^2"}'
    )
