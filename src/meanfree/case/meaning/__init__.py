"""The second pass: what the tables of a case file mean, one module per table."""
