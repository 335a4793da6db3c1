"""Harmonic filters: low-pass prototypes, their parts for a cutoff and a line, the search for the least that does."""
