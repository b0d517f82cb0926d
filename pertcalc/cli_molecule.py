"""The command ``pertcalc molecule``: words only; the library computes."""

from __future__ import annotations

from typing import Any

import click
from click.shell_completion import CompletionItem

from pertcalc.cli_options import AnyGas, Species, Words, check_targets, checked_gas, deliver, one_format, result_options
from pertcalc.errors import UnknownNameError
from pertcalc.names import DEFAULT_FILL_TEMPERATURE_K, DEFAULT_PRESSURE_TORR

# Those of pertcalc.molecules.radial, which is too heavy for the way to --help (a test compares them).
STATES = ("X", "A1/2", "A3/2", "B")


class State(click.ParamType):
    """An electronic state of the pair; completes on the command line."""

    name = "state"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> str:
        """Return the standard spelling; UnknownNameError for no state of ours."""
        for state in STATES:
            if str(value).strip().lower() == state.lower():
                return state
        raise UnknownNameError("state", str(value), STATES)

    def shell_complete(self, ctx: click.Context, param: click.Parameter, incomplete: str) -> list[CompletionItem]:
        """Names that begin with what is typed."""
        return [CompletionItem(name) for name in STATES if name.lower().startswith(incomplete.lower())]


@click.command(short_help="Bound and quasi-bound pairs: levels, counts, equilibrium.")
@click.argument("alkali", type=Species("alkali"))
@click.argument("gas", type=AnyGas("noble gas"))
@click.option(
    "--state", type=State(), default="X", show_default=True, help=f"Electronic state, one of {', '.join(STATES)}."
)
@click.option(
    "--isotope", "isotopes", multiple=True, metavar="LABEL", help="As 87Rb or 3He; one per partner. [default: natural]"
)
@click.option(
    "--temperature", type=Words("temperature", "K"), default=300.0, show_default="300 K", help="Of the equilibrium."
)
@click.option(
    "--pressure",
    type=Words("pressure"),
    default=DEFAULT_PRESSURE_TORR,
    show_default="20 Torr",
    help="Of the gas, at the fill.",
)
@click.option(
    "--fill-temperature",
    type=Words("temperature", "K"),
    default=DEFAULT_FILL_TEMPERATURE_K,
    show_default="20 degC",
    help="At which the pressure was read.",
)
@click.option("--rotation", type=int, metavar="N", help="Only the levels of this N. [default: N = 0 in the text]")
@click.option("--points", type=int, metavar="N", help="Points of the spectral grid. [default: what the well needs]")
@click.option("--equilibrium", "asked", is_flag=True, help="K of an excited state even where it means little.")
@click.option("--curves", "curve_file", metavar="FILE", help="A curve file (TOML) in place of the default curves.")
@click.option("--plot", metavar="FILE", help="Also draw curve and levels: FILE ends in .png or .svg.")
@result_options
def molecule(
    alkali: str,
    gas: str,
    state: str,
    isotopes: tuple[str, ...],
    temperature: float,
    pressure: float,
    fill_temperature: float,
    rotation: int | None,
    points: int | None,
    asked: bool,
    curve_file: str | None,
    plot: str | None,
    as_json: bool,
    as_csv: bool,
    output: str | None,
    force: bool,
) -> None:
    """Levels of the pair ALKALI-GAS, counted three ways, and how many alkali atoms are bound at any time.

    Every bound level E(v, N) with rotational constant, turning points and extent; quasi-bound levels behind the
    centrifugal barrier with widths; the equilibrium constant, quantum beside classical; times of making and breaking.

    \b
    Examples:
        pertcalc molecule Rb Ar
        pertcalc molecule Cs Xe --state A1/2 --plot cs-xe.png
        pertcalc molecule Li He --isotope 6Li --isotope 3He
    """
    one_format(as_json, as_csv)
    check_targets(force, output, plot)
    gas = checked_gas(gas, curve_file)
    if plot is not None:
        from pertcalc.report.curve_figures import figure_format

        figure_format(plot)
    from pertcalc.molecules.molecule import molecule as compute

    found = compute(
        alkali,
        gas,
        state,
        isotopes=isotopes,
        temperature=temperature,
        pressure_torr=pressure,
        fill_temperature_K=fill_temperature,
        rotation=rotation,
        points=points,
        excited_equilibrium=asked,
        curves=curve_file,
    )
    if plot is not None:
        from pertcalc.report.molecule_figures import save_levels

        click.echo(f"wrote {save_levels(found, plot)}", err=True)
    deliver(_rendered(found, as_json, as_csv), output, force)


def _rendered(found: Any, as_json: bool, as_csv: bool) -> str:
    """The answer in the format asked for."""
    if as_json:
        from pertcalc.report.as_json import dump
        from pertcalc.report.molecule_data import molecule_json

        return dump(molecule_json(found))
    if as_csv:
        from pertcalc.report.molecule_data import molecule_csv_rows
        from pertcalc.report.rows import as_csv as csv_text

        return csv_text(molecule_csv_rows(found))
    from pertcalc.report.molecule_text import molecule_text

    return molecule_text(found)
