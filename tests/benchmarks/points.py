"""Operating points and linear models: how they grow, and a plant with coupled highest rates.

The linear model includes its second routes (differences and remainder of the original equations
in 256 bits, for small plants the symbolic library) and the eigenvalues.
"""

from __future__ import annotations

from dataclasses import dataclass
from statistics import median

from measure import exponent, seconds
from plants import Case, case_of_size, chain
from table import show, shown

from tangentbook.analysis.linearize import Linearization, linearize
from tangentbook.analysis.trim import OperatingPoint, find_point
from tangentbook.plant.build import build_plant

SIZES = (2, 12, 50, 200)
NETWORKS = (50, 200)
BODIES = (2, 3, 4, 6, 8)


@dataclass(slots=True)
class Walk:
    """One way from text to linear model: seconds and nodes after each stage."""

    build: float
    trim: float
    model: float
    nodes: tuple[int, int, int]

    @property
    def all(self) -> float:
        """The whole way."""
        return self.build + self.trim + self.model


def walk(case: Case) -> Walk:
    """Text to linear model, on a graph of its own.

    Raises:
        ArithmeticError: no point or no model was found, so there is nothing to time.
    """
    text = case.text
    begin = seconds(lambda: build_plant(text))
    plant = build_plant(text)
    nodes = [len(plant.graph)]
    found: list[OperatingPoint] = []

    def trim() -> None:
        point = find_point(plant, case.point)
        if isinstance(point, OperatingPoint):
            found.append(point)

    trimmed = seconds(trim)
    nodes.append(len(plant.graph))
    if not found:
        msg = f"{plant.name}: no operating point"
        raise ArithmeticError(msg)
    models: list[Linearization] = []
    modelled = seconds(lambda: models.append(linearize(found[0])))
    if models[0].model is None:
        raise ArithmeticError(models[0].why)
    nodes.append(len(plant.graph))
    return Walk(build=begin, trim=trimmed, model=modelled, nodes=(nodes[0], nodes[1], nodes[2]))


def _middle(walks: list[Walk]) -> Walk:
    return Walk(
        build=median(w.build for w in walks),
        trim=median(w.trim for w in walks),
        model=median(w.model for w in walks),
        nodes=walks[0].nodes,
    )


def points_and_models(*, quick: bool) -> None:
    """Trim and linearize at four sizes."""
    walk(case_of_size(2))  # whatever is imported on first use
    walks: dict[int, list[Walk]] = {n: [] for n in SIZES}
    for _ in range(1 if quick else 3):
        for n in SIZES:
            walks[n].append(walk(case_of_size(n)))
    found = {n: _middle(each) for n, each in walks.items()}
    trims = [found[n].trim for n in NETWORKS]
    models = [found[n].model for n in NETWORKS]
    show(
        "Operating point and linear model",
        ["", *(f"n = {n}" for n in SIZES), "exponent 50 to 200"],
        [
            [
                "trim",
                *(shown(found[n].trim) for n in SIZES),
                f"{exponent(NETWORKS, trims):.2f}",
            ],
            [
                "linearize",
                *(shown(found[n].model) for n in SIZES),
                f"{exponent(NETWORKS, models):.2f}",
            ],
            ["nodes", *(str(found[n].nodes[-1]) for n in SIZES), ""],
        ],
        note="n = 2: pendulum; n = 12: moored balloon; else a network.",
    )


def coupled_rates(*, quick: bool) -> None:
    """Chains of pendulums, text to linear model; the graph must not grow out of hand."""
    rounds = 1 if quick else 3
    found = {n: _middle([walk(chain(n)) for _ in range(rounds)]) for n in BODIES}
    nodes = [float(found[n].nodes[-1]) for n in BODIES]
    times = [found[n].all for n in BODIES]
    show(
        "Coupled highest rates: chain of bodies, text to A and B",
        ["bodies", "build", "trim", "linearize", "all", "nodes built", "nodes at the end"],
        [
            [
                str(n),
                shown(w.build),
                shown(w.trim),
                shown(w.model),
                shown(w.all),
                str(w.nodes[0]),
                str(w.nodes[-1]),
            ]
            for n, w in found.items()
        ],
        note=f"Growth with the number of bodies: nodes {exponent(BODIES, nodes):.2f}, "
        f"time {exponent(BODIES, times):.2f}; the text itself grows with the cube.",
    )
