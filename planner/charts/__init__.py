"""Charts as pure functions from a table to a chart, shared by screen and report."""
