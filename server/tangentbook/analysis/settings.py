"""Seeds, numbers of starts, thresholds and precisions, each with its reason."""

from __future__ import annotations

PRECISION = 256
"""Bits of the ball arithmetic behind printed numbers: 10 digits survive the loss of 50 more."""

STARTS = ((20, 60), (100, 8), (2000, 3))
"""(unknowns up to, starts): enough starts to notice other points on small plants; a start costs a
sparse factorisation per step on large ones."""

START_SPREAD = (-1.5, 3.0)
"""Random starts lie within 10^-1.5 … 10^3 typical sizes (one declared unit if none is given, which
is more often too small than too large); beyond, `typical` or a guess is called for."""

RUN_OFF = 1e60
"""A value this many typical sizes away was chased to infinity, not found."""

WORST_MOVE = 1e-2
"""A refinement that wanders further than this (relative) has left its candidate."""

WORST_RADIUS = 1e-6
"""A value whose digits still move by more than this (relative) is no point that was found."""

SAME_POINT = 1e-9
"""Relative distance below which two solutions are one; near a fold two may be close."""

OTHER_POINTS = 8
"""At most this many other points are refined and named."""

SLOW_STARTS = 6
"""Starts of the least-squares descent when no Newton iteration reached a solution."""

NEWTON_STEPS = 60
POLISHING_STEPS = 4
"""Full steps after convergence: values far below their typical size become accurate, too."""

NEWTON_TOLERANCE = 1e-10
"""Scaled step at which the double-precision iteration hands over to the ball refinement."""

SMALLEST_DAMPING = 1e-5

DENSE_UP_TO = 80
"""Up to this many unknowns the step is a dense least-squares solution by SVD, which copes with
any rank; above, sparse LU with the dense one as fallback."""

RESIDUAL_LIMIT = 1e-9
"""Largest residual relative to its own size that still counts as solved in double precision (a
double root is only found to about the square root of the rounding error)."""

REFINED_RESIDUAL_LIMIT = 1e-35
"""The same once the refinement has settled: 45 digits leave ample room."""

RANK_TOLERANCE = 1e-9
"""Singular values of the equilibrated Jacobian below this times the largest count as zero."""

REFINE_STEPS = 60
SLOW_REFINE_UP_TO = 40
SLOW_REFINE_STEPS = 300
"""At a double root Newton's iteration gains one bit a pass; small systems can afford 300."""

REFINED_DIGITS_BITS = 150
"""Relative accuracy in bits that the refinement aims at: 45 digits, of which 10 are printed."""

DIFFERENCE_BITS = 40
"""Differences use a step of 2^-40 typical sizes in 256-bit arithmetic: the central difference is
then exact to about 2^-80, and its rounding to 2^-200."""

SECOND_ROUTE_LIMIT = 1e-9
REMAINDER_LIMIT = 1e-9
POINT_LIMIT = 1e-9
MULTIPLE_ROOT_LIMIT = 1e-3
EIGENVALUE_LIMIT = 1e-9
PRINTED_UNITS_LIMIT = 1e-8
PRINTED_ZERO_LIMIT = 1e-12
"""Limits of the check values: well below the 1e-4 that a wrong entry shows, well above the error
of two correct routes."""

SYMBOLIC_NODES = 400
"""The symbolic second route is run for plants of up to this many expression nodes: it costs about
a millisecond a node."""

MAX_KINK_SIDES = 6
"""At most this many switching functions may be zero at a point: 2^6 sides are compared."""

SENSITIVITY_ENTRIES = 4000
"""dx0/dp is given where found values times parameters stay below this."""
