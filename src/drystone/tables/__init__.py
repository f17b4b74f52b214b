"""Floor 1: what every table of drystone looks like, and how it is stored.

The pandera schemas here are the only place where column names, types, units, allowed values and
descriptions are written down; the column guide and the template are made from them.
"""
