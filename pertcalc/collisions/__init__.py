"""Collision dynamics: classical paths, close coupling, closed forms; everything here is in atomic units."""
