"""Pair potentials: analytic forms, tables, fine-structure curves and the files that carry them."""
