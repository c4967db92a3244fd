"""Entries, their sum, the budget. Knows nothing of files and screens."""
