"""Rate laws: one file each, one small interface, one registry."""
