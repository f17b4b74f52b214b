"""Guesses about a sheet in the team's own layout: which column holds what, and why one thinks so.

Pure: cells in, guesses with reasons out. Nothing here decides; a person reads the guesses, in the
output of the check or as comments in the config, and corrects them.
"""
