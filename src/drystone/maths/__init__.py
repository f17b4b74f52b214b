"""Arithmetic of the review: arrays in, frozen dataclasses out; NumPy and SciPy only."""
