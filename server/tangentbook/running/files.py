"""Files of strangers: TOML, JSON and JSON Lines read once, whole, bounded, with plain errors.

A file may name another one beside it (a plant); such a name may not leave the folder of the file
that names it.
"""

from __future__ import annotations

import json
import tomllib
from typing import TYPE_CHECKING, Any

from tangentbook.contract.plain import is_object, require_plain
from tangentbook.errors import ReportError, RequestError
from tangentbook.running.limits import TEXT_BYTES

if TYPE_CHECKING:
    from pathlib import Path


def read_document(path: Path) -> Any:  # noqa: ANN401 - whatever the file holds
    """What a TOML, JSON or JSON Lines file holds, by its suffix.

    Raises:
        ReportError: missing, too long, of another kind, or it cannot be parsed.
    """
    suffix = path.suffix.lower()
    if suffix not in {".toml", ".json", ".jsonl"}:
        raise ReportError(
            "file.kind",
            f"the suffix is {path.suffix!r}; .toml, .json and .jsonl are read",
            where=str(path),
        )
    try:
        with path.open("rb") as file:
            content = file.read(TEXT_BYTES + 1)
    except OSError as error:
        raise ReportError(
            "file.missing", f"cannot be read: {error.strerror}", where=str(path)
        ) from None
    return parse(content, suffix=suffix, where=str(path))


def parse(content: bytes, *, suffix: str, where: str) -> Any:  # noqa: ANN401 - see above
    """Parse one text; duplicate keys, NaN and infinity are refused.

    Raises:
        ReportError: too long, not UTF-8, or it cannot be parsed.
    """
    if len(content) > TEXT_BYTES:
        raise ReportError("file.size", f"longer than {TEXT_BYTES // 1024**2} MiB", where=where)
    try:
        text = content.decode("utf-8-sig")
        if suffix == ".toml":
            value: Any = tomllib.loads(text)
        elif suffix == ".jsonl":
            value = [parse_json(line) for line in text.splitlines() if line.strip()]
        else:
            value = parse_json(text)
        require_plain(value, where=where)
    except (ValueError, RecursionError) as error:
        why = "nested too deep" if isinstance(error, RecursionError) else _reason(error)
        raise ReportError("file.syntax", f"cannot be parsed: {why}", where=where) from None
    return value


def _reason(error: Exception) -> str:
    return error.message if isinstance(error, RequestError) else str(error)


def parse_json(text: str) -> Any:  # noqa: ANN401 - see above
    """JSON, with duplicate keys refused.

    Raises:
        ValueError: not JSON, a key twice in one object, NaN or infinity.
    """
    return json.loads(text, object_pairs_hook=_object, parse_constant=_no_constant)


def _object(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    known: dict[str, Any] = {}
    for key, value in pairs:
        if key in known:
            msg = f"the key {key!r} stands twice in one object"
            raise ValueError(msg)
        known[key] = value
    return known


def _no_constant(name: str) -> float:
    msg = f"{name} is not a JSON number"
    raise ValueError(msg)


def beside(folder: Path, name: str, *, where: str) -> Path:
    """The file that another one in `folder` names.

    Raises:
        RequestError: the name leads out of the folder, links followed.
    """
    root = folder.resolve()
    try:
        path = (root / name).resolve()
        inside = path.is_relative_to(root)
    except (OSError, ValueError, RuntimeError):  # loops of links, NUL in a name
        path, inside = root, False
    if not inside:
        raise RequestError(
            "request.path",
            f"the file name {name!r} leads out of the folder of the file that names it",
            where=where,
            hint="put the plant file beside the call, or in a folder below",
        )
    return path


def read_object(path: Path, *, where: str = "") -> dict[str, Any]:
    """A file that holds one table or object.

    Raises:
        ReportError: as `read_document`, or it holds something else.
    """
    value = read_document(path)
    if not is_object(value):
        raise ReportError(
            "file.syntax",
            f"one table or object is expected; got {type(value).__name__}",
            where=where or str(path),
        )
    return value
