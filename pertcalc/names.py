"""Names and defaults that the physics and the command line share; imports nothing, so that help stays light."""

from __future__ import annotations

METHODS = ("semiclassical", "quantum", "closed-form")

# Conditions of a cell when nobody says otherwise: common practice, no source.
DEFAULT_PRESSURE_TORR = 20.0
DEFAULT_FILL_TEMPERATURE_K = 293.15
