"""Calls of the program for tests: a plant file's text in, the structured result out.

A call goes the way of every transport (plant file -> validated request -> resolved arguments ->
tool), only without processes, so that a fault can be put into one part of it.
"""

from __future__ import annotations

import functools
import json
from pathlib import Path
from typing import Any

from tangentbook.contract.identity import resolved_arguments
from tangentbook.contract.registry import tool_named
from tangentbook.contract.requests import understand
from tangentbook.running.files import parse
from tangentbook.tools.perform import perform

JSON = dict[str, Any]


def read_plant(text: str, *, suffix: str = ".json") -> JSON:
    """A plant file's text as the command line reads it."""
    plant = parse(text.encode("utf-8"), suffix=suffix, where=f"plant{suffix}")
    assert isinstance(plant, dict)
    return plant  # pyright: ignore[reportUnknownVariableType] - keys of a document are texts


def call(tool: str, plant: JSON, point: object = None, **arguments: object) -> JSON:
    """The result of one call; errors of the program come through as they are."""
    raw: JSON = {"plant": plant, **arguments}
    if point is not None:
        raw["point"] = point
    request = understand(tool_named(tool).request, raw)
    # through text, as it is stored and printed: nothing else may reach the tool
    resolved = json.loads(json.dumps(resolved_arguments(request), allow_nan=False))
    result = perform(tool, resolved)["result"]
    json.dumps(result, allow_nan=False)
    return result


@functools.lru_cache(maxsize=512)
def _kept(tool: str, arguments: str) -> JSON:
    return call(tool, **json.loads(arguments))


def kept(tool: str, plant: JSON, point: object = None, **arguments: object) -> JSON:
    """As `call`, computed once for all tests of a run; the result must not be changed."""
    raw: JSON = {"plant": plant, **arguments}
    if point is not None:
        raw["point"] = point
    return _kept(tool, json.dumps(raw))


def text_of(folder: Path, name: str) -> str:
    """A fixture's text."""
    return (folder / name).read_text("utf-8")


def codes(result: JSON) -> set[str]:
    """The caution codes of a result."""
    return {caution["code"] for caution in result["cautions"]}


def caution_text(result: JSON, code: str) -> str:
    """The texts of all cautions with a code, joined."""
    return " ".join(c["text"] for c in result["cautions"] if c["code"] == code)


def check(result: JSON, code: str) -> JSON:
    """The check value with a code."""
    (found,) = [c for c in result["checks"] if c["code"] == code]
    return found


def eigenvalues(entry: JSON) -> list[complex]:
    """The eigenvalues of a point, each as often as it counts."""
    return [
        complex(e["re"], e["im"])
        for e in entry["stability"]["eigenvalues"]
        for _ in range(e["count"])
    ]
