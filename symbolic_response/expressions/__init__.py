"""Exact expressions: the tree, its reader, normal form, values, enclosures and printers."""
