"""Make the 25 curve files of the one-electron model, ALKALI-GAS_model.toml.

    python notes/scripts/make_model_curves.py [OUTPUT] [--electron-gas MODEL]

OUTPUT defaults to potentials/ of the checkout. Nothing but the package is needed; the files repeat up to rounding.
"""

from __future__ import annotations

import argparse
import time
from pathlib import Path

from pertcalc.one_electron.curve_file import identity_of, to_toml
from pertcalc.one_electron.model_curves import compute_model
from pertcalc.species import ALKALIS, GASES


def main() -> None:
    """Write every file and print one line for each."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("output", nargs="?", type=Path, default=Path(__file__).resolve().parents[2] / "potentials")
    parser.add_argument("--electron-gas", default=None)
    chosen = parser.parse_args()
    begin = time.perf_counter()
    for alkali in ALKALIS:
        for gas in GASES:
            model = compute_model(alkali, gas, model=chosen.electron_gas)
            path = chosen.output / f"{identity_of(model)}.toml"
            path.write_text(to_toml(model), encoding="utf-8")
            print(f"{path.name}  {time.perf_counter() - begin:6.1f} s  {'; '.join(model.warnings)}", flush=True)


if __name__ == "__main__":
    main()
