"""Is the derivative single-valued at the point?

Every |a|, sign(a), min, max and condition switches where a difference of two expressions changes
sign. Where such a difference is zero at the point, the equations and their derivatives are
evaluated on each side of it (the switches are passed in, not computed). Sides that agree in value
and in every partial derivative leave one linear model (v*|v| at 0); values that differ are a jump
(sign(v) at 0: a set of rest points); derivatives that differ are a kink (|v| at 0).
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product
from typing import TYPE_CHECKING

from flint import arb

from tangentbook.analysis.settings import MAX_KINK_SIDES
from tangentbook.calculus.evaluate import Function
from tangentbook.calculus.typeset import plain_text

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from tangentbook.analysis.linear import Partials
    from tangentbook.calculus.graph import Graph, Node

_SWITCHES = frozenset(("sign", "abs", "min", "max", "lt", "le", "eq", "ne"))
_SWITCHED = ("sign", "lt", "le", "eq", "ne")


@dataclass(frozen=True, slots=True, kw_only=True)
class Kinks:
    """What was found at the switching expressions that are zero at the point.

    `active` are those expressions in plain text; `kind` is "none" (no switch at the point),
    "single-valued", "kink", "jump" or "undecided"; `why` says it in a sentence. `partials` are the
    derivative nodes on one side, to be used where the sides agree (at the tie itself max and min
    both pick their first branch, which belongs to no side).
    """

    kind: str
    active: tuple[str, ...] = ()
    why: str = ""
    equations: tuple[str, ...] = ()
    partials: Mapping[int, arb] | None = None


Pair = tuple[int, int]


def _pair(graph: Graph, node: Node) -> tuple[Pair, int]:
    """The two expressions whose order a switch depends on, and the orientation (+1 or -1)."""
    children = graph.children(node)
    a, b = (children[0], graph.const(0)) if len(children) == 1 else (children[0], children[1])
    return ((a, b), 1) if a <= b else ((b, a), -1)


def examine(partials: Partials, values: Sequence[arb]) -> Kinks:
    """Examine all switches at the point (values in the order of `partials.names`)."""
    plant = partials.plant
    graph = plant.graph
    roots = [*(e.residual for e in plant.equations), *(o.node for o in plant.outputs)]
    everything = graph.reachable([*roots, *partials.nodes])
    switches = [node for node in everything if graph.op[node] in _SWITCHES]
    if not switches:
        return Kinks(kind="none")
    pairs = {_pair(graph, node)[0] for node in switches}
    active = _active(graph, sorted(pairs), partials.names, values)
    if not active:
        return Kinks(kind="none")
    names = tuple(_shown(graph, pair) for pair in active)
    if len(active) > MAX_KINK_SIDES:
        return Kinks(
            kind="undecided",
            active=names,
            why=f"{len(active)} expressions switch at the point ({', '.join(names[:4])} …); "
            f"at most {MAX_KINK_SIDES} are examined side by side",
        )
    return _compare(partials, values, roots, switches, active, names)


def _active(
    graph: Graph, pairs: Sequence[Pair], names: Sequence[str], values: Sequence[arb]
) -> list[Pair]:
    flat = [node for pair in pairs for node in pair]
    found = Function(graph, names, flat).balls(values)
    return [
        pair
        for k, pair in enumerate(pairs)
        if pair[0] != pair[1] and found[2 * k].overlaps(found[2 * k + 1])
    ]


def _shown(graph: Graph, pair: Pair) -> str:
    left, right = pair
    if graph.is_zero(left):
        return plain_text(graph, right)
    return plain_text(graph, left if graph.is_zero(right) else graph.sub(left, right))


def _compare(
    partials: Partials,
    values: Sequence[arb],
    roots: Sequence[Node],
    switches: Sequence[Node],
    active: Sequence[Pair],
    names: tuple[str, ...],
) -> Kinks:
    graph = partials.plant.graph
    passed = [
        node for node in switches if graph.op[node] in _SWITCHED and _pair(graph, node)[0] in active
    ]
    outputs = [*roots, *partials.nodes]
    function = Function(graph, partials.names, outputs, switches=passed)
    sides = [
        function.series([*values, *_decided(graph, passed, dict(zip(active, signs, strict=True)))])
        for signs in product((1, -1), repeat=len(active))
    ]
    here = Function(graph, partials.names, list(roots)).balls(values)
    count = len(roots)
    first = [arb(v) for v in sides[0]]
    jumps = [
        k
        for k in range(count)
        if any(not arb(side[k]).overlaps(first[k]) for side in sides)
        or not here[k].overlaps(first[k])
    ]
    where = [e.where for e in partials.plant.equations] + [
        f"output {o.name}" for o in partials.plant.outputs
    ]
    shown = ", ".join(names)
    if jumps:
        spans = {where[k]: [arb(side[k]) for side in sides] for k in jumps}
        why = _jump_text(shown, spans)
        return Kinks(kind="jump", active=names, equations=tuple(spans), why=why)
    bent = any(
        not arb(side[k]).overlaps(first[k]) for side in sides for k in range(count, len(outputs))
    )
    if bent:
        return Kinks(
            kind="kink",
            active=names,
            why=f"the derivative has different values on the two sides of {shown} = 0, so there is "
            "no single linear model at this point",
        )
    return Kinks(
        kind="single-valued",
        active=names,
        why=f"{shown} {'is' if len(names) == 1 else 'are'} zero at the point, where the equations "
        "switch, and the derivatives on all sides agree",
        partials=dict(zip(partials.nodes, first[count:], strict=True)),
    )


def _jump_text(shown: str, spans: Mapping[str, Sequence[arb]]) -> str:
    """What a jump means; a set of rest points only where zero lies between the sides."""
    places = ", ".join(spans)
    sides = "; ".join(f"{place}: {_span(values)}" for place, values in spans.items())
    text = (
        f"{places} jump{'s' if len(spans) == 1 else ''} where {shown} = 0, so there is no linear "
    )
    text += f"model there (left minus right on the sides, in SI: {sides})"
    if any(_encloses_zero(values) for values in spans.values()):
        text += (
            "; zero lies between the sides, so a whole set of rest points is near, as with dry "
            "friction, not an isolated one"
        )
    return text


def _encloses_zero(values: Sequence[arb]) -> bool:
    return any(v < 0 for v in values) and any(v > 0 for v in values)


def _span(values: Sequence[arb]) -> str:
    middle = [float(v.mid()) for v in values]
    return f"{min(middle):.6g} to {max(middle):.6g}"


def _decided(graph: Graph, passed: Sequence[Node], signs: dict[Pair, int]) -> list[object]:
    """The value of each passed switch when the active differences have the given signs."""
    decided: list[object] = []
    for node in passed:
        pair, orientation = _pair(graph, node)
        side = signs[pair] * orientation
        op = graph.op[node]
        if op == "sign":
            decided.append(arb(side))
        elif op in ("lt", "le"):
            decided.append(side < 0)
        else:  # eq, ne: off the tie the two are unequal
            decided.append(op == "ne")
    return decided
