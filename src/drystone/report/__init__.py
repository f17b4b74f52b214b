"""Floor 2: from results to one page that can be read offline."""
