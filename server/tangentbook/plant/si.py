"""The SI itself, as exact data: symbols, prefixes and the units accepted with them.

SI Brochure, 9th edition (2019), tables 2, 4, 7 and 8. Every plant has some of these, and the units
library takes half a second to load; all other symbols come from the library. A test compares each
entry with it.
"""

from __future__ import annotations

from flint import fmpq

Dimension = tuple[tuple[str, int], ...]

# symbol: exponents of kg, m, s, A, K, mol, cd
_COHERENT: dict[str, dict[str, int]] = {
    "m": {"m": 1},
    "s": {"s": 1},
    "A": {"A": 1},
    "K": {"K": 1},
    "mol": {"mol": 1},
    "cd": {"cd": 1},
    "N": {"kg": 1, "m": 1, "s": -2},
    "Pa": {"kg": 1, "m": -1, "s": -2},
    "J": {"kg": 1, "m": 2, "s": -2},
    "W": {"kg": 1, "m": 2, "s": -3},
    "C": {"A": 1, "s": 1},
    "V": {"kg": 1, "m": 2, "s": -3, "A": -1},
    "F": {"kg": -1, "m": -2, "s": 4, "A": 2},
    "ohm": {"kg": 1, "m": 2, "s": -3, "A": -2},
    "Ω": {"kg": 1, "m": 2, "s": -3, "A": -2},
    "S": {"kg": -1, "m": -2, "s": 3, "A": 2},
    "Wb": {"kg": 1, "m": 2, "s": -2, "A": -1},
    "T": {"kg": 1, "s": -2, "A": -1},
    "H": {"kg": 1, "m": 2, "s": -2, "A": -2},
}

# accepted with the SI (table 8), and the gram: symbol: (factor, exponents, takes prefixes)
_ACCEPTED: dict[str, tuple[fmpq, dict[str, int], bool]] = {
    "g": (fmpq(1, 1000), {"kg": 1}, True),
    "t": (fmpq(1000), {"kg": 1}, False),
    "min": (fmpq(60), {"s": 1}, False),
    "h": (fmpq(3600), {"s": 1}, False),
    "d": (fmpq(86400), {"s": 1}, False),
    "l": (fmpq(1, 1000), {"m": 3}, True),
    "L": (fmpq(1, 1000), {"m": 3}, True),
}

_PREFIXES: dict[str, int] = {
    "G": 9,
    "M": 6,
    "k": 3,
    "h": 2,
    "da": 1,
    "d": -1,
    "c": -2,
    "m": -3,
    "µ": -6,
    "μ": -6,
    "u": -6,
    "n": -9,
    "p": -12,
}


def _plain(symbol: str) -> tuple[fmpq, dict[str, int], bool] | None:
    coherent = _COHERENT.get(symbol)
    if coherent is not None:
        return fmpq(1), coherent, True
    return _ACCEPTED.get(symbol)


def si_symbol(symbol: str) -> tuple[fmpq, Dimension] | None:
    """Factor to SI base units and their exponents, or None for a symbol outside the SI."""
    found = _plain(symbol)
    factor = fmpq(1)
    if found is None:
        for prefix, decade in _PREFIXES.items():
            if symbol.startswith(prefix):
                found = _plain(symbol.removeprefix(prefix))
                if found is not None and found[2]:
                    factor = fmpq(10) ** decade
                    break
                found = None
    if found is None:
        return None
    return factor * found[0], tuple(sorted(found[1].items()))
