"""The truth: matter, haloes, galaxies and their true columns, in a code that shares no line with the audit."""
