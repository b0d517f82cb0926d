"""The command ``pertcalc curves``: words only; the library computes."""

from __future__ import annotations

import click

from pertcalc.cli_options import (
    AnyGas,
    Species,
    check_targets,
    checked_gas,
    deliver,
    one_format,
    progress_bar,
    result_options,
)
from pertcalc.errors import InputError


@click.command(short_help="The pair curves: list, details, plot, check of a file, computation.")
@click.argument("alkali", type=Species("alkali"), required=False)
@click.argument("gas", type=AnyGas("noble gas"), required=False)
@click.option("--curves", "curve_file", metavar="FILE", help="Show this curve file instead of a default set.")
@click.option("--plot", metavar="FILE", help="Draw one pair: FILE ends in .png or .svg.")
@click.option("--check", "check_file", metavar="FILE", help="Report every problem of a curve file (exit 1 if any).")
@click.option("--compute", is_flag=True, help="Compute the curves of ALKALI with GAS: prints or writes a curve file.")
@click.option("--electron-gas", metavar="MODEL", help="With --compute: how the electron sees the gas atom.")
@result_options
def curves(
    alkali: str | None,
    gas: str | None,
    curve_file: str | None,
    plot: str | None,
    check_file: str | None,
    compute: bool,
    electron_gas: str | None,
    as_json: bool,
    as_csv: bool,
    output: str | None,
    force: bool,
) -> None:
    """The pair curves: all of them, those of ALKALI, or one pair in detail.

    The list shows well depth De and position Re, C6 and the mark of the source. A plot shows V(R) of X, A1/2, A3/2 and
    B1/2 and the differences that shape the D lines. --compute makes X, A and B in a one-electron model and writes them
    as a curve file (-o FILE.toml), or the points with --json or --csv.

    \b
    Examples:
        pertcalc curves
        pertcalc curves Rb Ar --plot rb-ar.png
        pertcalc curves --check my-curves.toml
        pertcalc curves Rb Ar --compute -o rb-ar.toml
    """
    one_format(as_json, as_csv)
    check_targets(force, output, plot)
    if compute:
        if check_file or curve_file:
            raise InputError("--compute makes curves of its own; leave --curves and --check out.")
        _compute(alkali, gas, electron_gas, plot, as_json, as_csv, output, force)
        return
    if electron_gas is not None:
        raise InputError("--electron-gas belongs to --compute; add it.")
    from pertcalc.report import curves_text

    if check_file is not None:
        if alkali or curve_file or plot:
            raise InputError("--check FILE stands alone; give the file only.")
        deliver(curves_text.checked(check_file, as_json, as_csv), output, force)
        return
    chosen = curves_text.choose(alkali, gas and checked_gas(gas, curve_file), curve_file)
    if plot is not None:
        place = curves_text.plot(chosen, plot)
        click.echo(f"wrote {place}", err=True)
        return
    deliver(curves_text.shown(chosen, as_json, as_csv), output, force)


def _compute(
    alkali: str | None,
    gas: str | None,
    model: str | None,
    plot: str | None,
    as_json: bool,
    as_csv: bool,
    output: str | None,
    force: bool,
) -> None:
    """Curves of one pair: the file or the points on stdout, a summary on stderr."""
    if alkali is None or gas is None:
        raise InputError("--compute makes the curves of one pair: give ALKALI and GAS.")
    from pertcalc.one_electron.curve_file import curve_set
    from pertcalc.one_electron.model_curves import compute_model
    from pertcalc.report import curves_text, model_curves_text

    if not (as_json or as_csv):
        model_curves_text.identity_for(output)  # refused before the computation
    with progress_bar(f"{alkali} + {gas}") as progress:
        found = compute_model(alkali, checked_gas(gas, None), model=model, progress=progress)
    click.echo(model_curves_text.summary(found), err=True)
    if plot is not None:
        click.echo(f"wrote {curves_text.plot(curve_set(found), plot)}", err=True)
    deliver(model_curves_text.rendered(found, output, as_json, as_csv), output, force)
