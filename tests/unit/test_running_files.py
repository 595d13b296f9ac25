"""Files of strangers: bounded, strict, and kept inside their folder."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from tangentbook.contract.plant import BRIDGE
from tangentbook.errors import ReportError, RequestError
from tangentbook.running.callfiles import inline_plant, read_call
from tangentbook.running.files import beside, read_document


@pytest.mark.parametrize(
    ("name", "text", "value"),
    [
        ("a.toml", 'a = "b"\n', {"a": "b"}),
        ("a.json", '{"a": 1.50}', {"a": 1.5}),
        ("a.JSON", '\ufeff{"a": 1}', {"a": 1}),
        ("a.jsonl", '{"a": 1}\n\n{"a": 2}\n', [{"a": 1}, {"a": 2}]),
    ],
)
def test_a_file_is_read_by_its_suffix(tmp_path: Path, name: str, text: str, value: object) -> None:
    (tmp_path / name).write_text(text, "utf-8")
    assert read_document(tmp_path / name) == value


@pytest.mark.parametrize(
    ("name", "content", "code", "match"),
    [
        ("a.json", b'{"a": 1, "a": 2}', "file.syntax", "stands twice"),
        ("a.toml", b"a = 1\na = 2\n", "file.syntax", "cannot be parsed"),
        ("a.json", b'{"a": NaN}', "file.syntax", "NaN"),
        ("a.json", b'{"a": -Infinity}', "file.syntax", "Infinity"),
        ("a.json", b'{"a": 1e999}', "file.syntax", "NaN and infinity"),
        ("a.toml", b"a = nan\n", "file.syntax", "NaN and infinity"),
        ("a.toml", b"a = 2024-01-01\n", "file.syntax", "a date is not"),
        ("a.json", b"[" * 200_000, "file.syntax", "nested too deep"),
        ("a.json", b'{"a": ' + b"9" * 10_000 + b"}", "file.syntax", "cannot be parsed"),
        ("a.json", b'{"a": "\xff"}', "file.syntax", "cannot be parsed"),
        ("a.json", b" " * 1_048_577, "file.size", "1 MiB"),
        ("a.yaml", b"a: 1", "file.kind", "yaml"),
        ("a.jsonl", b'{"a": 1}\n{"a": ', "file.syntax", "cannot be parsed"),
    ],
)
def test_a_file_that_is_not_plain_is_refused(
    tmp_path: Path, name: str, content: bytes, code: str, match: str
) -> None:
    (tmp_path / name).write_bytes(content)
    with pytest.raises(ReportError, match=match) as caught:
        read_document(tmp_path / name)
    assert caught.value.code == code
    assert caught.value.where == str(tmp_path / name)


def test_a_missing_file_says_so(tmp_path: Path) -> None:
    with pytest.raises(ReportError, match="No such file") as caught:
        read_document(tmp_path / "none.toml")
    assert caught.value.code == "file.missing"


@pytest.mark.parametrize(
    "name", ["../a.toml", "/etc/passwd", "sub/../../a.toml", "a\0b", "out.toml"]
)
def test_a_name_may_not_leave_its_folder(tmp_path: Path, name: str) -> None:
    folder = tmp_path / "sheet"
    folder.mkdir()
    (tmp_path / "a.toml").write_text("", "utf-8")
    (folder / "out.toml").symlink_to(tmp_path / "a.toml")
    with pytest.raises(RequestError, match="leads out") as caught:
        beside(folder, name, where="plant.file")
    assert caught.value.code == "request.path"


def test_a_plant_file_beside_or_below_becomes_inline(tmp_path: Path) -> None:
    (tmp_path / "plants").mkdir()
    (tmp_path / "plants" / "leaf.json").write_text(json.dumps(BRIDGE), "utf-8")
    (tmp_path / "call.toml").write_text(
        'plant = "plants/leaf.json"\npoint = { hold = { theta = "60 deg" } }\n', "utf-8"
    )
    assert read_call(tmp_path / "call.toml") == {
        "plant": BRIDGE,
        "point": {"hold": {"theta": "60 deg"}},
    }


def test_overrides_stand_beside_a_file_and_beside_an_inline_plant(tmp_path: Path) -> None:
    (tmp_path / "leaf.json").write_text(json.dumps(BRIDGE), "utf-8")
    named = {"plant": {"file": "leaf.json", "set": {"r": 0.5}}}
    inline = {"plant": {**BRIDGE, "set": {"r": 0.5}}}
    for arguments in (named, inline):
        plant = inline_plant(arguments, tmp_path)["plant"]
        assert plant == {**BRIDGE, "parameters": {**BRIDGE["parameters"], "r": {"is": "0.5 m"}}}


def test_a_reference_is_left_to_be_looked_up(tmp_path: Path) -> None:
    arguments = {"plant": {"ref": "0123456789abcdef", "set": {"r": 1}}}
    assert inline_plant(arguments, tmp_path) == arguments
