"""Whether a hand result is right: exactly, under a condition, or not, with a witness."""
