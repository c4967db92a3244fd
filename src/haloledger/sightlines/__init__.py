"""Sightlines: position and redshift draws, who is near, and the terms at the two ends. Knows nothing of gas."""
