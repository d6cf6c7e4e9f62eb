"""Where this user's saved runs lie: never in the fleet's own folder."""

from __future__ import annotations

import os
import sys
from pathlib import Path


def home() -> Path:
    """Return ``$SPOOLWRIGHT_HOME``, else the folder that this system keeps a user's data in; it need not exist yet."""
    named = os.environ.get("SPOOLWRIGHT_HOME")
    if named:
        return Path(named).expanduser().absolute()
    if sys.platform == "win32":
        return Path(os.environ.get("LOCALAPPDATA", Path.home() / "AppData" / "Local")) / "Spoolwright"
    if sys.platform == "darwin":
        return Path.home() / "Library" / "Application Support" / "Spoolwright"
    return Path(os.environ.get("XDG_DATA_HOME") or Path.home() / ".local" / "share") / "spoolwright"
