"""Which equation serves which unknown: matching, blocks in solving order, hidden constraints.

The unknowns are the highest rates and the algebraic unknowns. A perfect matching of equations and
unknowns must exist (else an unknown lacks an equation, or a combination of equations holds no
unknown); the strongly connected components of the matched system are the blocks that must be
solved together (Duff, Erisman, Reid, "Direct Methods for Sparse Matrices", 1986, ch. 6). Index 1
is checked by the rank of each block's Jacobian at generic points.
"""

from __future__ import annotations

import zlib
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import csr_array
from scipy.sparse.csgraph import connected_components, maximum_bipartite_matching

from tangentbook.calculus.derive import gradients
from tangentbook.calculus.evaluate import DomainError, Function
from tangentbook.errors import StructureError
from tangentbook.plant.model import Block

if TYPE_CHECKING:
    from collections.abc import Sequence

    from tangentbook.calculus.derive import Gradient
    from tangentbook.calculus.graph import Graph, Node
    from tangentbook.plant.model import Equation

# generic points for the rank test: enough that all of them being singular by chance is excluded
GENERIC_POINTS = 4
GENERIC_TRIES = 40
RANK_TOLERANCE = 1e-13
# symbolic solution of a block is for the reader and stays readable only while it is small
SOLVED_BLOCK = 3


def solve_order(
    graph: Graph, equations: Sequence[Equation], unknowns: Sequence[str]
) -> tuple[Block, ...]:
    """Blocks of equations and unknowns in solving order.

    Raises:
        StructureError: counts do not fit, an unknown lacks an equation, or a hidden constraint.
    """
    if not unknowns:
        raise StructureError(
            "structure.no-unknowns",
            "the equations hold no rate and no algebraic unknown: an equation with one new name at "
            "its left is a definition",
            where="equations",
            hint="write a rate as x', or list what the equations determine under `algebraic`",
        )
    jacobian = gradients(graph, [e.residual for e in equations], unknowns)
    _check_presence(graph, equations, jacobian, unknowns)
    _check_count(equations, unknowns, jacobian)
    position = {name: k for k, name in enumerate(unknowns)}
    rows = [[position[name] for name in row] for row in jacobian]
    matched = _match(equations, unknowns, rows)
    order = _components(rows, matched, len(unknowns))
    moving = _moving(graph, equations, unknowns)
    blocks: list[Block] = []
    for component in order:
        block = tuple(sorted(component))
        columns = tuple(unknowns[matched[row]] for row in block)
        given = _given(graph, equations[block[0]].residual, columns, moving)
        if given is not None:
            blocks.append(Block(equations=block, unknowns=columns, linear=True, solved=(given,)))
            continue
        _check_rank(graph, equations, block, columns, jacobian)
        blocks.append(_block(graph, equations, block, columns, jacobian))
    return tuple(blocks)


def _moving(graph: Graph, equations: Sequence[Equation], unknowns: Sequence[str]) -> set[Node]:
    """The nodes of the equations that depend on an unknown."""
    found = {graph.var(name) for name in unknowns}
    for node in graph.reachable([e.residual for e in equations]):
        if any(child in found for child in graph.children(node)):
            found.add(node)
    return found


def _given(graph: Graph, residual: Node, columns: Sequence[str], moving: set[Node]) -> Node | None:
    """The right side of an equation written as "unknown = expression without unknowns"."""
    if len(columns) != 1 or graph.op[residual] != "sub":
        return None
    left, right = graph.children(residual)
    return right if graph.name_of(left) == columns[0] and right not in moving else None


def _names(names: Sequence[str], limit: int = 8) -> str:
    shown = ", ".join(names[:limit])
    return shown + (f" and {len(names) - limit} more" if len(names) > limit else "")


def _counted(count: int, what: str) -> str:
    return f"{count or 'no'} {what}{'' if count == 1 else 's'}"


def _check_presence(
    graph: Graph,
    equations: Sequence[Equation],
    jacobian: Sequence[Gradient],
    unknowns: Sequence[str],
) -> None:
    """Every equation must hold an unknown: one without is a hidden constraint."""
    for equation, row in zip(equations, jacobian, strict=True):
        if not row and unknowns:
            others = sorted(graph.leaves([equation.residual]))
            raise StructureError(
                "structure.hidden-constraint",
                f"{equation.where} ({equation.text}) holds no highest rate and no algebraic "
                f"unknown; it binds {_names(others)} among themselves, a hidden constraint",
                where=equation.where,
                hint="eliminate one of the bound states, or differentiate the constraint and solve "
                "it together with the equations (reduce the index to 1)",
            )


def _check_count(
    equations: Sequence[Equation], unknowns: Sequence[str], jacobian: Sequence[Gradient]
) -> None:
    if len(equations) == len(unknowns):
        return
    rows = [[k for k, name in enumerate(unknowns) if name in row] for row in jacobian]
    matched = _matching(rows, len(unknowns))
    count = f"{_counted(len(equations), 'equation')} for {_counted(len(unknowns), 'unknown')}"
    count += f" ({_names(unknowns)})" if unknowns else ""
    if len(equations) < len(unknowns):
        taken = set(matched)
        free = [name for k, name in enumerate(unknowns) if k not in taken]
        group = _alternatives(rows, matched, unknowns, free)
        which = free[0] if len(group) == 1 else f"one of {_names(group)}"
        what = f"{which} lacks an equation"
        raise StructureError(
            "structure.too-few-equations",
            f"{count}: {what}",
            where="equations",
            hint="add the missing equation, or declare the quantity as input or parameter",
        )
    spare = [e.where for e, column in zip(equations, matched, strict=True) if column < 0]
    raise StructureError(
        "structure.too-many-equations",
        f"{count}: {_names(spare)} {'is' if len(spare) == 1 else 'are'} left over",
        where=spare[0] if spare else "equations",
        hint="remove it, or name the unknown it determines under `algebraic` or `states`",
    )


def _matching(rows: Sequence[Sequence[int]], columns: int) -> list[int]:
    """For each row the column it is matched with, -1 for none."""
    if not rows or not columns:
        return [-1] * len(rows)
    # the graph routines take 32-bit indices only
    indptr = np.cumsum([0, *(len(row) for row in rows)], dtype=np.int32)
    indices = np.array([column for row in rows for column in row], dtype=np.int32)
    pattern = csr_array((np.ones(len(indices)), indices, indptr), shape=(len(rows), columns))
    return [int(c) for c in maximum_bipartite_matching(pattern, perm_type="column")]


def _alternatives(
    rows: Sequence[Sequence[int]],
    matched: Sequence[int],
    unknowns: Sequence[str],
    free: Sequence[str],
) -> list[str]:
    """The unknowns that could be the one without an equation: alternating paths from a free one."""
    reached = {list(unknowns).index(free[0])}
    grows = True
    while grows:
        grows = False
        for row, column in zip(rows, matched, strict=True):
            if column >= 0 and column not in reached and reached & set(row):
                reached.add(column)
                grows = True
    return [unknowns[k] for k in sorted(reached)]


def _match(
    equations: Sequence[Equation], unknowns: Sequence[str], rows: Sequence[Sequence[int]]
) -> list[int]:
    matched = _matching(rows, len(unknowns))
    if all(column >= 0 for column in matched):
        return matched
    spare = [e.where for e, column in zip(equations, matched, strict=True) if column < 0]
    taken = set(matched)
    free = [name for k, name in enumerate(unknowns) if k not in taken]
    crowd = _overdetermined(rows, matched)
    names = [equations[k].where for k in crowd]
    held = sorted({unknowns[c] for k in crowd for c in rows[k]})
    raise StructureError(
        "structure.hidden-constraint",
        f"{_names(names)} together hold only the unknown{'s' if len(held) > 1 else ''} "
        f"{_names(held)}, so a combination of them is a hidden constraint, while "
        f"{_names(free)} lack{'s' if len(free) == 1 else ''} an equation",
        where=spare[0],
        hint="check which equation was meant for the unknown without one; else eliminate a state "
        "or differentiate the constraint",
    )


def _overdetermined(rows: Sequence[Sequence[int]], matched: Sequence[int]) -> list[int]:
    """The equations among which one is too many (alternating paths from an unmatched row)."""
    reached = {next(k for k, column in enumerate(matched) if column < 0)}
    grows = True
    while grows:
        grows = False
        columns = {c for k in reached for c in rows[k]}
        for k, column in enumerate(matched):
            if k not in reached and column in columns:
                reached.add(k)
                grows = True
    return sorted(reached)


def _components(
    rows: Sequence[Sequence[int]], matched: Sequence[int], size: int
) -> list[list[int]]:
    """Rows grouped into blocks, in an order in which each block needs only earlier ones."""
    if not size:
        return []
    owner = {column: row for row, column in enumerate(matched)}
    sources = [row for row, columns in enumerate(rows) for _ in columns]
    targets = [owner[column] for columns in rows for column in columns]
    needs = csr_array((np.ones(len(sources)), (sources, targets)), shape=(size, size))
    count, labels = connected_components(needs, directed=True, connection="strong")
    groups: list[list[int]] = [[] for _ in range(count)]
    for row, label in enumerate(labels):
        groups[int(label)].append(row)
    return _topological(groups, rows, owner, [int(label) for label in labels])


def _topological(
    groups: Sequence[list[int]],
    rows: Sequence[Sequence[int]],
    owner: dict[int, int],
    labels: Sequence[int],
) -> list[list[int]]:
    needs: list[set[int]] = [
        {labels[owner[c]] for row in group for c in rows[row]} - {label}
        for label, group in enumerate(groups)
    ]
    users: list[list[int]] = [[] for _ in groups]
    for label, needed in enumerate(needs):
        for other in needed:
            users[other].append(label)
    waiting = [len(needed) for needed in needs]
    # first equation first, so that the order is that of the text wherever it is free
    ready = sorted(
        (label for label, count in enumerate(waiting) if count == 0), key=lambda g: groups[g][0]
    )
    order: list[list[int]] = []
    while ready:
        label = ready.pop(0)
        order.append(groups[label])
        for user in users[label]:
            waiting[user] -= 1
            if waiting[user] == 0:
                ready.append(user)
    return order


def _check_rank(
    graph: Graph,
    equations: Sequence[Equation],
    block: Sequence[int],
    columns: Sequence[str],
    jacobian: Sequence[Gradient],
) -> None:
    """A block whose Jacobian is singular at every generic point hides a constraint."""
    if len(block) == 1 and graph.value_of(jacobian[block[0]][columns[0]]) is not None:
        return
    entries = [
        (i, j, jacobian[row][name])
        for i, row in enumerate(block)
        for j, name in enumerate(columns)
        if name in jacobian[row]
    ]
    names = sorted(graph.leaves([node for _, _, node in entries]))
    function = Function(graph, names, [node for _, _, node in entries])
    null: np.ndarray | None = None
    for values in _generic_values(function):
        matrix = np.zeros((len(block), len(block)))
        for (i, j, _), value in zip(entries, values, strict=True):
            matrix[i, j] = value
        null = _left_null(matrix)
        if null is None:
            return
    if null is None:
        return  # no generic point inside the domain was found; the point itself will tell
    involved = [
        equations[row] for row, weight in zip(block, null, strict=True) if abs(weight) > 1e-6
    ]
    raise StructureError(
        "structure.hidden-constraint",
        f"{_names([e.where for e in involved])}: a combination of them holds none of the unknowns "
        f"{_names(list(columns))}, a hidden constraint",
        where=involved[0].where,
        hint="one of these equations repeats the others in its highest rates; check the "
        "coefficients, eliminate a state, or differentiate the constraint",
    )


def _generic_values(function: Function) -> list[list[float]]:
    """Values at seeded random points inside the domain (the seed is the names: reproducible)."""
    random = np.random.default_rng(zlib.crc32(" ".join(function.names).encode()))
    found: list[list[float]] = []
    for attempt in range(GENERIC_TRIES):
        size = len(function.names)
        x = random.uniform(0.1, 2.0, size) * random.choice([-1.0, 1.0], size)
        try:
            found.append(function.floats([float(abs(v) if attempt % 2 else v) for v in x]))
        except DomainError:
            continue
        if len(found) == GENERIC_POINTS:
            break
    return found


def _left_null(matrix: np.ndarray) -> np.ndarray | None:
    """The left null vector of an equilibrated matrix, None where it is regular."""
    scaled = matrix.copy()
    for _ in range(4):
        rows = np.sqrt(np.max(np.abs(scaled), axis=1, initial=0.0))
        columns = np.sqrt(np.max(np.abs(scaled), axis=0, initial=0.0))
        if not rows.all() or not columns.all():
            break
        scaled = scaled / rows[:, None] / columns[None, :]
    u, s, _ = np.linalg.svd(scaled)
    return u[:, -1] if s[-1] <= RANK_TOLERANCE * max(s[0], 1e-300) else None


def _block(
    graph: Graph,
    equations: Sequence[Equation],
    block: tuple[int, ...],
    columns: tuple[str, ...],
    jacobian: Sequence[Gradient],
) -> Block:
    coefficients = [[jacobian[row].get(name, graph.const(0)) for name in columns] for row in block]
    flat = [node for line in coefficients for node in line]
    linear = not (graph.leaves(flat) & set(columns))
    solved: tuple[Node, ...] | None = None
    if linear and len(block) <= SOLVED_BLOCK:
        zero = {graph.var(name): graph.const(0) for name in columns}
        constants = graph.substitute([equations[row].residual for row in block], zero)
        solved = tuple(_eliminate(graph, coefficients, constants))
    return Block(equations=block, unknowns=columns, linear=linear, solved=solved)


def _eliminate(graph: Graph, matrix: list[list[Node]], constants: list[Node]) -> list[Node]:
    """Solution of matrix * w + constants = 0 by Cramer's rule (at most three unknowns)."""
    determinant = _determinant(graph, matrix)
    solution: list[Node] = []
    for column in range(len(matrix)):
        replaced = [
            [graph.neg(constants[r]) if c == column else node for c, node in enumerate(line)]
            for r, line in enumerate(matrix)
        ]
        solution.append(graph.div(_determinant(graph, replaced), determinant))
    return solution


def _determinant(graph: Graph, matrix: list[list[Node]]) -> Node:
    if len(matrix) == 1:
        return matrix[0][0]
    total = graph.const(0)
    for column, node in enumerate(matrix[0]):
        if graph.is_zero(node):
            continue
        minor = [[n for c, n in enumerate(line) if c != column] for line in matrix[1:]]
        term = graph.times(node, _determinant(graph, minor))
        total = graph.sub(total, term) if column % 2 else graph.add(total, term)
    return total
