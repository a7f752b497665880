"""What to run, how long, how hot, how full, when to sample, and whether the model is honest."""
