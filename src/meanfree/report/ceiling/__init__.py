"""`ceiling` as a summary, as words and tables, and as a document."""
