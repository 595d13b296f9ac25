"""Who is who: digests of plants and calls, ids, file names (nothing of time, host or path)."""

from __future__ import annotations

import hashlib
import json
import re
import unicodedata
from typing import TYPE_CHECKING, Any

from tangentbook._version import __version__
from tangentbook.contract.base import canonical

if TYPE_CHECKING:
    from tangentbook.contract.base import Model
    from tangentbook.contract.plant import Plant


def _sha256(value: Any) -> str:  # noqa: ANN401 - canonical JSON
    text = json.dumps(value, ensure_ascii=False, allow_nan=False, separators=(",", ":"))
    return hashlib.sha256(text.encode("utf-8")).hexdigest()


def plant_digest(plant: Plant) -> str:
    """sha256 of the canonical JSON of the plant."""
    return _sha256(canonical(plant))


def plant_id(plant: Plant) -> str:
    """The 16 hexadecimal digits by which a later call may refer to the plant."""
    return plant_digest(plant)[:16]


def call_digest(tool: str, request: Model) -> str:
    """sha256 of tool, tool version, plant digest and arguments, without the time budget."""
    arguments = request.model_dump(mode="json", by_alias=True, exclude_defaults=True)
    arguments.pop("budget_s", None)
    arguments.pop("plant", None)
    plant: Plant = getattr(request, "plant")  # noqa: B009 - every request has one
    return _sha256([tool, __version__, plant_digest(plant), canonical(arguments)])


def resolved_arguments(request: Model) -> dict[str, Any]:
    """The arguments as stored and printed: defaults left out, the budget too."""
    arguments = request.model_dump(mode="json", by_alias=True, exclude_defaults=True)
    arguments.pop("budget_s", None)
    return arguments


def slug(name: str) -> str:
    """A file-name part: lower-case ASCII words of the name, at most 48 characters."""
    plain = unicodedata.normalize("NFKD", name).encode("ascii", "ignore").decode()
    words = re.sub(r"[^a-z0-9]+", "-", plain.lower()).strip("-")
    return words[:48].strip("-") or "plant"


def report_stem(plant_name: str, tool: str, report_id: str) -> str:
    """`<slug of plant>-<tool>-<id>`, the stem of a report and its side files."""
    return f"{slug(plant_name)}-{tool}-{report_id}"
