"""Starting the screen's server: records checked first, loopback only, the settings that stand beside the app."""

from __future__ import annotations

import importlib.util
import os
import subprocess
import sys
from pathlib import Path

from planner.assemble import load
from sim.errors import RequestError


def serve(fleet: Path, *, port: int) -> None:
    """Check that the fleet can be read, then run the server until it is stopped."""
    load(fleet)
    found = importlib.util.find_spec("ui")
    if found is None or not found.submodule_search_locations:
        raise RequestError("screen", "no package ui", "a whole installation", "install spoolwright again")
    folder = Path(next(iter(found.submodule_search_locations)))
    print(f"Spoolwright's screen: http://localhost:{port}  (Ctrl-C ends it)", flush=True)
    command = [sys.executable, "-m", "streamlit", "run", str(folder / "app.py"), "--server.port", str(port)]
    environment = {**os.environ, "SPOOLWRIGHT_FLEET": str(fleet.resolve())}
    # the server's own settings are read from .streamlit in the folder that it is started in
    process = subprocess.Popen(command, cwd=folder, env=environment, stdout=subprocess.DEVNULL)
    try:
        code = process.wait()
    except KeyboardInterrupt:
        process.terminate()
        process.wait()
        return
    if code:
        raise RequestError("port", str(port), "a free port", "choose another with --port")
