"""Curves of our own: one valence electron, an alkali core and a noble-gas atom, in atomic units."""
