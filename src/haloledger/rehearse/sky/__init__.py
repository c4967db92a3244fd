"""The truth: matter, haloes, galaxies and their true columns, in a code of its own that shares no line with the audit."""
