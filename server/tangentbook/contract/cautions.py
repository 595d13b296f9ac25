"""The usual cautions of the trades, chosen by the plant's `field`; a line each.

They are common practice, not findings; the general ones always appear. Claims are of the
equations as stated, never of the machine; local codes and licensed practice come first.
"""

from __future__ import annotations

GENERAL: tuple[str, ...] = (
    (
        "Verified, not validated: every statement is about the equations as stated, not about the "
        "machine they describe."
    ),
    "A linear model describes small deviations from its point; how small is not stated here.",
    (
        "Where people, property or the environment can be harmed, applicable codes and standards "
        "and the judgement of licensed or otherwise authorised engineers decide."
    ),
)

TRADES: dict[str, str] = {
    "flight": (
        "Flight: aerodynamic data hold for one configuration, mass, centre of gravity, Mach and "
        "altitude range; airworthiness rules and flight test decide."
    ),
    "process": (
        "Process: reaction, heat-transfer and phase data hold for stated compositions; a hazard "
        "study and independent protection layers are not replaced."
    ),
    "electric power": (
        "Electric power: network strength, saturation, limiters and protection are only there if "
        "the equations hold them; grid codes and the network operator decide."
    ),
    "machinery": (
        "Machinery: backlash, dry friction, flexibility and end stops are only there if the "
        "equations hold them; guarding and machinery regulations apply."
    ),
    "vehicle": (
        "Vehicle: tyre forces saturate, and road, load and driver vary; type approval and road "
        "tests decide."
    ),
    "marine": (
        "Marine: hydrodynamic coefficients hold for one loading condition, trim and water depth; "
        "classification rules and sea trials decide."
    ),
    "hydraulics": (
        "Hydraulics: cavitation, line dynamics and the bulk modulus with entrained air are only "
        "there if the equations hold them; pressure equipment rules apply."
    ),
    "building": (
        "Building: occupancy, weather and infiltration vary; building codes and the designer of "
        "record decide."
    ),
    "medical": (
        "Medical: parameters differ between persons and over time; nothing here is a dose, a "
        "setting or a treatment. Medical device rules and clinicians decide."
    ),
    "biology": (
        "Biology: populations and rates vary between sites and seasons; parameters are estimates."
    ),
    "water": (
        "Water supply: demands, pipe friction and pump curves drift; water-hammer and supply "
        "security need their own study, and the water authority's rules apply."
    ),
    "robotics": (
        "Robotics: joint friction, flexibility and payload vary; collaborative-operation and "
        "machinery rules apply."
    ),
}

_WORDS: dict[str, str] = {
    "aircraft": "flight",
    "aerospace": "flight",
    "chemical": "process",
    "thermal": "process",
    "electrical": "electric power",
    "power": "electric power",
    "electronics": "electric power",
    "mechanical": "machinery",
    "crane": "machinery",
    "automotive": "vehicle",
    "ship": "marine",
    "hydraulic": "hydraulics",
    "water": "water",
    "hvac": "building",
    "refrigeration": "process",
}


def trade_cautions(field: str) -> tuple[str, ...]:
    """The cautions of the trades named in a free text, in the order of `TRADES`."""
    text = field.casefold()
    chosen = {trade for trade in TRADES if trade in text}
    chosen |= {trade for word, trade in _WORDS.items() if word in text}
    return tuple(line for trade, line in TRADES.items() if trade in chosen)
