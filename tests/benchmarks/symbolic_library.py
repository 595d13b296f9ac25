# pyright: reportUnknownMemberType=false, reportUnknownVariableType=false
# pyright: reportUnknownArgumentType=false, reportMissingTypeStubs=false
"""The symbolic library on the same task: sparse derivatives of the same nodes, one function.

Its cache is emptied first, so that every run is a first one.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import sympy
from sympy.core.cache import clear_cache

from tangentbook.calculus.symbolic import expressions_of

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from tangentbook.calculus.graph import Graph, Node


def prepared(
    graph: Graph, nodes: Sequence[Node], columns: Sequence[str], names: Sequence[str]
) -> Callable[[Sequence[float]], Sequence[float]]:
    """Values and sparse derivatives of the nodes as one function of the named values.

    Each expression is differentiated by those of the columns that occur in it; common parts are
    then named once, over everything, when the function is written.
    """
    clear_cache()
    expressions, symbols = expressions_of(graph, nodes)
    outputs: list[Any] = list(expressions)
    for expression in expressions:
        own = expression.free_symbols
        present = [symbols[name] for name in columns if name in symbols]
        outputs += [sympy.diff(expression, symbol) for symbol in present if symbol in own]
    arguments = [symbols.get(name, sympy.Dummy()) for name in names]
    return sympy.lambdify([arguments], outputs, modules="math", cse=True)
