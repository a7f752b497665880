"""The shape of a case file: one pydantic model per table, and nothing about its meaning."""
