"""Every limit of running a call, with its reason."""

from __future__ import annotations

WALL_CLOCK_S = 45.0
"""Seconds of one call: some clients give up after 60 s, and an answer must reach them before."""

START_S = 60.0
"""Seconds a worker may take to import its libraries: cold disks and busy machines included."""

STOP_S = 5.0
"""Seconds to wait for a killed worker to be gone; the kernel needs milliseconds."""

WORKER_MEMORY_BYTES = 4 * 1024**3
"""Address space of one worker: a hostile plant must not push the machine into swapping."""

CALLS_PER_WORKER = 500
"""Calls after which a worker is replaced, so that what libraries cache cannot grow for ever."""

REPLY_BYTES = 256 * 1024**2
"""Longest line a worker may answer: a report of 2,000 states with its side files stays below."""

TEXT_BYTES = 1024**2
"""Longest call, plant, sheet or set of arguments that is read."""

REPORT_BYTES = 64 * 1024**2
"""Longest report that is read back."""

SHEET_CALLS = 10_000
"""Calls of one sheet after its grids are laid out: a mistyped grid must not fill the disk."""

DEFAULT_JOBS = 2
"""Workers of the server; the command line takes as many as there are processors."""

PREWARM_DELAY_S = 0.3
"""Seconds before the server starts its first worker, so that the handshake has the processor."""

PROGRESS_S = 1.0
"""Seconds between two signs of life sent to a client that asked for them."""
