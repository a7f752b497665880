"""Kinetic theory of gases as pure functions of numbers and arrays, SI with mol."""
