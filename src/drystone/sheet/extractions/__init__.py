"""Two extractions of the same papers, compared cell by cell."""
