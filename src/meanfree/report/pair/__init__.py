"""What `collide` says about two gases: the question, the summary, the tables, the page."""
