"""The keys that each rate law takes in a case file, one file a law."""
