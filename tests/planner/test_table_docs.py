"""planner/TABLES.md says what the schema says."""

from __future__ import annotations

from pathlib import Path

from planner.schema.registry import OUTPUTS, TABLES
from planner.schema.setting_tables import SETTINGS
from planner.table_docs import tables_text

PAGE = Path(__file__).resolve().parents[2] / "planner" / "TABLES.md"


def test_the_page_is_what_the_schema_makes() -> None:
    remedy = (
        'python -c "from planner.table_docs import tables_text; print(tables_text(), end=str())" > planner/TABLES.md'
    )
    assert PAGE.read_text(encoding="utf-8") == tables_text(), f"make it anew: {remedy}"


def test_every_table_column_and_setting_is_explained() -> None:
    text = tables_text()
    for table in (*TABLES.values(), *OUTPUTS.values()):
        assert f"### {table.name}\n" in text
        for column in table.columns:
            assert column.meaning, f"{table.name}.{column.name}"
            assert f"| {column.name} |" in text
    for setting in SETTINGS:
        assert f"| {setting.name} |" in text


def test_examples_of_required_columns_can_be_read() -> None:
    for table in TABLES.values():
        for column in table.columns:
            assert not column.required or column.example, f"{table.name}.{column.name}"
