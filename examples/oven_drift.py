"""How far does the oven of the invented Curlew magnetometer move the D2 line of its sealed argon cell?

A sealed cell keeps its density, so only the coefficients change with temperature: one call answers every temperature
from one table of cross sections. Run:  python examples/oven_drift.py
"""

from __future__ import annotations

from pertcalc.rates import collision_rates
from pertcalc.units import density_cm3, mhz


def main() -> None:
    """Print width and shift of D2 at three temperatures of the oven."""
    density = float(density_cm3(40.0, 293.15))
    rates = collision_rates("Rb", "Ar", [323.15, 333.15, 343.15])
    width, shift = rates.fwhm["D2"].values, rates.shift["D2"].values
    assert width is not None and shift is not None  # the semiclassical method knows both
    print(f"Rb + Ar, D2, n = {density:.3e} cm^-3")
    print("T, K     full width, MHz   shift, MHz")
    for T, w, d in zip(rates.temperatures, width, shift, strict=True):
        print(f"{T:6.2f}   {mhz(w, density):15.1f}   {mhz(d, density):10.1f}")
    print(f"drift of the line centre: {mhz(shift[2] - shift[0], density) / 20:.2f} MHz per kelvin")


if __name__ == "__main__":
    main()
