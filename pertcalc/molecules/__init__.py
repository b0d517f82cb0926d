"""Bound and quasi-bound alkali-gas pairs: levels, counts, equilibrium. One electronic state is one radial problem."""
