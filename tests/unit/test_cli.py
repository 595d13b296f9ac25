"""The command line: what each command prints, and the exit status it leaves with."""

from __future__ import annotations

import io
import json
import os
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from support_running.cases import AT_60
from tangentbook.cli import main
from tangentbook.contract.plant import BRIDGE


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The current folder, with the bridge leaf and a call of it."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "leaf.json").write_text(json.dumps(BRIDGE), "utf-8")
    (tmp_path / "call.toml").write_text(
        'plant = "leaf.json"\npoint = { hold = { theta = "60 deg" } }\n', "utf-8"
    )
    return tmp_path


def run(*arguments: str) -> int:
    with pytest.raises(SystemExit) as left:
        main(arguments)
    assert isinstance(left.value.code, int)
    return left.value.code


def printed(capsys: pytest.CaptureFixture[str]) -> dict[str, Any]:
    return json.loads(capsys.readouterr().out)


def test_call_prints_the_answer_and_where_the_report_is(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run("call", "trim", "call.toml") == 0
    text = capsys.readouterr().out
    path = Path(text.splitlines()[-1].removeprefix("report: "))
    assert path.parent == folder / "tangentbook-reports"
    assert path.is_file()


def test_call_prints_the_result_as_json(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("call", "linearize", "call.toml", "--json", "--reports", "kept") == 0
    result = printed(capsys)
    assert result["schema"] == "tangentbook/result/1"
    assert result["points"][0]["values"]["M"]["value"] == 9100
    eigenvalues = result["points"][0]["stability"]["eigenvalues"]
    assert [item["re"] for item in eigenvalues] == [0.2525460312, -0.2600460312, -2.5]
    report = Path(result["report"]["path"])
    assert report.parent == folder / "kept"
    assert result["report"]["uri"] == f"report://{result['report']['id']}"
    assert report.name == f"lift-bridge-leaf-linearize-{result['report']['id']}.md"


def test_call_reads_json_from_stdin(
    folder: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    def send(text: str) -> None:
        monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(text.encode())))

    send(json.dumps(AT_60))
    assert run("call", "trim", "-", "--json") == 0
    inline = printed(capsys)
    send(json.dumps({**AT_60, "plant": "leaf.json"}))
    assert run("call", "trim", "-", "--json") == 0
    assert printed(capsys) == inline
    plant = {"ref": inline["plant"]["id"], "set": {"W": "26 kN"}}
    send(json.dumps({**AT_60, "plant": plant}))
    assert run("call", "trim", "-", "--json") == 0
    assert printed(capsys)["points"][0]["values"]["M"]["value"] == 4550
    assert folder.is_dir()


def test_no_point_is_an_answer(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    arguments = {"plant": "leaf.json", "point": {"hold": {"theta": "60 deg", "Mc": "1 N m"}}}
    (folder / "none.json").write_text(json.dumps(arguments), "utf-8")
    assert run("call", "trim", "none.json", "--json") == 0
    assert printed(capsys)["outcome"] == "no-point"


@pytest.mark.parametrize(
    ("text", "status", "code"),
    [
        ('{"plant": "leaf.json", "pont": {}}', 1, "request.field"),
        ('{"plant": {"ref": "0123456789abcdef"}}', 1, "request.reference"),
        ('{"plant": "../leaf.json"}', 1, "request.path"),
        ('{"plant": "none.json"}', 2, "file.missing"),
        ('{"plant": "leaf.json", "plant": "leaf.json"}', 2, "file.syntax"),
        ('{"plant": ', 2, "file.syntax"),
        ("[]", 2, "file.syntax"),
    ],
)
def test_refused_is_one_and_not_parseable_is_two(
    folder: Path, capsys: pytest.CaptureFixture[str], text: str, status: int, code: str
) -> None:
    (folder / "bad.json").write_text(text, "utf-8")
    assert run("call", "trim", "bad.json", "--json") == status
    error = printed(capsys)["error"]
    assert error["code"] == code
    assert set(error) == {"code", "where", "message", "hint"}
    assert run("call", "trim", "bad.json") == status
    captured = capsys.readouterr()
    assert captured.out == ""
    assert captured.err.startswith("tangentbook: ")
    assert not (folder / "tangentbook-reports").exists()


@pytest.mark.parametrize(
    "arguments",
    [
        (),
        ("calculate",),
        ("call", "trim"),
        ("call", "trimm", "call.toml"),
        ("call", "trim", "none.toml"),
        ("call", "trim", "leaf.yaml"),
        ("run", "call.toml"),
        ("run", "sheet.toml", "--jobs", "0"),
        ("audit", "none.md"),
        ("audit", "."),
        ("schema", "plants"),
        ("view", "report.md"),
        ("serve", "--http"),
        ("serve", "--plants", "none"),
    ],
)
@pytest.mark.usefixtures("folder")
def test_a_command_line_that_is_not_understood_is_two(
    arguments: tuple[str, ...], capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(*arguments) == 2
    captured = capsys.readouterr()
    assert captured.err
    assert "Traceback" not in captured.err


def test_what_this_version_lacks_is_said_clearly(capsys: pytest.CaptureFixture[str]) -> None:
    assert run("serve", "--http", "127.0.0.1:0") == 2
    assert "serves over stdio only" in capsys.readouterr().err
    assert run("view", "report.md") == 2
    assert "no HTML view" in capsys.readouterr().err


def test_a_report_folder_that_cannot_be_written_to_is_two(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (folder / "taken").write_text("a file", "utf-8")
    assert run("call", "trim", "call.toml", "--reports", "taken", "--json") == 2
    assert printed(capsys)["error"]["code"] == "file.unwritable"


def test_run_and_audit_sum_up(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    entry = {"name": "up", "tool": "trim", "plant": "leaf.json", "point": AT_60["point"]}
    good = {**entry, "expect": {"/points/0/values/M/value": 9100}}
    (folder / "good.json").write_text(json.dumps({"call": [good]}), "utf-8")
    bad = {**entry, "name": "off", "expect": {"/points/0/values/M/value": 9000}}
    (folder / "bad.json").write_text(json.dumps({"call": [bad]}), "utf-8")
    assert run("run", "good.json", "--jobs", "1") == 0
    assert "1 calls: 1 holds" in capsys.readouterr().out
    assert run("run", "good.json", "bad.json", "--json") == 1
    calls = printed(capsys)["calls"]
    assert [call["outcome"] for call in calls] == ["holds", "failed"]
    assert set(calls[0]) == {"name", "tool", "plant", "outcome", "answer", "failures", "report"}
    assert run("audit", "tangentbook-reports") == 0
    assert "1 reports: 1 reproduced" in capsys.readouterr().out
    report = Path(calls[0]["report"]["path"])
    text = report.read_text("utf-8")
    report.write_text(text.replace('"M": {"value": 9100', '"M": {"value": 9200'), "utf-8")
    (folder / "notes.md").write_text("# Notes\n", "utf-8")
    assert run("audit", "--json", "notes.md", "tangentbook-reports") == 1
    reports = printed(capsys)["reports"]
    assert [item["outcome"] for item in reports] == ["unreadable", "differs"]
    assert reports[1]["differences"][0]["where"].startswith("/points/0/values/")


@pytest.mark.parametrize("name", ["plant", "result", "call-sheet", "check-plant", "linearize"])
def test_schema_prints_a_schema(name: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("schema", name) == 0
    assert printed(capsys)["type"] == "object"


def test_the_module_starts_in_a_process_of_its_own(folder: Path) -> None:
    path = os.pathsep.join(entry for entry in sys.path if entry)
    done = subprocess.run(
        [sys.executable, "-m", "tangentbook", "call", "trim", "call.toml", "--json"],
        env={
            **os.environ,
            "PYTHONPATH": path,
            "PYTHONHASHSEED": "7",
            "LC_ALL": "C",
            "TZ": "Asia/Tokyo",
        },
        cwd=folder,
        capture_output=True,
        check=False,
    )
    assert done.returncode == 0
    assert done.stderr == b""
    assert json.loads(done.stdout)["outcome"] == "done"
