"""Proofs for all positive rates: finite exact data from which inequalities follow."""
