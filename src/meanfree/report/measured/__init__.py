"""The pages, figures, tables and summaries of `fit` and `compare`."""
