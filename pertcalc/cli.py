"""The command line: words only. The library computes, this module translates words and prints results."""

from __future__ import annotations

import errno
import os
import sys
from typing import Any

import click

from pertcalc import __version__
from pertcalc.cli_curves import curves
from pertcalc.cli_molecule import molecule
from pertcalc.cli_options import (
    INTERRUPTED,
    QUANTITIES,
    AnyGas,
    Quantity,
    Shown,
    Species,
    Words,
    check_targets,
    checked_gas,
    deliver,
    end,
    method_option,
    one_format,
    progress_bar,
    rate_options,
    result_options,
)
from pertcalc.cli_verdict import verdict
from pertcalc.errors import PertcalcError


class Friendly(click.Group):
    """Turns every error a user can cause into one message on stderr and the exit code it carries."""

    def invoke(self, ctx: click.Context) -> Any:
        """Run the command; errors of the library leave as one ClickException."""
        try:
            return super().invoke(ctx)
        except PertcalcError as error:
            raise Shown(str(error), error.exit_code) from error
        except KeyboardInterrupt as stop:
            raise Shown("stopped by the user; nothing was finished.", INTERRUPTED) from stop
        except OSError as error:
            if error.errno == errno.EPIPE:
                raise  # the reader left, as `head` does: click ends quietly
            _drop_stdout()
            where = f" {error.filename!r}" if error.filename else ""
            raise Shown(f"cannot read or write{where}: {error.strerror or error}.", 1) from error


def _drop_stdout() -> None:
    """Send what is still buffered nowhere, so that the flush at exit does not fail a second time."""
    try:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    except (OSError, ValueError):
        return  # stdout is no real file, then there is nothing to flush


@click.group(cls=Friendly, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, prog_name="pertcalc")
def cli() -> None:
    """Collision rates of polarised alkali vapours (Li, Na, K, Rb, Cs) in noble buffer gases, from pair curves.

    Widths and shifts of the D lines, relaxation of every multipole of the P levels and fine-structure transfer, with
    errors, beside radiative decay, the Hanle field and published measurements. Start with:

        pertcalc report Rb

    Exit codes: 0 done, 1 bad data, 2 usage, 3 not converged, 4 a published check failed.
    """


@cli.command(short_help="The main job: every rate of one alkali in each gas, in your cell.")
@click.argument("alkali", type=Species("alkali"))
@click.option("--gas", "gases", type=AnyGas("noble gas"), multiple=True, help="May be repeated. [default: all five]")
@click.option("--temperature", type=Words("temperature", "K"), help='Of the cell, as "60 degC"; a bare number is K.')
@click.option("--pressure", type=Words("pressure"), help='Of the gas at the fill, as "20 Torr".')
@click.option(
    "--fill-temperature", type=Words("temperature", "K"), help="At which the pressure was read. [default: 20 degC]"
)
@click.option("--field", type=Words("field"), help='Magnetic field, as "0.5 G".')
@rate_options
@click.option("--jobs", type=click.IntRange(min=1), help="Processes that share the gases. [default: all processors]")
@result_options
def report(
    alkali: str,
    gases: tuple[str, ...],
    temperature: float | None,
    pressure: float | None,
    fill_temperature: float | None,
    field: float | None,
    method: str,
    curve_file: str | None,
    jobs: int | None,
    as_json: bool,
    as_csv: bool,
    output: str | None,
    force: bool,
) -> None:
    """The main job: every rate of ALKALI in each gas, in your cell, beside measurement.

    Per gas: full width and shift of D1 and D2, loss of every multipole of P1/2 and P3/2, fine-structure transfer, the
    ratio to radiative decay, the Hanle field with and without collisions, measured values, and what rules the levels.
    A sealed cell keeps its density: the pressure counts at the fill temperature. Defaults are shown in the report.

    \b
    Example:
        pertcalc report Rb --gas He --gas Ar --temperature "60 degC" --pressure "20 Torr" --field "0.5 G"
    """
    one_format(as_json, as_csv)
    check_targets(force, output)
    from pertcalc.report.compute import compute_report, default_jobs
    from pertcalc.report.request import make_request

    request = make_request(
        alkali,
        [checked_gas(gas, curve_file) for gas in gases],
        temperature_K=temperature,
        pressure_torr=pressure,
        fill_temperature_K=fill_temperature,
        field_G=field,
        method=method,
        curves=curve_file,
    )
    with progress_bar(f"{request.alkali} in {', '.join(request.gases)}") as progress:
        made = compute_report(request, jobs or default_jobs(), progress)
    deliver(_rendered(made, as_json, as_csv), output, force)
    end(made)


def _rendered(made: Any, as_json: bool, as_csv: bool) -> str:
    """A report in the format asked for."""
    if as_json:
        from pertcalc.report.as_json import dump, report_json

        return dump(report_json(made))
    if as_csv:
        from pertcalc.report.rows import report_csv

        return report_csv(made)
    from pertcalc.report.report_text import report_text

    return report_text(made)


@cli.command(short_help="Rates of one pair per unit gas density.")
@click.argument("alkali", type=Species("alkali"))
@click.argument("gas", type=AnyGas("noble gas"))
@click.option(
    "--temperature",
    "temperatures",
    type=Words("temperature", "K"),
    multiple=True,
    default=(300.0,),
    show_default="300 K",
    help='As 368 (kelvin) or "95 degC"; may be repeated.',
)
@click.option(
    "--ensemble", "members", type=int, metavar="N", help="Sample every stated error N times: spread and its sources."
)
@rate_options
@result_options
def rates(
    alkali: str,
    gas: str,
    temperatures: tuple[float, ...],
    members: int | None,
    method: str,
    curve_file: str | None,
    as_json: bool,
    as_csv: bool,
    output: str | None,
    force: bool,
) -> None:
    """Collision rates of ALKALI with GAS per unit gas density, at any number of temperatures.

    Widths, shifts, multipole losses and transfers with numerical and model error and temperature exponent. With
    --curves FILE, GAS may be any perturber that file names. --ensemble 64 samples what the curves state as uncertain
    and prints the 16-84 % interval of every rate and the three inputs it comes from; it costs about twelve times as
    much, and Ctrl-C prints the members that are finished.

    \b
    Example:
        pertcalc rates K Ar --temperature 368 --temperature "150 degC" --json
    """
    one_format(as_json, as_csv)
    check_targets(force, output)
    gas = checked_gas(gas, curve_file)
    if members is not None:
        _ensemble(alkali, gas, temperatures, members, method, curve_file, as_json, as_csv, output, force)
        return
    from pertcalc.rates import collision_rates

    with progress_bar(f"{alkali} + {gas}") as progress:
        found = collision_rates(alkali, gas, list(temperatures), method=method, curves=curve_file, progress=progress)
    if as_json:
        from pertcalc.report.as_json import dump

        text = dump(found.to_json())
    elif as_csv:
        from pertcalc.report.rows import rates_csv

        text = rates_csv(found)
    else:
        from pertcalc.report.rates_text import rates_text

        text = rates_text(found)
    deliver(text, output, force)


def _ensemble(
    alkali: str,
    gas: str,
    temperatures: tuple[float, ...],
    members: int,
    method: str,
    curve_file: str | None,
    as_json: bool,
    as_csv: bool,
    output: str | None,
    force: bool,
) -> None:
    """The rates with their ensemble, in the format asked for."""
    from pertcalc.ensemble import ensemble
    from pertcalc.report.as_json import dump
    from pertcalc.report.ensemble_data import ensemble_csv, rates_ensemble_json
    from pertcalc.report.ensemble_text import rates_ensemble_text
    from pertcalc.spread import INTERVAL, check_size

    check_size(members, INTERVAL)
    with progress_bar(f"{alkali} + {gas}, {members} members") as progress:
        found = ensemble(alkali, gas, list(temperatures), members, curves=curve_file, method=method, progress=progress)
    if as_json:
        text = dump(rates_ensemble_json(found))
    else:
        text = ensemble_csv(found) if as_csv else rates_ensemble_text(found)
    deliver(text, output, force)
    if found.interrupted:
        raise Shown(f"stopped by the user; {found.size} of {found.asked} members were finished.", INTERRUPTED)


cli.add_command(curves)
cli.add_command(molecule)
cli.add_command(verdict)


@cli.command(short_help="Published checks, exact laws, and every measured value beside ours.")
@click.option("--all", "everything", is_flag=True, help="Every measured pair, not only those with a READ value.")
@click.option(
    "--quantity", "quantities", type=Quantity(), multiple=True,
    help=f"Only these measured values: {', '.join(QUANTITIES)}; may be repeated. [default: all]",
)  # fmt: skip
@method_option
@click.option("--jobs", type=click.IntRange(min=1), help="Processes that share the pairs. [default: all processors]")
@click.option("--plot", metavar="FILE", help="Also draw ours against measured, and pulls: FILE ends in .png or .svg.")
@result_options
def validate(
    everything: bool,
    quantities: tuple[str, ...],
    method: str,
    jobs: int | None,
    plot: str | None,
    as_json: bool,
    as_csv: bool,
    output: str | None,
    force: bool,
) -> None:
    """How far to trust it: published checks, exact laws, and every measured value beside ours.

    Wells and rates that were READ and exact laws are checked against tolerances stated beforehand; if one fails,
    everything is printed and the exit code is 4. Values FROM MEMORY are compared and never fail. Every measured row
    stands beside ours with errors, ratio and deviation in units of the combined error; medians per quantity and gas.

    \b
    Example:
        pertcalc validate --all --quantity fwhm --quantity shift -o widths.txt
    """
    one_format(as_json, as_csv)
    check_targets(force, output, plot)
    if plot is not None:
        from pertcalc.report.curve_figures import figure_format

        figure_format(plot)
    from pertcalc.report.compute import default_jobs
    from pertcalc.report.validation_run import validate as run

    with progress_bar("measured pairs") as progress:
        found = run(everything, quantities, method, jobs or default_jobs(), progress)
    deliver(_validation(found, as_json, as_csv), output, force)
    if plot is not None:
        _draw_validation(found, plot)
    end(found, found.failure())


def _draw_validation(found: Any, plot: str) -> None:
    """Write the figure; without a finished pair there is none, and the end of the command says why."""
    from pertcalc.report.validation_figures import drawable, save_validation

    if drawable(found.scores):
        title = f"pertcalc {found.version} against published measurements, method {found.method}"
        click.echo(f"wrote {save_validation(found.scores, plot, title)}", err=True)
    else:
        click.echo(f"{plot} not written: no measurement has a computed value beside it.", err=True)


def _validation(found: Any, as_json: bool, as_csv: bool) -> str:
    """A validation in the format asked for."""
    if as_json:
        from pertcalc.report.as_json import dump
        from pertcalc.report.validation_data import validation_json

        return dump(validation_json(found))
    if as_csv:
        from pertcalc.report.validation_data import validation_csv

        return validation_csv(found)
    from pertcalc.report.validation_text import validation_text

    return validation_text(found)
