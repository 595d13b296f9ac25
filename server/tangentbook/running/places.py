"""Where files live when nobody says where."""

from __future__ import annotations

import os
import sys
from pathlib import Path


def user_reports() -> Path:
    """The per-user report folder of the server, since clients start servers anywhere."""
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Application Support" / "tangentbook" / "reports"
    data = os.environ.get("XDG_DATA_HOME", "")
    root = Path(data) if data.startswith("/") else Path.home() / ".local" / "share"
    return root / "tangentbook" / "reports"
