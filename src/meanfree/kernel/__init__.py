"""The compiled integrator: an adaptive stiff method that runs many conditions at once."""
