"""The one adapter from the format of the published cases to plant files and points.

A case states equations, parameters with units, what is held and what is found, and for each
linearization the point it belongs to. Where several points meet the same conditions, the guess is
the published point to two digits: what is tested is that the program finds the rest.
"""

from __future__ import annotations

import functools
import json
import re
from pathlib import Path
from typing import Any

from published.calling import JSON, kept, read_plant

CASES = Path(__file__).parent / "cases"

LATER = {
    "aircraft-tables-level": "look-up tables",
    "level-turn": "steady motion: the heading moves at a constant rate",
}
"""Cases that the program does not reach yet, with what they need; everything else is tested."""

LABELS: dict[str, tuple[str, ...]] = {
    "bead-hoop": ("bottom", "plus", "minus", "top", "critical"),
    "cstr-three-states": ("low", "middle", "high"),
    "duffing": ("centre", "right", "left"),
    "lorenz": ("origin", "Cplus", "Cminus", "Hopf"),
    "lotka-volterra": ("coexistence", "extinction"),
    "pend-damped": ("hanging", "upright"),
    "smib-classical": ("KD0", "KD10", "KD-10", "second"),
    "van-der-pol": ("mu1", "mu0", "mu2"),
}
"""Names of the linearizations in their order, as the published quantities are prefixed."""

UNITS: dict[str, dict[str, str]] = {
    "bead-hoop": {"phi": "rad"},
    "buck-boost-erickson": {"i": "A", "v": "V", "d": "1", "vg": "V"},
    "cart-pendulum": {"x": "m", "theta": "rad", "F": "N"},
    "cruise-control": {"v": "m/s", "u": "1", "theta": "rad"},
    "cstr-three-states": {"CA": "kgmol/m^3", "T": "K", "Tj": "K"},
    "maglev": {"h": "m", "i": "A", "V": "V"},
    "pend-undamped": {"theta": "rad"},
    "quad-tank-min": {
        **dict.fromkeys(("h1", "h2", "h3", "h4"), "cm"),
        **dict.fromkeys(("v1", "v2", "y1", "y2"), "V"),
    },
    "van-de-vusse": {"Ca": "mol/l", "Cb": "mol/l", "u": "1/min"},
}
"""Units of states, inputs and outputs that a case implies by its numbers and its parameters."""


@functools.cache
def read_case(name: str) -> JSON:
    """A case as published."""
    return json.loads((CASES / f"{name}.json").read_text("utf-8"))


def all_names() -> list[str]:
    """Every case of the folder."""
    return sorted(path.stem for path in CASES.glob("*.json"))


def reachable() -> list[str]:
    """The cases that are tested."""
    return [name for name in all_names() if name not in LATER]


def time_unit(case: JSON) -> str:
    """The unit of time that the parameters speak of."""
    units = [p["unit"] for p in case["parameters"].values()]
    for unit in ("h", "min", "yr"):
        if any(re.search(rf"\b{unit}\b", text) for text in units):
            return unit
    return "1" if all(text == "-" for text in units) else "s"


def plant_file(name: str) -> str:
    """The text of a JSON plant file with what the case states."""
    case = read_case(name)
    units = UNITS.get(name, {})

    def declared(names: list[str]) -> JSON:
        return {n: {"unit": units[n]} if n in units else {} for n in names}

    plant: JSON = {
        "name": case["title"],
        "field": case["field"],
        "source": case["source"],
        "time": time_unit(case),
        "equations": case["equations"],
        "states": declared(case["states"]),
        "algebraic": declared(case.get("algebraic", [])),
        "inputs": declared(case["inputs"]),
        "outputs": dict(_output(text, units) for text in case["outputs"]),
        "parameters": {
            n: {"value": p["value"], "unit": p["unit"]} for n, p in case["parameters"].items()
        },
    }
    if "tables" in case:
        plant["tables"] = {n: _table(t) for n, t in case["tables"].items()}
    return json.dumps(plant, ensure_ascii=False, indent=1)


def _output(text: str, units: dict[str, str]) -> tuple[str, JSON]:
    name, expression = (part.strip() for part in text.split("=", 1))
    unit = {"unit": units[name]} if name in units else {}
    return name, {"is": expression, **unit}


def _table(table: JSON) -> JSON:
    axes = [axis for axis in ("x", "y") if axis in table]
    return {
        "of": dict.fromkeys(axes, "1"),
        "gives": "1",
        "grid": [table[axis] for axis in axes],
        "values": table["values"],
        "between": "linear",
        "beyond": "extend",
    }


@functools.cache
def plant(name: str) -> JSON:
    """The plant of a case, through the file format."""
    return read_plant(plant_file(name))


def held(name: str) -> JSON:
    """What the case gives or fixes, as `hold`."""
    case = read_case(name)
    asked = case["operating_point"]
    if asked.get("given") == "all zero":
        return dict.fromkeys((*case["states"], *case["inputs"]), 0)
    return dict(asked.get("given") or asked.get("fixed") or {})


def point(name: str, linearization: JSON) -> JSON:
    """The point of one linearization: what the case holds, a rough guess for all it finds."""
    hold = held(name)
    asked: JSON = {}
    if hold:
        asked["hold"] = hold
    guess = {
        n: float(f"{float(v):.2g}")
        for n, v in linearization["point"].items()
        if n not in hold and not n.endswith("'")
    }
    if guess:
        asked["guess"] = guess
    if linearization["parameters_changed"]:
        # more digits than a double holds are sent as text
        asked["set"] = dict(linearization["parameters_changed"])
    return asked


def later_point(name: str) -> JSON:
    """The point of a case that is not reached yet."""
    asked = read_case(name)["operating_point"]
    moving = {rate.rstrip("'"): "any" for rate in asked.get("free_rate", [])}
    return {"hold": asked["fixed"], **({"moving": moving} if moving else {})}


def label(name: str, index: int) -> str:
    """The name of a linearization; "" where a case has only one."""
    return LABELS[name][index] if name in LABELS else ""


def linearizations(name: str) -> list[JSON]:
    """All published linearizations of a case."""
    return read_case(name)["independent"]["linearizations"]


def result(name: str, index: int = 0) -> JSON:
    """The linear model of one linearization, with its gain at rest."""
    asked = point(name, linearizations(name)[index])
    return kept("linearize", plant(name), asked, also=["dc gain"])


def labelled(name: str, which: str) -> JSON:
    """The result of a linearization by its name."""
    return result(name, LABELS[name].index(which))


def entry(name: str, index: int = 0) -> JSON:
    """The one point of `result`."""
    (found,) = result(name, index)["points"]
    return found


def numbers(value: Any) -> Any:  # noqa: ANN401 - lists of lists of what JSON holds
    """Published values as floats and complex numbers, lists kept."""
    if isinstance(value, list):
        return [numbers(v) for v in value]  # pyright: ignore[reportUnknownVariableType]
    if isinstance(value, dict):
        return complex(float(value["re"]), float(value["im"]))  # pyright: ignore[reportUnknownArgumentType]
    return value if isinstance(value, str) and not _is_number(value) else float(value)


def _is_number(text: str) -> bool:
    try:
        float(text)
    except ValueError:
        return False
    return True
