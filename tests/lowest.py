"""The suite with the lowest versions that pyproject.toml admits, in an environment of its own."""

from __future__ import annotations

import re
import subprocess
import sys
import tempfile
import tomllib
import venv
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent


def lowest(requirements: list[str]) -> list[str]:
    """Each requirement pinned to its lower bound."""
    return [re.sub(r">=([0-9.]+).*", r"==\1", requirement) for requirement in requirements]


def main() -> int:
    """Install and run; the exit status is pytest's."""
    project = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))["project"]
    with tempfile.TemporaryDirectory() as folder:
        venv.create(folder, with_pip=True)
        python = str(Path(folder, "bin", "python"))
        wanted = [*lowest(project["dependencies"]), "pytest", "hypothesis"]
        subprocess.run([python, "-m", "pip", "install", "-q", *wanted], check=True)
        # the suite of the wheel and of types needs other tools; this is about what users import
        command = [python, "-m", "pytest", "-q", "-p", "no:cacheprovider"]
        return subprocess.run(command, cwd=ROOT, check=False).returncode


if __name__ == "__main__":
    sys.exit(main())
