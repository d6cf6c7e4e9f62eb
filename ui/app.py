"""The frame of every page: which pages there are, the shared sidebar, and the caution."""

from __future__ import annotations

import importlib.util

import streamlit as st

from ui import data

CAUTION = (
    "Planning aid only: approved limits, manuals, directives and licensed practice prevail; nothing here releases or "
    "extends anything. At a limit the answer is stop. Unknown history is no life. Margin forecasts are statistics and "
    "defer no inspection. Exchanges need engineering approval."
)
VIEWS = (
    ("fleet", "Fleet", "Today"),
    ("life", "Life left", "Today"),
    ("engine", "Engine", "Today"),
    ("removals", "Removals ahead", "Ahead"),
    ("strategies", "Strategies", "Ahead"),
    ("spares", "Spares", "Ahead"),
    ("swaps", "Swaps", "Plans"),
    ("leases", "Lease returns", "Plans"),
    ("saved", "Saved runs", "Plans"),
)


def pages() -> dict[str, list[st.Page]]:
    """Return the pages that are installed, by group."""
    found: dict[str, list[st.Page]] = {}
    for name, title, group in VIEWS:
        spec = importlib.util.find_spec(f"ui.views.{name}")
        if spec is not None and spec.origin is not None:
            found.setdefault(group, []).append(
                st.Page(spec.origin, title=title, url_path=name, default=name == "fleet")
            )
    return found


def main() -> None:
    """Draw the frame and run the page that was chosen."""
    st.set_page_config(page_title="Spoolwright", layout="wide")
    chosen = st.navigation(pages())
    settings = data.fleet().settings
    with st.sidebar:
        st.subheader("Spoolwright")
        st.text(settings.fleet_name)
        if settings.demo:
            st.badge("DEMO: invented data", color="orange")
        st.text(f"Records of {settings.as_of.isoformat()}")
        st.caption(f"Inputs {data.inputs()[:12]}")
    chosen.run()
    st.divider()
    st.caption(CAUTION)


main()
