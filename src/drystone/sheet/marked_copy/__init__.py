"""The marked copy: the team's workbook again, with every doubtful cell coloured and explained.

`write` is the entry; the original is read as bytes and never written.
"""
