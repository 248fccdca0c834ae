"""Equilibrium, stability and steps over time. Knows no file and no progress."""
