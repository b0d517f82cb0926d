"""Names that the physics and the command line share; imports nothing, so that help stays light."""

from __future__ import annotations

METHODS = ("semiclassical", "quantum", "closed-form")
