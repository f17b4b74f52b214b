"""Floor 2: from the team's workbook to typed rows, findings and derivations."""
