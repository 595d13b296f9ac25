"""One call in a worker: arguments -> result, report and side files.

The heavy libraries are imported here, at the top, so that a worker is warm before it is ready.
"""

from __future__ import annotations

import importlib
from typing import Any

from tangentbook._version import __version__
from tangentbook.contract.registry import TOOLS, tool_named
from tangentbook.contract.requests import understand
from tangentbook.contract.results import SCHEMA
from tangentbook.tools.sections import report
from tangentbook_reports import write

# a worker says that it is ready once this module is imported: it shall be warm by then
_MODULES = {spec.name: importlib.import_module(spec.module) for spec in TOOLS}


def perform(tool: str, arguments: dict[str, Any]) -> dict[str, Any]:
    """Answer a resolved call.

    Args:
        tool: name in the registry.
        arguments: as `resolved_arguments` gives them (the plant inline).

    Returns:
        `result` (without `report`), `markdown`, `files` (what.ext -> text), `short`, `caveat`.

    Raises:
        TangentbookError: the call cannot be understood.
    """
    spec = tool_named(tool)
    request = understand(spec.request, arguments)
    content = _MODULES[tool].run(request)
    result: dict[str, Any] = {
        "schema": SCHEMA,
        "tool": tool,
        "tool_version": __version__,
        "outcome": content.outcome,
        "plant": content.plant,
        "answer": content.answer,
        "points": content.points,
        "complete": None,
        "validity": content.validity,
        "checks": content.findings.checks,
        "cautions": content.findings.cautions,
        "stopped_by": None,
    }
    document = report(tool, request, content, result)
    return {
        "result": result,
        "markdown": write(document),
        "files": content.files,
        "short": content.short,
        "caveat": "",
    }
