"""Functions on balls (flint.arb) and on truncated power series over balls (flint.arb_series).

Python-flint returns NaN where a ball leaves the domain, and a few of its functions are hopeless
on wide balls: tanh of 0 ± 5 comes out as ± 2e4, a power of a ball about 0 as NaN. Monotone
functions are therefore taken by their endpoints and powers by products. A condition on balls
is True, False or None (cannot be told); a choice that cannot be told is the union of its branches,
for series coefficient by coefficient.
"""

from __future__ import annotations

from operator import methodcaller
from typing import TYPE_CHECKING, TypeAlias

from flint import arb, arb_series

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable

Ball: TypeAlias = "arb | arb_series"
Truth: TypeAlias = "bool | None"

NAN = arb("nan")
_EITHER_SIGN = arb(0, 1)
WIDE_BITS = 20
"""Below this relative accuracy a product of a ball with itself loses visibly to its ends."""


def _head(a: Ball) -> arb:
    """The constant coefficient, or the ball itself."""
    return a[0] if isinstance(a, arb_series) else a


def _nan_like(a: Ball) -> Ball:
    # every coefficient: a lone NaN head would leave the others at zero
    return arb_series([NAN] * a.prec, a.prec) if isinstance(a, arb_series) else NAN


def _by_ends(a: arb, function: Callable[[arb], arb]) -> arb:
    if a.is_exact():
        return function(a)
    low, high = function(arb(a.lower())), function(arb(a.upper()))
    return low.union(high)


def _even(a: arb, function: Callable[[arb], arb]) -> arb:
    """An even function that grows with |a|: by the ends of |a|, so that it never dips below."""
    if a.is_exact():
        return function(a)
    if a.contains(0):
        return function(arb(0)).union(function(arb(a.abs_upper())))
    return _by_ends(abs(a), function)


def _tanh(a: Ball) -> Ball:
    if isinstance(a, arb):
        return _by_ends(a, lambda x: x.tanh())
    # tanh a = 1 - 2/(exp 2a + 1)
    return 1 - 2 / ((2 * a).exp() + 1)


def _sinh(a: Ball) -> Ball:
    if isinstance(a, arb):
        return _by_ends(a, lambda x: x.sinh())
    return (a.exp() - (-a).exp()) / 2


def _cosh(a: Ball) -> Ball:
    if isinstance(a, arb):
        return _even(a, lambda x: x.cosh())
    return (a.exp() + (-a).exp()) / 2


def _log10(a: Ball) -> Ball:
    return a.log() / arb(10).log()


def _asin(a: Ball) -> Ball:
    return _by_ends(a, lambda x: x.asin()) if isinstance(a, arb) else a.asin()


def _acos(a: Ball) -> Ball:
    return _by_ends(a, lambda x: x.acos()) if isinstance(a, arb) else a.acos()


def _sqrt(a: Ball) -> Ball:
    head = _head(a)
    if isinstance(a, arb_series) and head.contains(0):
        # the series of a square root at 0 does not exist unless the argument is identically 0
        return _nan_like(a)
    if isinstance(a, arb) and head.is_zero():
        return arb(0)
    return a.sqrt()


def _sign_of(a: arb) -> int | None:
    if a.is_zero():
        return 0
    if a > 0:
        return 1
    return -1 if a < 0 else None


def _sign(a: Ball) -> Ball:
    head = _head(a)
    if head.is_nan():
        return _nan_like(a)
    sign = _sign_of(head)
    if sign is None or (sign == 0 and isinstance(a, arb_series) and a.length() > 1):
        return _EITHER_SIGN
    return arb(sign)


def _abs(a: Ball) -> Ball:
    """|a|; a series across zero has the coefficients of both branches (see `_either`)."""
    if isinstance(a, arb):
        return _even(a, abs)
    sign = _sign_of(_head(a))
    if sign:
        return a * sign
    slopes = [_EITHER_SIGN * a[k] for k in range(1, a.prec)]
    return arb_series([_even(_head(a), abs), *slopes], a.prec)


def _minimum(a: Ball, b: Ball) -> Ball:
    if isinstance(a, arb) and isinstance(b, arb):
        return a.min(b)
    return choose(less_equal(a, b), a, b)


def _maximum(a: Ball, b: Ball) -> Ball:
    if isinstance(a, arb) and isinstance(b, arb):
        return a.max(b)
    return choose(less_equal(b, a), a, b)


def divide(a: Ball, b: Ball) -> Ball:
    """A / b; no value where the divisor is zero (series would raise instead)."""
    try:
        return a / b
    except (ZeroDivisionError, ValueError):
        return _nan_like(b if isinstance(b, arb_series) else a)


def _atan2(y: Ball, x: Ball) -> Ball:
    head = arb.atan2(_head(y), _head(x))
    if isinstance(y, arb) and isinstance(x, arb):
        return head
    # the slope does not care for the branch: take it from a quotient that exists, keep the head
    quotient = divide(y, x).atan() if not _head(x).contains(0) else -(divide(x, y).atan())
    return quotient - _head(quotient) + head


def largest_size(values: Iterable[arb]) -> arb:
    """The largest absolute value; 0 of none."""
    largest = arb(0)
    for value in values:
        largest = largest.max(abs(value))
    return largest


def power(a: Ball, b: Ball) -> Ball:
    """a^b for a > 0."""
    if isinstance(a, arb) and isinstance(b, arb):
        if a.is_zero() and b > 0:
            return arb(0)
        return a**b
    if isinstance(b, arb) and isinstance(a, arb_series):
        return (a.log() * b).exp()
    return (b * a.log()).exp()


def ipow(a: Ball, n: int) -> Ball:
    """a^n for an integer n > 0: by squaring, for wide balls by the ends."""
    if isinstance(a, arb) and a.rel_accuracy_bits() < WIDE_BITS:
        return (_by_ends if n & 1 else _even)(a, lambda x: x**n)
    result: Ball | None = None
    while n:
        if n & 1:
            result = a if result is None else result * a
        n >>= 1
        a = a * a if n else a
    return result if result is not None else arb(1)


def less(a: Ball, b: Ball) -> Truth:
    """Whether a < b: True, False or None."""
    x, y = _head(a), _head(b)
    if x < y:
        return True
    return False if x >= y else None


def less_equal(a: Ball, b: Ball) -> Truth:
    """Whether a <= b: True, False or None."""
    x, y = _head(a), _head(b)
    if x <= y:
        return True
    return False if x > y else None


def equal(a: Ball, b: Ball) -> Truth:
    """Whether a == b: True, False or None."""
    x, y = _head(a), _head(b)
    if x.is_exact() and y.is_exact() and x == y:
        return True
    return None if x.overlaps(y) else False


def unequal(a: Ball, b: Ball) -> Truth:
    """Whether a != b: True, False or None."""
    return negation(equal(a, b))


def negation(a: Truth) -> Truth:
    """Three-valued not."""
    return None if a is None else not a


def both(a: Truth, b: Truth) -> Truth:
    """Three-valued and."""
    if a is False or b is False:
        return False
    return None if a is None or b is None else True


def either(a: Truth, b: Truth) -> Truth:
    """Three-valued or."""
    return negation(both(negation(a), negation(b)))


def choose(condition: Truth, a: Ball, b: Ball) -> Ball:
    """The branch in force; the union where that cannot be told."""
    if condition is None:
        return _either(a, b)
    return a if condition else b


def _either(a: Ball, b: Ball) -> Ball:
    """The union of two branches, coefficient by coefficient.

    For a function whose first derivative is continuous where it switches, these enclose its
    derivatives almost everywhere along a segment, which is what Taylor's remainder needs.
    """
    if isinstance(a, arb) and isinstance(b, arb):
        return a.union(b)
    order = a.prec if isinstance(a, arb_series) else b.prec if isinstance(b, arb_series) else 1
    pairs = [(_coefficient(a, k), _coefficient(b, k)) for k in range(order)]
    return arb_series([x.union(y) for x, y in pairs], order)


def _coefficient(a: Ball, k: int) -> arb:
    if isinstance(a, arb_series):
        return a[k]
    return a if k == 0 else arb(0)


FUNCTIONS: dict[str, Callable[..., object]] = {
    **{name: methodcaller(name) for name in ("sin", "cos", "tan", "atan", "exp", "log")},
    "asin": _asin,
    "acos": _acos,
    "sinh": _sinh,
    "cosh": _cosh,
    "tanh": _tanh,
    "log10": _log10,
    "sqrt": _sqrt,
    "abs": _abs,
    "sign": _sign,
    "atan2": _atan2,
    "div": divide,
    "min": _minimum,
    "max": _maximum,
    "pow": power,
    "ipow": ipow,
    "lt": less,
    "le": less_equal,
    "eq": equal,
    "ne": unequal,
    "and": both,
    "or": either,
    "not": negation,
    "if": choose,
}
