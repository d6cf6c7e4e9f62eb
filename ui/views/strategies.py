"""Strategies: simulate the fleet under each, with what-ifs, and compare cost and downtime."""

from __future__ import annotations

import json

import streamlit as st

from ui import data
from ui.widgets import ask, study

st.title("Strategies")
st.write("Simulate the fleet under each way of working, with the same luck for all, and compare cost and downtime.")

fleet = data.fleet()
request = ask.form(fleet)
if request is not None:
    st.query_params["study"] = study.start(request)
    st.rerun()
job = st.query_params.get("study")
if not job:
    st.info("Choose and press Run. Work goes on outside this page: a reload finds it again.")
elif not study.known(job):
    st.warning("This study is not in the store of this machine any more; run it again.")
else:
    study.follow(job)
    answer = study.answer_of(job)
    if answer is not None:
        study.results(answer)
        st.download_button(
            "Download everything as JSON",
            json.dumps(answer, indent=1),
            file_name="comparison.json",
            mime="application/json",
        )
