"""The report store: one folder of reports, their side files, and the plants they speak of.

A file appears whole or not at all: it is written under another name in the same folder and then
renamed. An id is looked up only if it looks like one, so no text of a client ever becomes part
of a path.
"""

from __future__ import annotations

import json
import re
import secrets
from pathlib import Path
from typing import TYPE_CHECKING, Any

from tangentbook.contract.identity import plant_id
from tangentbook.contract.plain import is_object
from tangentbook.errors import ReportError
from tangentbook.running.limits import REPORT_BYTES

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping

    from tangentbook.contract.plant import Plant

_ID = re.compile(r"[0-9a-f]{16}")
_STEM = re.compile(r"[a-z0-9-]{1,48}-[a-z-]{1,32}-[0-9a-f]{16}")
_SIDE = re.compile(r"[a-z0-9-]{1,64}(\.[a-z0-9-]{1,16}){1,3}")
_LAST_SECTION = re.compile(r"^#{1,6} .*call and result\s*$", re.IGNORECASE | re.MULTILINE)
_FENCE = re.compile(r"(`{3,})json[ \t]*")


class Store:
    """A folder of reports; made when the first one is written."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder.absolute()

    def write_report(self, stem: str, markdown: str, files: Mapping[str, str]) -> Path:
        """Write a report and its side files, the report last: if it is there, all is there.

        Args:
            stem: file name without suffix, from `contract.identity.report_stem`.
            markdown: the report.
            files: "<what>.<ext>" -> text of a side file.

        Raises:
            ReportError: the folder cannot be written to.
        """
        if not _STEM.fullmatch(stem) or not all(_SIDE.fullmatch(what) for what in files):
            msg = f"not names of a report and its side files: {stem!r}, {list(files)!r}"
            raise ValueError(msg)
        for what, text in files.items():
            self._write(self.folder / f"{stem}.{what}", text)
        path = self.folder / f"{stem}.md"
        self._write(path, markdown)
        return path

    def report_path(self, report_id: str) -> Path:
        """The file of a report.

        Raises:
            ReportError: there is none of that id.
        """
        if _ID.fullmatch(report_id):
            for path in sorted(self.folder.glob(f"*-{report_id}.md")):
                return path
        raise ReportError(
            "request.reference",
            f"there is no report {report_id[:64]!r} here",
            hint="use the report id of an earlier reply",
        )

    def read_report(self, report_id: str) -> str:
        """The text of a report."""
        return read_whole(self.report_path(report_id))

    def put_plant(self, plant: Plant) -> str:
        """Keep an understood plant; its id."""
        name = plant_id(plant)
        path = self._plant_path(name)
        if not path.exists():
            content = plant.model_dump(mode="json", by_alias=True, exclude_defaults=True)
            self._write(path, json.dumps(content, ensure_ascii=False, indent=1) + "\n")
        return name

    def find_plant(self, name: str) -> dict[str, Any] | None:
        """The plant of an id, or None."""
        if not _ID.fullmatch(name):
            return None
        try:
            content: object = json.loads(self._plant_path(name).read_text("utf-8"))
        except (OSError, ValueError):
            return None
        return content if is_object(content) else None

    def _plant_path(self, name: str) -> Path:
        return self.folder / "plants" / f"{name}.json"

    def _write(self, path: Path, text: str) -> None:
        temporary = path.with_name(f".{secrets.token_hex(8)}.part")
        try:
            path.parent.mkdir(parents=True, exist_ok=True)
            try:
                temporary.write_text(text, encoding="utf-8", newline="\n")
                temporary.replace(path)
            finally:
                temporary.unlink(missing_ok=True)
        except OSError as error:
            raise ReportError(
                "file.unwritable",
                f"cannot write to the report folder: {error.strerror}",
                where="reports",
                hint="name a folder that can be written to with --reports",
            ) from error


def read_whole(path: Path) -> str:
    """The text of a report or side file.

    Raises:
        ReportError: missing, too long, or not UTF-8 text.
    """
    try:
        if path.stat().st_size > REPORT_BYTES:
            raise ReportError(
                "file.size", f"longer than {REPORT_BYTES // 1024**2} MiB", where=path.name
            )
        return path.read_bytes().decode("utf-8")
    except (OSError, UnicodeDecodeError) as error:
        why = error.strerror if isinstance(error, OSError) else "not UTF-8 text"
        raise ReportError("file.missing", f"cannot be read: {why}", where=path.name) from None


def embedded(markdown: str) -> tuple[dict[str, Any], dict[str, Any]]:
    """The call and the result that a report carries in its last section, as fenced JSON.

    Raises:
        ReportError: they are not there.
    """
    headings = list(_LAST_SECTION.finditer(markdown))
    start = headings[-1].end() if headings else len(markdown)
    try:
        call, result = (json.loads(block) for block in _fenced_json(markdown[start:]))
    except (ValueError, RecursionError):  # not two blocks, or not JSON
        call, result = None, None
    if not (is_object(call) and is_object(result) and is_object(call.get("arguments"))):
        raise ReportError(
            "report.unreadable",
            "the text does not end with a call and its result as fenced JSON",
            hint="audit a report as it was written by this program",
        )
    return call, result


def _fenced_json(markdown: str) -> Iterator[str]:
    """Every block fenced as JSON."""
    fence, content = "", list[str]()
    for line in markdown.split("\n"):
        if fence and line.rstrip() == fence:
            yield "\n".join(content)
            fence = ""
        elif fence:
            content.append(line)
        elif opening := _FENCE.fullmatch(line):
            fence, content = opening[1], []
