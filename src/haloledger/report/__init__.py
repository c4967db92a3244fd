"""What a person or a program reads: tables on disk, the ledger on screen, figures, the notebook view.

Data classes first (`views`), then layout; nothing here works anything out.
"""
