"""A simulated sky with known truth, seen through a survey, audited by the same code, and compared with the truth.

rehearsal.rehearse   the whole of it, reading as a table of contents
sky                  the truth: it knows nothing of the audit's haloes and gas
"""
