"""The expression graph: nodes, derivatives, evaluation, typesetting.

`calculus.symbolic`, the bridge to the symbolic library, is imported by name where it is needed:
it takes seconds to load.
"""

from tangentbook.calculus.derive import Gradient, gradients, rate
from tangentbook.calculus.evaluate import DomainError, FloatArray, Function
from tangentbook.calculus.graph import Graph, Node
from tangentbook.calculus.typeset import decimal_text, latex, latex_name, plain_text

__all__ = [
    "DomainError",
    "FloatArray",
    "Function",
    "Gradient",
    "Graph",
    "Node",
    "decimal_text",
    "gradients",
    "latex",
    "latex_name",
    "plain_text",
    "rate",
]
