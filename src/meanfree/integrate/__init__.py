"""One run, integrated by scipy: its trajectory, its events and its self-checks."""
