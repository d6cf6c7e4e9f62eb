"""The tables: every column, its unit and its meaning, declared once."""
