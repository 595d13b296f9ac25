"""Plants, processes and waiting, as several test files need them."""

from __future__ import annotations

import time
from pathlib import Path
from typing import TYPE_CHECKING, Any

from tangentbook.contract.plant import BRIDGE

if TYPE_CHECKING:
    from collections.abc import Callable

ODD = "support_running.odd_worker"

AT_60: dict[str, Any] = {"plant": BRIDGE, "point": {"hold": {"theta": "60 deg"}}}
"""The bridge leaf at 60 degrees: M = Mc = W r cos 60 deg = 52 kN 0.35 m / 2 = 9100 N m."""


def plant(name: str, *, about: str = "") -> dict[str, Any]:
    """A plant an odd worker knows by name."""
    return {"name": name, "about": about, "equations": ["x' = -x"]}


def odd(name: str, *, about: str = "") -> dict[str, Any]:
    """The arguments of a call of such a plant."""
    return {"plant": plant(name, about=about)}


def wait_for(condition: Callable[[], bool], *, seconds: float = 5.0) -> bool:
    """Whether the condition comes true in time."""
    end = time.monotonic() + seconds
    while time.monotonic() < end:
        if condition():
            return True
        time.sleep(0.01)
    return condition()


def is_running(pid: int) -> bool:
    """Whether a process is there and not merely waiting to be reaped."""
    try:
        status = Path(f"/proc/{pid}/stat").read_text("utf-8")
    except OSError:
        return False
    return status.rsplit(")", 1)[1].split()[0] not in {"Z", "X"}


def pids_in(path: Path) -> list[int]:
    """The process ids a sleeper wrote down."""
    return [int(word) for word in path.read_text("utf-8").split()]


def has_pids(path: Path) -> bool:
    """Whether the sleeper has written its line."""
    return path.exists() and path.read_text("utf-8").endswith("\n")
