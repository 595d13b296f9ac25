"""The SI table against the units library, and that SI plants do not load the library."""

from __future__ import annotations

import subprocess
import sys
from fractions import Fraction
from typing import Any

import pint
import pytest
from flint import fmpq

from tangentbook.plant.si import si_symbol

SYMBOLS = [
    "m",
    "s",
    "A",
    "K",
    "mol",
    "cd",
    "N",
    "Pa",
    "J",
    "W",
    "C",
    "V",
    "F",
    "ohm",
    "S",
    "Wb",
    "T",
    "H",
    "g",
    "kg",
    "t",
    "min",
    "h",
    "d",
    "l",
    "L",
    "kN",
    "MPa",
    "mm",
    "cm",
    "km",
    "um",
    "mg",
    "hPa",
    "GW",
    "kW",
    "MW",
    "mH",
    "uF",
    "nF",
    "kohm",
    "Mohm",
    "mA",
    "kV",
    "dal",
    "dl",
    "ml",
    "mmol",
    "kmol",
    "ms",
    "us",
    "ns",
    "MJ",
    "kJ",
]
BASES = {
    "gram": "kg",
    "meter": "m",
    "second": "s",
    "ampere": "A",
    "kelvin": "K",
    "mole": "mol",
    "candela": "cd",
}


@pytest.fixture(scope="module")
def library() -> Any:  # noqa: ANN401 - its annotations know floating-point numbers only
    """The library's registry with exact fractions."""
    registry: Any = pint.UnitRegistry
    return registry(non_int_type=Fraction, cache_folder=None)


@pytest.mark.parametrize("symbol", SYMBOLS)
def test_symbol_agrees_with_the_library(symbol: str, library: Any) -> None:  # noqa: ANN401 - as above
    """Factor and dimension of every SI symbol are those of the library, exactly."""
    found = si_symbol(symbol)
    assert found is not None
    factor, units = library.get_root_units(symbol)
    exponents = {BASES[base]: int(power) for base, power in units._units.items()}
    expected = Fraction(factor) / Fraction(1000) ** exponents.get("kg", 0)
    assert found == (
        fmpq(expected.numerator, expected.denominator),
        tuple(sorted(exponents.items())),
    )


@pytest.mark.parametrize("symbol", ["kmin", "mt", "ft", "xN", "", "kh", "md"])
def test_no_si_symbol(symbol: str) -> None:
    """Minute, hour, day and tonne take no prefix, and nothing else is guessed."""
    assert si_symbol(symbol) is None


def test_si_plants_do_not_load_the_library() -> None:
    """Units of the SI are understood without importing the units library."""
    code = (
        "import sys; from tangentbook.plant.units import parse_unit; "
        "[parse_unit(u) for u in ('kN m', 'W/(m^2 K)', 'deg', 'kg m^2/s', 'min')]; "
        "sys.exit('pint' in sys.modules)"
    )
    done = subprocess.run([sys.executable, "-c", code], check=False, env=_environment())
    assert done.returncode == 0


def _environment() -> dict[str, str]:
    import os

    return {**os.environ, "PYTHONPATH": os.pathsep.join(sys.path)}
