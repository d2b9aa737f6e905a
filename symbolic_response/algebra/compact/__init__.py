"""Short forms of polynomials in rates, each proved equal to what it stands for.

``factor.factored``: one polynomial; ``network.compact_network``: all sums of a network together;
``states.eliminated``: tree sums by state elimination; ``together.compact_together``: any sums.
"""
