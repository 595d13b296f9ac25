"""The command line: `tangentbook serve | call | run | audit | view | schema`.

Exit status: 0 done (unstable, undecided and no-point are answers); 1 an expectation, a check or
an audit failed, or a call was refused; 2 the command line or a file could not be understood.
What a command needs is imported when it runs, which keeps the start short.
"""

from __future__ import annotations

import argparse
import json
import os
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any

from tangentbook._version import __version__
from tangentbook.errors import TangentbookError

if TYPE_CHECKING:
    from collections.abc import Sequence

    from tangentbook.running.calls import Answer
    from tangentbook.sheet_runs import Outcome

_DONE, _FAILED, _NOT_UNDERSTOOD = 0, 1, 2


def main(arguments: Sequence[str] | None = None) -> None:
    """Run one command and leave with its exit status."""
    options = _parser().parse_args(arguments)
    try:
        status = options.command(options)
    except TangentbookError as error:
        status = _refuse(error, as_json=getattr(options, "json", False))
    except KeyboardInterrupt:
        status = 130  # what a shell reports of a command that was interrupted
    except BrokenPipeError:  # the reader of our output went away; nothing is left to say
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        status = _FAILED
    sys.exit(status)


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="tangentbook",
        description="Linear models of nonlinear plants, computed, checked and written up.",
    )
    parser.add_argument("--version", action="version", version=f"tangentbook {__version__}")
    commands = parser.add_subparsers(required=True, metavar="COMMAND")
    _add_serve(commands)
    _add_call(commands)
    _add_run(commands)
    _add_audit(commands)
    _add_view(commands)
    _add_schema(commands)
    return parser


_Commands = Any  # argparse has no public name for it


def _add_serve(commands: _Commands) -> None:
    serve = commands.add_parser("serve", help="serve the tools over MCP (stdio)")
    serve.add_argument("--reports", type=Path, help="report folder (default: per-user data)")
    serve.add_argument("--plants", type=Path, help="folder of plants that calls may name")
    serve.add_argument("--http", nargs="?", const="", metavar="ADDRESS", help=argparse.SUPPRESS)
    serve.set_defaults(command=_serve)


def _add_call(commands: _Commands) -> None:
    call = commands.add_parser("call", help="one call of one tool")
    call.add_argument("tool", help="check-plant, trim, linearize, …")
    call.add_argument("file", help="TOML or JSON file with the arguments; - reads JSON from stdin")
    _add_reports(call)
    _add_json(call)
    call.set_defaults(command=_call)


def _add_run(commands: _Commands) -> None:
    run = commands.add_parser("run", help="every call of one or more call sheets")
    run.add_argument("sheets", nargs="+", type=Path, metavar="SHEET")
    run.add_argument("--jobs", type=_jobs, default=os.cpu_count() or 1, help="calls at a time")
    _add_reports(run)
    _add_json(run)
    run.set_defaults(command=_run)


def _add_audit(commands: _Commands) -> None:
    audit = commands.add_parser("audit", help="run the calls of reports again and compare")
    audit.add_argument("paths", nargs="+", type=Path, metavar="PATH", help="reports or folders")
    audit.add_argument("--jobs", type=_jobs, default=os.cpu_count() or 1, help="reports at a time")
    _add_json(audit)
    audit.set_defaults(command=_audit)


def _add_view(commands: _Commands) -> None:
    view = commands.add_parser("view", help="a report as one HTML page")
    view.add_argument("report", type=Path)
    _add_json(view)
    view.set_defaults(command=_view)


def _add_schema(commands: _Commands) -> None:
    schema = commands.add_parser("schema", help="a JSON Schema: plant, result, or a tool's name")
    schema.add_argument("name")
    _add_json(schema)
    schema.set_defaults(command=_schema)


def _add_reports(parser: argparse.ArgumentParser) -> None:
    parser.add_argument(
        "--reports",
        type=Path,
        default=Path("tangentbook-reports"),
        help="report folder (default: %(default)s)",
    )


def _add_json(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("--json", action="store_true", help="print JSON instead of text")


def _jobs(text: str) -> int:
    jobs = int(text)
    if not 1 <= jobs <= 256:
        msg = f"between 1 and 256; got {jobs}"
        raise argparse.ArgumentTypeError(msg)
    return jobs


def _serve(options: argparse.Namespace) -> int:
    if options.http is not None:
        raise _not_available("serve --http", "this version serves over stdio only")
    if options.plants is not None and not options.plants.is_dir():
        raise TangentbookError("file.missing", "not a folder", where=f"--plants {options.plants}")
    from tangentbook.running.places import user_reports
    from tangentbook.service.stdio import serve

    serve(reports=options.reports or user_reports(), plants=options.plants)
    return _DONE


def _call(options: argparse.Namespace) -> int:
    import asyncio

    from tangentbook.contract.plain import is_object
    from tangentbook.contract.registry import tool_named
    from tangentbook.running.callfiles import inline_plant, read_call
    from tangentbook.running.files import parse
    from tangentbook.running.limits import TEXT_BYTES

    tool_named(options.tool)
    if options.file == "-":
        content = sys.stdin.buffer.read(TEXT_BYTES + 1)
        arguments = parse(content, suffix=".json", where="stdin")
        if is_object(arguments):
            arguments = inline_plant(arguments, Path())
    else:
        arguments = read_call(Path(options.file))
    answer = asyncio.run(_answer(options.tool, arguments, options.reports))
    if options.json:
        _print_json(answer.result)
    else:
        _print(f"{answer.short}\nreport: {answer.path}")
    return _DONE if answer.succeeded else _FAILED


async def _answer(tool: str, arguments: object, reports: Path) -> Answer:
    from tangentbook.running.calls import Runner
    from tangentbook.running.pool import Pool
    from tangentbook.running.store import Store

    async with Pool(jobs=1) as pool:
        return await Runner(pool=pool, store=Store(reports)).answer(tool, arguments)


def _run(options: argparse.Namespace) -> int:
    import asyncio

    from tangentbook.sheet_runs import run_calls, summary
    from tangentbook.sheets import read_sheet

    calls = [call for sheet in options.sheets for call in read_sheet(sheet)]

    def show(outcome: Outcome) -> None:
        if not options.json:
            _print(outcome.line())

    outcomes = asyncio.run(run_calls(calls, reports=options.reports, jobs=options.jobs, show=show))
    if options.json:
        _print_json({"calls": [outcome.as_dict() for outcome in outcomes]})
    else:
        _print(summary(outcomes))
    return _DONE if all(outcome.outcome == "holds" for outcome in outcomes) else _FAILED


def _audit(options: argparse.Namespace) -> int:
    import asyncio

    from tangentbook.audit import audit_reports, find_reports, summary

    paths = find_reports(options.paths)
    audits = asyncio.run(audit_reports(paths, jobs=options.jobs))
    if options.json:
        _print_json({"reports": [audit.as_dict() for audit in audits]})
    else:
        _print("\n".join([*(audit.lines() for audit in audits), summary(audits)]))
    return _DONE if all(audit.holds for audit in audits) else _FAILED


def _view(options: argparse.Namespace) -> int:
    raise _not_available(
        "view", f"this version has no HTML view; {options.report} is markdown and reads as it is"
    )


def _schema(options: argparse.Namespace) -> int:
    from tangentbook.contract.schemas import schema

    _print_json(schema(options.name))
    return _DONE


def _not_available(what: str, why: str) -> TangentbookError:
    return TangentbookError("command.not-available", why, where=what)


def _refuse(error: TangentbookError, *, as_json: bool) -> int:
    if as_json:
        _print_json({"error": error.as_dict()})
    else:
        sys.stderr.write(f"tangentbook: {error}\n")
    return _NOT_UNDERSTOOD if _is_of_command_line(error.code) else _FAILED


def _is_of_command_line(code: str) -> bool:
    """Whether the command line or a file was at fault, not the call in it."""
    return code.startswith(("file.", "sheet.")) or code in {
        "request.tool",
        "request.schema",
        "command.not-available",
    }


def _print_json(value: dict[str, Any]) -> None:
    _print(json.dumps(value, ensure_ascii=False, indent=1, allow_nan=False))


def _print(text: str) -> None:
    sys.stdout.write(f"{text}\n")
    sys.stdout.flush()
