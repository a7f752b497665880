"""What is done: the mechanism, the vessel, the temperature, the fill, and the run."""
