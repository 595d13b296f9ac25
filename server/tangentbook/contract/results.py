"""The result of a call (schema "tangentbook/result/1"): what design and schemas promise.

Tools build it, `without_empty` drops what is not their business, and the models here publish
and check its shape. Numbers are in declared units and already rounded to digits that are known.
"""

from __future__ import annotations

from typing import Any, Literal

from pydantic import Field

from tangentbook.contract.base import Model

SCHEMA = "tangentbook/result/1"

Outcome = Literal["done", "no-point", "stopped"]
Reason = Literal["conflict", "undetermined", "not found", "outside domain", "depends on time"]
Known = Literal["exact", "proved", "computed twice", "measured", "assumed"]
Matrix = list[list[float | None]]


class SparseMatrix(Model):
    """A matrix of a plant with more than 40 states."""

    shape: tuple[int, int]
    entries: list[tuple[int, int, float]]
    file: str | None = None


class Value(Model):
    """One value of the point."""

    value: float
    unit: str | None = None
    known: Known
    exact: str | None = None
    role: str | None = None


class Margin(Model):
    """Distance of a value from a declared limit; negative beyond it."""

    name: str
    side: Literal["lower", "upper"]
    limit: float
    margin: float
    unit: str | None = None


class LinearModel(Model):
    """x' = f0 + A (x - x0) + B (u - u0), y = y0 + C (x - x0) + D (u - u0)."""

    kind: Literal["continuous"] = "continuous"
    time: str
    states: list[str]
    inputs: list[str]
    outputs: list[str]
    A: Matrix | SparseMatrix
    B: Matrix | SparseMatrix
    C: Matrix | SparseMatrix
    D: Matrix | SparseMatrix
    x0: list[float]
    u0: list[float]
    y0: list[float]
    f0: list[float]
    known: Known
    dc_gain: Matrix | None = Field(default=None, description="y per u at rest, null where none")
    dc_gain_note: str | None = None


class Eigenvalue(Model):
    """An eigenvalue of A, in rad per `time`; `radius`: distance of the truth from the print."""

    re: float
    im: float
    radius: float | None = None
    count: int = 1
    side: str | None = None
    exact: str | None = None


class Stability(Model):
    """Eigenvalues, and the verdict where a tool gives one."""

    eigenvalues: list[Eigenvalue]
    known: Known
    verdict: str | None = None
    linear: str | None = None
    of: str | None = None
    neutral: list[str] | None = None
    why: str | None = None
    modes: list[Any] | None = None
    critical: list[Any] | None = None


class NoModel(Model):
    """Why there is a point but no linear model there."""

    reason: str
    names: list[str]


class PointResult(Model):
    """One operating point of the call, or why there is none."""

    request: int = Field(description="index into the `point` list of the call")
    id: str | None = None
    name: str | None = None
    outcome: Outcome
    reason: Reason | None = None
    why: str | None = None
    kind: Literal["equilibrium", "steady motion", "quasi-steady"] | None = None
    known: Known | None = None
    redundant: list[str] | None = None
    undetermined: list[str] | None = None
    blocking: list[str] | None = None
    dropped: list[str] | None = None
    values: dict[str, Value] | None = None
    rates: dict[str, Value] | None = None
    closest: dict[str, Value] | None = None
    residual: float | None = Field(
        default=None, description="of the closest approach, relative to the size of its row"
    )
    conditioning: float | None = None
    sensitivity: dict[str, dict[str, float]] | None = Field(
        default=None, description="dx0/dp: found name -> parameter -> derivative, declared units"
    )
    margins: list[Margin] | None = None
    model: LinearModel | None = None
    no_model: NoModel | None = None
    stability: Stability | None = None


class Check(Model):
    """A number compared with a second route, and its limit."""

    code: str
    what: str
    value: float
    limit: float
    holds: bool
    point: str | None = None


class Caution(Model):
    """What the reader must know before using the answer."""

    code: str
    about: list[str]
    text: str


class PlantSummary(Model):
    """The plant as understood."""

    name: str
    id: str
    roles: dict[str, str]
    states: list[str] | None = None
    inputs: list[str] | None = None
    outputs: list[str] | None = None
    algebraic: list[str] | None = None
    normal_form: dict[str, Any] | None = None
    units: dict[str, str | None] | None = None


class ReportLink(Model):
    """Where the report of the call is."""

    id: str
    uri: str
    path: str | None = None


class Validity(Model):
    """What the answer holds for, and what was not looked at."""

    amplitude: list[Any] = Field(default_factory=list)
    duration: float | None = None
    parameters: dict[str, Any] = Field(default_factory=dict)
    not_checked: list[str] = Field(default_factory=list)


class Result(Model):
    """The answer of one call."""

    schema_: Literal["tangentbook/result/1"] = Field(alias="schema")
    tool: str
    tool_version: str
    outcome: Outcome
    plant: PlantSummary
    answer: str = Field(description="one sentence with its scope")
    points: list[PointResult] = Field(default_factory=list[PointResult])
    complete: bool | None = None
    comparison: list[Any] | None = None
    validity: Validity | None = None
    checks: list[Check] = Field(default_factory=list[Check])
    cautions: list[Caution] = Field(default_factory=list[Caution])
    stopped_by: str | None = None
    report: ReportLink | None = None
