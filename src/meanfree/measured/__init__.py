"""From measured runs to rate constants: readings, fits, intervals, and the comparison with Z."""
