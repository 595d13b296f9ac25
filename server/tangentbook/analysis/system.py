"""The equations of a point as numbers: residuals and sparse Jacobian over the free quantities.

    r(q) = residuals of the open rows,  J = dr/dq

where q are the free quantities, the fixed ones and the parameters have their values and all
highest rates are zero. A residual is judged against the size of its row: the sum of its absolute
terms, plus what the size of each quantity in it can change (at sin(pi) the terms alone vanish).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from flint import arb
from scipy.sparse import csc_array

from tangentbook.calculus.derive import gradients
from tangentbook.calculus.evaluate import DomainError, Function

if TYPE_CHECKING:
    from collections.abc import Sequence

    import numpy.typing as npt

    from tangentbook.analysis.conditions import Conditions
    from tangentbook.analysis.constants import Constants
    from tangentbook.calculus.graph import Node
    from tangentbook.plant.model import Plant

    Vector = npt.NDArray[np.float64]
    Matrix = npt.NDArray[np.float64]


NEAR = 1e-3
ROUNDING = arb(2) ** -100


class System:
    """Residual and Jacobian of one point's open rows; see the module docstring."""

    def __init__(self, plant: Plant, constants: Constants, conditions: Conditions) -> None:
        self.plant = plant
        self.constants = constants
        self.conditions = conditions
        graph = plant.graph
        self.free = conditions.free
        rows = [conditions.rows[k].residual for k in conditions.open_rows]
        self.names = (*constants.names, *conditions.columns, *plant.rates)
        partials = gradients(graph, rows, self.free)
        position = {name: k for k, name in enumerate(self.free)}
        self.entries = [
            (i, position[name], node)
            for i, row in enumerate(partials)
            for name, node in row.items()
        ]
        self.rows = np.array([i for i, _, _ in self.entries], dtype=np.int64)
        self.cols = np.array([j for _, j, _ in self.entries], dtype=np.int64)
        self.shape = (len(rows), len(self.free))
        jacobian = [node for _, _, node in self.entries]
        self._residual = Function(graph, self.names, rows)
        self._both = Function(graph, self.names, [*rows, *jacobian])
        self._terms = Function(graph, self.names, [_size(plant, row) for row in rows])
        self._slopes = gradients(graph, rows, conditions.columns)
        slopes = [node for row in self._slopes for node in row.values()]
        self._slope_values = Function(graph, self.names, slopes)
        offset = len(constants.names)
        index = {name: offset + k for k, name in enumerate(conditions.columns)}
        self._free_at = [index[name] for name in self.free]
        self._fixed_at = [(index[name], node) for name, node in conditions.fixed.items()]
        self._template = [*constants.floats, *([0.0] * (len(self.names) - offset))]
        for at, node in self._fixed_at:
            self._template[at] = float(constants.value(node).mid())

    def point(self, q: Sequence[float] | Vector) -> list[float]:
        """All values in the order of `names`, in double precision."""
        values = list(self._template)
        for at, value in zip(self._free_at, q, strict=True):
            values[at] = float(value)
        return values

    def ball_point(self, q: Sequence[arb]) -> list[arb]:
        """All values in the order of `names`, as balls at the current precision."""
        offset = len(self.constants.names)
        values = [*self.constants.balls(), *([arb(0)] * (len(self.names) - offset))]
        for at, node in self._fixed_at:
            values[at] = self.constants.value(node)
        for at, value in zip(self._free_at, q, strict=True):
            values[at] = value
        return values

    def residual(self, q: Vector) -> Vector:
        """r(q).

        Raises:
            DomainError: an equation has no value there.
        """
        return np.array(self._residual.floats(self.point(q)), dtype=np.float64)

    def both(self, q: Vector) -> tuple[Vector, Vector]:
        """r(q) and the entries of J in the order of `entries`.

        Raises:
            DomainError: an equation or a derivative has no finite value there.
        """
        values = np.array(self._both.floats(self.point(q)), dtype=np.float64)
        return values[: self.shape[0]], values[self.shape[0] :]

    def sizes(self, q: Vector, typical: Vector) -> Vector:
        """The size of each row around q, against which its residual is judged.

        At a double root terms and slopes vanish together, so a small neighbourhood is asked.
        """
        largest = np.full(self.shape[0], 1e-300)
        for point in (q, *neighbours(q, typical)):
            try:
                largest = np.maximum(largest, self._sizes_at(point, typical))
            except DomainError:
                continue
        return largest

    def _sizes_at(self, q: Vector, typical: Vector) -> Vector:
        values = self.point(q)
        sizes = self._terms.floats(values)
        reach = {n: abs(v) for n, v in zip(self.names, values, strict=True)}
        for name, floor in zip(self.free, typical, strict=True):
            reach[name] = max(reach[name], float(floor))
        slopes = iter(self._slope_values.floats(values))
        for k, row in enumerate(self._slopes):
            sizes[k] += sum(abs(next(slopes)) * reach[name] for name in row)
        return np.array(sizes)

    def ball_residual(self, q: Sequence[arb]) -> list[arb]:
        """R over balls."""
        return self._residual.balls(self.ball_point(q))

    def met(self, q: Sequence[arb]) -> bool:
        """Whether zero lies within every row over the balls, or is missed by rounding only.

        A row that merely becomes small (exp of a large negative number) is not met.
        """
        point = self.ball_point(q)
        rows = zip(self._residual.balls(point), self._terms.balls(point), strict=True)
        return all(r.contains(0) or abs(r) <= t * ROUNDING for r, t in rows)

    def ball_jacobian(self, q: Sequence[arb]) -> list[arb]:
        """The entries of J over balls."""
        return self._both.balls(self.ball_point(q))[self.shape[0] :]

    def dense(self, entries: Vector) -> Matrix:
        """J as a dense matrix."""
        matrix = np.zeros(self.shape)
        matrix[self.rows, self.cols] = entries
        return matrix

    def sparse(self, entries: Vector) -> csc_array:
        """J as a sparse matrix."""
        return csc_array((entries, (self.rows, self.cols)), shape=self.shape)

    def blame(self, q: Vector) -> tuple[str, str] | None:
        """The first row without a value at q and the expression at fault, if any."""
        for row, node in zip(self.conditions.open_rows, self._residual.outputs, strict=True):
            found = first_undefined(self.plant, self.names, node, self.point(q))
            if found is not None:
                return self.conditions.rows[row].label, found
        return None


def neighbours(q: Vector, typical: Vector) -> tuple[Vector, Vector]:
    """Two points a thousandth of each size away from q."""
    reach = np.where(np.abs(q) > 1e-12 * typical, np.abs(q), typical) * NEAR
    # unequal shares, so that no symmetry of the equations hides an entry
    shift = reach * np.linspace(0.6, 1.0, len(q))
    return q + shift, q - shift


def _size(plant: Plant, residual: Node) -> Node:
    graph = plant.graph
    total = graph.const(0)
    for term in graph.terms(residual):
        total = graph.add(total, graph.unary("abs", term))
    return total


def first_undefined(
    plant: Plant, names: Sequence[str], root: Node, values: Sequence[float]
) -> str | None:
    """The innermost expression of `root` without a finite value, with its argument's value."""
    graph = plant.graph
    for node in graph.reachable([root]):
        if not graph.children(node):
            continue
        try:
            Function(graph, names, [node]).floats(values)
        except DomainError:
            children = graph.children(node)
            child = children[1] if graph.op[node] == "div" else children[0]
            argument = Function(graph, names, [child]).floats(values)[0]
            what = (
                "division by"
                if graph.op[node] == "div"
                else f"{graph.op[node]} of an argument with"
            )
            return f"{what} the value {argument:.6g}"
        except TypeError:  # a condition is no number
            continue
    return None
