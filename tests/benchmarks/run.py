"""Benchmarks: `python tests/benchmarks/run.py [--quick] [PART…]`.

Prints markdown tables of ratios within the same run and of growth exponents; judges nothing, since
times depend on the machine and on what else it does. Measures the packages of the tree it stands
in, whether or not others are installed.
"""

from __future__ import annotations

import argparse
import os
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
PARTS = ("library", "growth", "points", "chain", "processes")


def main() -> None:
    """Run the parts asked for, in their order."""
    parser = argparse.ArgumentParser(description="Ratios and growth exponents, as markdown.")
    parser.add_argument("--quick", action="store_true", help="fewer rounds, smaller sizes")
    parser.add_argument("parts", nargs="*", metavar="PART", help=f"of {', '.join(PARTS)}")
    options = parser.parse_args()
    unknown = sorted(set(options.parts) - set(PARTS))
    if unknown:
        parser.error(f"no such part: {', '.join(unknown)}; there are {', '.join(PARTS)}")
    # one thread for linear algebra, set before it is loaded: threads of a library would measure
    # how busy the other processors are
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    sys.path[1:1] = [str(ROOT / "server"), str(ROOT / "reports")]
    import pipeline  # loads linear algebra, see above
    import points
    import processes

    parts = {
        "library": pipeline.against_the_symbolic_library,
        "growth": pipeline.growth,
        "points": points.points_and_models,
        "chain": points.coupled_rates,
        "processes": processes.cold_starts,
    }
    for name, part in parts.items():
        if not options.parts or name in options.parts:
            part(quick=options.quick)


if __name__ == "__main__":
    main()
