"""Distances, mass definitions, mean cosmic DM and its scatter, mass function. Knows nothing of catalogues or gas."""
