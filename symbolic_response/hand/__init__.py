"""Hand results: reading them, a verdict with a witness, and what went wrong."""
