"""All checks in the order in which they fail fastest: format, lint, types, tests, wheel."""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent
PYTHON = sys.executable
TREES = ["server", "reports", "tests"]

STEPS: tuple[tuple[str, list[str]], ...] = (
    ("format", [PYTHON, "-m", "ruff", "format", "--check", *TREES]),
    ("lint", [PYTHON, "-m", "ruff", "check", *TREES]),
    ("types", [PYTHON, "-m", "pyright", "--pythonpath", PYTHON]),
    ("tests", [PYTHON, "-m", "pytest", "-q"]),
)


def main() -> int:
    """Run every step; the exit status is that of the first one that fails."""
    for name, command in STEPS:
        status = _step(name, command)
        if status:
            return status
    return _wheel()


def _step(name: str, command: list[str], env: dict[str, str] | None = None) -> int:
    sys.stdout.write(f"== {name}\n")
    sys.stdout.flush()
    return subprocess.run(command, cwd=ROOT, env=env, check=False).returncode


def _wheel() -> int:
    """Build the wheel, unpack it elsewhere, and run the main job from it alone."""
    with tempfile.TemporaryDirectory() as folder:
        place = Path(folder)
        build = [PYTHON, "-m", "build", "--wheel", "--outdir", str(place / "dist"), str(ROOT)]
        status = _step("wheel", build)
        if status:
            return status
        wheel = next((place / "dist").glob("*.whl"))
        pip = [PYTHON, "-m", "pip", "install", "-q", "--no-deps", "--target", str(place / "site")]
        status = _step("wheel: install", [*pip, str(wheel)])
        if status:
            return status
        env = {**os.environ, "PYTHONPATH": str(place / "site"), "PYTHONSAFEPATH": "1"}
        run = [PYTHON, "-m", "tangentbook", "run", str(ROOT / "scenarios" / "main-job.toml")]
        return _step("wheel: main job", [*run, "--reports", str(place / "reports")], env)


if __name__ == "__main__":
    sys.exit(main())
