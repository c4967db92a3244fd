"""Distances, mass definitions, mean cosmic DM and its scatter, halo mass function. Knows nothing of catalogues or gas."""
