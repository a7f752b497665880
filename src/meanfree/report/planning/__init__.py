"""The pages, figures, tables and summaries of the commands that plan."""
