"""Saltmarsh Instruments, an invented maker, chooses the buffer gas of its invented Curlew magnetometer.

The Curlew pumps rubidium on D1 in a sealed cell with 40 Torr of gas. Two wishes: the gas must not widen D1 beyond
700 MHz, or its laser no longer resolves the ground level; and at least half of the orientation that reaches P1/2 must
be lost there before the atom decays. Run:  python examples/choose_gas.py
"""

from __future__ import annotations

from pertcalc.report.compute import compute_report, first
from pertcalc.report.request import make_request
from pertcalc.units import mhz, parse_pressure, parse_temperature

WIDEST_MHZ = 700.0


def main() -> None:
    """Print one row per gas."""
    request = make_request(
        "Rb", temperature_K=parse_temperature("60 degC"), pressure_torr=parse_pressure("40 Torr"), field_G=0.5
    )
    report = compute_report(request, jobs=2)
    print("Curlew cell: Rb, 40 Torr filled at 20 degC, used at 60 degC")
    print("gas   D1 full width   P1/2 orientation loss / decay")
    for gas in report.gases:
        k = first(gas.rates.fwhm["D1"])
        level = gas.balances["P1/2"]
        assert k is not None  # the semiclassical method knows every width
        width = float(mhz(k, request.fill.density_cm3))
        ratio = level.losses[1] / level.decay
        good = width <= WIDEST_MHZ and ratio >= 1
        print(f"{gas.noble_gas:4}  {width:9.0f} MHz   {ratio:29.2f}   {'fits' if good else 'does not fit'}")


if __name__ == "__main__":
    main()
