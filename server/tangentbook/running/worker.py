"""One worker process: JSON lines in, JSON lines out.

Started by the pool as `python -m tangentbook.running.worker`. The protocol has file descriptors
of its own, so that a stray print of a library cannot break it; prints go to stderr. The worker
limits its own memory and dies with its parent, killed parents included.

A line in is {"tool": …, "arguments": {…}}; a line out is what `perform` answers, or
{"error": {…}}, and has "retire": true where the worker wants to be replaced. {} asks whether the
worker is there.
"""

from __future__ import annotations

import argparse
import contextlib
import ctypes
import json
import os
import queue
import resource
import signal
import sys
import threading
import traceback
from collections.abc import Callable
from typing import IO, Any

from tangentbook.errors import LimitError, TangentbookError
from tangentbook.running.limits import WORKER_MEMORY_BYTES

Perform = Callable[[str, dict[str, Any]], dict[str, Any]]
"""(tool, resolved arguments) -> result, markdown, files, short, caveat."""

_PR_SET_PDEATHSIG = 1  # linux/prctl.h


def main(load: Callable[[], Perform], arguments: list[str] | None = None) -> None:
    """Serve calls until stdin ends; `load` imports what computes, after the limits are set."""
    options = argparse.ArgumentParser()
    options.add_argument("--memory", type=int, default=WORKER_MEMORY_BYTES)
    memory: int = options.parse_args(arguments).memory
    replies = _private_stdout()
    _die_with_parent()
    with contextlib.suppress(ValueError, OSError):  # not every system limits address space
        resource.setrlimit(resource.RLIMIT_AS, (memory, memory))
    perform = load()
    lines = _lines_of_stdin()
    _send(replies, _encoded({"ready": True}))
    while True:
        _send(replies, _answer(perform, lines.get(), memory=memory))


def _answer(perform: Perform, line: bytes, *, memory: int) -> bytes:
    """The reply to one line; whatever goes wrong is an envelope, never silence."""
    try:
        call = json.loads(line)
        if not call:
            return _encoded({"ready": True})
        return _encoded(perform(call["tool"], call["arguments"]))
    except TangentbookError as error:
        return _encoded({"error": error.as_dict()})
    except MemoryError:
        return _encoded({"error": _out_of_memory(memory).as_dict(), "retire": True})
    except Exception as error:  # noqa: BLE001 - the one place that turns a crash into an answer
        traceback.print_exc(file=sys.stderr)
        return _encoded({"error": _crash(error).as_dict(), "retire": True})


def _out_of_memory(memory: int) -> LimitError:
    return LimitError(
        "limit.memory",
        f"the call needs more than {memory / 1024**2:.0f} MiB of memory",
        hint="ask for less: fewer states, points, frequencies or further answers",
    )


def _crash(error: Exception) -> TangentbookError:
    return TangentbookError(
        "internal.crash",
        f"an internal error stopped the call ({type(error).__name__}); this is a mistake of the "
        "program, not of the plant",
        hint="the details are in the log of the server; a smaller or differently written plant "
        "may avoid it",
    )


def _encoded(reply: dict[str, Any]) -> bytes:
    return json.dumps(reply, allow_nan=False, separators=(",", ":")).encode("ascii")


def _send(replies: IO[bytes], reply: bytes) -> None:
    replies.write(reply + b"\n")
    replies.flush()


def _private_stdout() -> IO[bytes]:
    """The pipe to the parent under a descriptor nobody else knows; stdout becomes stderr."""
    private = os.dup(1)
    os.dup2(2, 1)
    return os.fdopen(private, "wb")


def _die_with_parent() -> None:
    """Have the kernel kill this process when its parent is gone, also while a library computes."""
    if sys.platform.startswith("linux"):
        ctypes.CDLL(None).prctl(_PR_SET_PDEATHSIG, signal.SIGKILL, 0, 0, 0)


def _lines_of_stdin() -> queue.SimpleQueue[bytes]:
    """Lines as they come; the end of stdin means the parent is gone, and ends this process."""
    lines: queue.SimpleQueue[bytes] = queue.SimpleQueue()

    def read() -> None:
        for line in sys.stdin.buffer:
            lines.put(line)
        os._exit(0)

    threading.Thread(target=read, daemon=True).start()
    return lines


def load_perform() -> Perform:
    """What computes; imported here alone, so that no other process loads it."""
    from tangentbook.tools.perform import perform

    return perform


if __name__ == "__main__":
    main(load_perform)
