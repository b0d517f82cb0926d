"""pertcalc: collision rates of polarised alkali vapours in noble buffer gases, from pair potentials.

``pertcalc.collision_rates(alkali, noble_gas, temperature)`` is the door to the numbers.
"""

from __future__ import annotations

from typing import Any

__version__ = "0.1.0"
__all__ = ["__version__", "collision_rates"]


def __getattr__(name: str) -> Any:
    # Loaded on first use, so that the command line's help does not wait for numpy and scipy.
    if name == "collision_rates":
        from pertcalc.rates import collision_rates

        return collision_rates
    raise AttributeError(f"module 'pertcalc' has no attribute {name!r}")
