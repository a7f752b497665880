"""Campaigns: many conditions of one experiment, in parts on disk, resumed where they stopped."""
