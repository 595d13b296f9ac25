"""A worker whose plants misbehave by name; any other plant is computed as usual."""

from __future__ import annotations

import json
import os
import random
import signal
import subprocess
import sys
import time
from typing import Any

from tangentbook._version import __version__
from tangentbook.contract.identity import plant_id
from tangentbook.contract.plant import Plant
from tangentbook.running.worker import Perform, load_perform, main


def perform_oddly(tool: str, arguments: dict[str, Any]) -> dict[str, Any]:
    """Do what the plant's name asks for."""
    odd = _ODDITIES.get(arguments["plant"]["name"])
    return odd(tool, arguments) if odd else load_perform()(tool, arguments)


def _echo(_tool: str, _arguments: dict[str, Any]) -> dict[str, Any]:
    return {"pid": os.getpid(), "threads": os.environ["OPENBLAS_NUM_THREADS"]}


def _print(_tool: str, _arguments: dict[str, Any]) -> dict[str, Any]:
    sys.stdout.write("a stray print\n")
    sys.stdout.flush()
    return {"pid": os.getpid()}


def _use_memory(_tool: str, _arguments: dict[str, Any]) -> dict[str, Any]:
    return {"length": len(bytearray(2**40))}


def _crash(_tool: str, _arguments: dict[str, Any]) -> dict[str, Any]:
    raise ZeroDivisionError


def _die(_tool: str, _arguments: dict[str, Any]) -> dict[str, Any]:
    os.kill(os.getpid(), signal.SIGKILL)
    return {}


def _say_nan(_tool: str, _arguments: dict[str, Any]) -> dict[str, Any]:
    return {"value": float("nan")}


def _sleep(_tool: str, arguments: dict[str, Any]) -> dict[str, Any]:
    """Sleep for a minute with a child that would outlive its parent; say both ids in a file."""
    child = subprocess.Popen(["sleep", "60"])  # noqa: S607 - a test on a system that has it
    with open(arguments["plant"]["about"], "w", encoding="utf-8") as file:  # noqa: PTH123
        file.write(f"{os.getpid()} {child.pid}\n")
    time.sleep(60)
    return {}


def _wobble(tool: str, arguments: dict[str, Any]) -> dict[str, Any]:
    """A report whose measured number differs in the last digit from run to run."""
    plant = Plant.model_validate(arguments["plant"])
    number = random.choice([1.234567891, 1.234567892])  # noqa: S311 - nothing secret
    known = "proved" if "proved" in plant.about else "measured"
    result: dict[str, Any] = {
        "schema": "tangentbook/result/1",
        "tool": tool,
        "tool_version": __version__,
        "outcome": "done",
        "plant": {"name": plant.name, "id": plant_id(plant), "roles": {}},
        "answer": "it wobbles",
        "points": [{"known": known, "values": {"x": {"value": number, "known": known}}}],
        "checks": [],
    }
    call = {"tool": tool, "tool_version": __version__, "arguments": arguments}
    fences = "\n\n".join(f"```json\n{json.dumps(item)}\n```" for item in (call, result))
    markdown = f"# Wobble\n\nIt is {number}.\n\n## Call and result\n\n{fences}\n"
    files = {"figure.svg": f"<svg>{number}</svg>\n"}
    return {
        "result": result,
        "markdown": markdown,
        "files": files,
        "short": "it wobbles",
        "caveat": "",
    }


_ODDITIES: dict[str, Perform] = {
    "echo": _echo,
    "printer": _print,
    "sleeper": _sleep,
    "glutton": _use_memory,
    "crasher": _crash,
    "killer": _die,
    "not a number": _say_nan,
    "wobbler": _wobble,
}


def load() -> Perform:
    """Nothing to import: these plants need no libraries."""
    return perform_oddly


if __name__ == "__main__":
    main(load)
