"""Gas in haloes: density shapes, kept-fraction laws, model files, projection tables and the one kernel.

A model gives a density; everything else (mass, kept fraction, column) is worked out from it here. Knows nothing of
catalogues or sightlines, and draws no random numbers: spreads are only declared.
"""
