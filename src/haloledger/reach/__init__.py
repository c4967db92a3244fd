"""What could not be listed: the census of haloes along an average line, and coverage of the catalogues."""
