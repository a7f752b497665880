"""What a reader sees: wording, figures, tables, the page, and the folder that holds them."""
