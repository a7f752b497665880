"""What a gas is: formula, identity, thermochemistry, transport and hazard data."""
