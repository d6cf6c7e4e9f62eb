"""What pages read: the fleet of this server, cached by the content of its records and never by path alone."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

import streamlit as st

from planner import fingerprint, standing
from planner.assemble import load
from sim.errors import UserError
from sim.fleet import Fleet


def fleet_path() -> Path:
    """Return the folder or workbook that this server was opened for."""
    return Path(os.environ.get("SPOOLWRIGHT_FLEET", "demo_fleet"))


def inputs() -> str:
    """Return the fingerprint of the records as they are now."""
    return fingerprint.folder(fleet_path())


@st.cache_data(show_spinner="reading the records", max_entries=4)
def _fleet(content: str, path: str) -> Fleet:
    del content  # the key: records that change are read again
    return load(Path(path))


def fleet() -> Fleet:
    """Return the fleet; stop the page with the message when the records cannot be read."""
    try:
        return _fleet(inputs(), str(fleet_path()))
    except (UserError, OSError) as error:
        st.error("The records cannot be used as they are:")
        st.text(str(error))
        st.stop()


@st.cache_data(show_spinner=False, max_entries=4)
def _engines(content: str, path: str) -> list[dict[str, Any]]:
    return standing.engines(_fleet(content, path))


def engines() -> list[dict[str, Any]]:
    """Return the engines, weakest first."""
    return _engines(inputs(), str(fleet_path()))
