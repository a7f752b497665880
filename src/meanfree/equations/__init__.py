"""The differential equations of an experiment: one inert description and its readers."""
