"""The arguments of a call as a file writes them: `plant` may name a file beside it.

`plant` is a file name, {"file": name, "set": {…}}, {"ref": id, "set": {…}}, or the plant itself,
which here too may carry `set`, so that one grid fits every form.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

from pydantic import Field

from tangentbook.contract.base import Model, Name, Scalar, Text
from tangentbook.contract.plain import is_object
from tangentbook.contract.requests import understand_plant
from tangentbook.errors import ReportError
from tangentbook.running.files import beside, read_document, read_object
from tangentbook.running.overrides import with_parameters


class _Changes(Model):
    """The overrides beside an inline plant."""

    set: dict[Name, Scalar] = Field(default_factory=dict)


class _PlantFile(_Changes):
    """A plant in a file, with the parameters that differ."""

    file: Text


def read_call(path: Path) -> dict[str, Any]:
    """The arguments in a call file, its plant inline.

    Raises:
        ReportError: the file, or the plant file it names, cannot be read.
        RequestError: the plant is named in a way that is not allowed.
    """
    value: object = read_document(path)
    if not is_object(value):
        raise ReportError(
            "file.syntax",
            "a call file holds the arguments of one call",
            where=str(path),
            hint="a call sheet is started with `tangentbook run`",
        )
    return inline_plant(value, path.parent)


def inline_plant(arguments: dict[str, Any], folder: Path) -> dict[str, Any]:
    """The arguments with a plant file replaced by its content; others as they are.

    Args:
        arguments: a call as a file writes it.
        folder: where file names start.

    Raises:
        TangentbookError: as `read_call`.
    """
    plant: object = arguments.get("plant")
    if isinstance(plant, str):
        plant = {"file": plant}
    if not is_object(plant) or "ref" in plant:
        return arguments
    if "file" in plant:
        named = understand_plant(_PlantFile, plant)
        content = read_object(beside(folder, named.file, where="plant.file"))
        return {**arguments, "plant": with_parameters(content, dict(named.set))}
    if "set" in plant:
        inline = {name: value for name, value in plant.items() if name != "set"}
        changes = understand_plant(_Changes, {"set": plant["set"]}).set
        return {**arguments, "plant": with_parameters(inline, dict(changes))}
    return arguments
