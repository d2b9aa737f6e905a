"""Reading LaTeX formulas in the names of a network: one reading or a refusal."""
