"""Tables and downloads as every page shows them."""

from __future__ import annotations

import io
from typing import Any

import pandas as pd
import streamlit as st

_WORDS = {
    "usd": "USD",
    "degC": "degC",
    "frac": "share",
    "p10": "P10",
    "p50": "P50",
    "p90": "P90",
    "co2": "CO2",
}


def heading(name: str) -> str:
    """Return a column's name as words: units keep their spelling."""
    words = [_WORDS.get(word, word) for word in name.split("_")]
    text = " ".join(words)
    return text[:1].upper() + text[1:]


def show(
    rows: list[dict[str, Any]], *, name: str, height: int | None = None, money: tuple[str, ...] = (), digits: int = 1
) -> None:
    """Show rows as a table with a download below. ``money``: columns shown in M USD; ``digits`` of other numbers."""
    frame = pd.DataFrame(rows)
    shown = frame.convert_dtypes()
    config = {}
    for column in shown.columns:
        if column in money:
            shown[column] = shown[column] / 1e6
            config[column] = st.column_config.NumberColumn(f"{heading(column)}, M", format="%.2f")
        elif pd.api.types.is_float_dtype(shown[column]):
            config[column] = st.column_config.NumberColumn(heading(column), format=f"%.{digits}f")
        else:
            config[column] = st.column_config.Column(heading(column))
    st.dataframe(shown, hide_index=True, width="stretch", height=height or "auto", column_config=config)
    download(frame, name)


def download(frame: pd.DataFrame, name: str) -> None:
    """Offer a table as CSV; cells that begin like a formula get a quote, so that no spreadsheet runs them."""
    safe = frame.map(lambda cell: f"'{cell}" if isinstance(cell, str) and cell[:1] in ("=", "+", "-", "@") else cell)
    text = io.StringIO()
    safe.to_csv(text, index=False)
    st.download_button("Download CSV", text.getvalue(), file_name=f"{name}.csv", mime="text/csv", key=f"csv-{name}")


def chart(drawn: Any, *, words: str) -> None:
    """Show a chart with a sentence that says what it shows."""
    st.altair_chart(drawn, width="stretch")
    st.caption(words)
