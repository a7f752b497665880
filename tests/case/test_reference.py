"""The reference of the case file beside the shipped cases says what the schema says."""

from __future__ import annotations

from pathlib import Path

from meanfree.case.json_schema import case_schema
from meanfree.case.reference import reference_markdown

PAGE = Path(__file__).parents[2] / "cases" / "README.md"


def test_the_page_is_current():
    assert PAGE.read_text(encoding="utf-8") == reference_markdown()


def test_every_key_is_described():
    text = reference_markdown()
    for table in case_schema()["$defs"].values():
        for key, entry in table["properties"].items():
            if key not in {"mode", "law"}:
                assert f"- `{key}`" in text
                assert entry.get("description"), key
