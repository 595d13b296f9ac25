"""Stand-in for what computes: knows the lift bridge leaf only."""

from __future__ import annotations

import json
import math
from typing import Any

from tangentbook._version import __version__
from tangentbook.contract.identity import call_digest
from tangentbook.contract.plant import Plant
from tangentbook.contract.registry import tool_named
from tangentbook.contract.requests import understand
from tangentbook.contract.identity import plant_id
from tangentbook.errors import ExpressionError


def _number(text: Any) -> float:
    return float(str(text).split()[0]) * (1000 if "kN" in str(text) else 1)


def perform(tool: str, arguments: dict[str, Any]) -> dict[str, Any]:
    request = understand(tool_named(tool).request, arguments)
    plant: Plant = getattr(request, "plant")
    if "?" in plant.equations[0].is_:
        raise ExpressionError("plant.syntax", "an operator is expected; got '?'", where="equation 1, column 3")
    p = {k: _number(v.is_ if v.is_ is not None else v.value) for k, v in plant.parameters.items()}
    points = []
    if tool != "check-plant":
        for n, point in enumerate(request.point):
            held = {h.is_: h.equals for h in point.hold}
            if "Mc" in held:
                points.append({"request": n, "id": f"p{n+1}", "outcome": "no-point", "reason": "conflict", "why": "none"})
                continue
            theta = math.radians(float(str(held.get("theta", "90 deg")).split()[0]))
            moment = p["W"] * p["r"] * math.cos(theta)
            entry = {"request": n, "id": f"p{n+1}", "outcome": "done", "kind": "equilibrium", "known": "proved",
                "values": {"theta": {"value": float(f"{theta:.10g}"), "unit": "rad", "known": "exact"},
                           "M": {"value": float(f"{moment:.10g}"), "unit": "N m", "known": "exact"},
                           "Mc": {"value": float(f"{moment:.10g}"), "unit": "N m", "known": "exact"},
                           "Mw": {"value": 0, "unit": "N m", "known": "exact"}}}
            if tool == "linearize":
                k = p["W"] * p["r"] * math.sin(theta) / p["J"]
                d = p["b"] / p["J"]
                root = math.sqrt(d * d / 4 + k)
                eig = [-d / 2 + root, -d / 2 - root, -1 / p["Tm"]]
                entry["stability"] = {"known": "proved", "eigenvalues": [{"re": float(f"{e:.10g}"), "im": 0} for e in eig]}
            points.append(entry)
    worst = "no-point" if any(q["outcome"] == "no-point" for q in points) else "done"
    result = {"schema": "tangentbook/result/1", "tool": tool, "tool_version": __version__, "outcome": worst,
        "plant": {"name": plant.name, "id": plant_id(plant), "roles": {"theta": "state", "M": "state", "Mc": "input", "Mw": "input"}},
        "answer": "an answer", "points": points, "checks": [], "cautions": [], "stopped_by": None}
    call = {"tool": tool, "tool_version": __version__, "arguments": arguments}
    digest = call_digest(tool, request)
    dump = lambda v: json.dumps(v, ensure_ascii=False, indent=1)
    markdown = f"# {plant.name}\n\ncall {digest}\n\n## Answer\n\nan answer\n\n## Call and result\n\n```json\n{dump(call)}\n```\n\n```json\n{dump(result)}\n```\n"
    return {"result": result, "markdown": markdown, "files": {}, "short": f"{plant.name}: an answer", "caveat": ""}
