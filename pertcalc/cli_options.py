"""Options and argument types that several commands share. Nothing heavy is imported before a command runs."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from typing import Any, Protocol, TypeVar

import click
from click.shell_completion import CompletionItem

from pertcalc.errors import InputError, PertcalcError, UnknownNameError
from pertcalc.names import METHODS

Command = TypeVar("Command", bound=Callable[..., Any])
# Those of pertcalc.measured, which is too heavy for the way to --help (a test compares them).
QUANTITIES = ("fwhm", "shift", "transfer", "multipole_loss")
INTERRUPTED = 130


class Shown(click.ClickException):
    """One message on stderr with an exit code of its own."""

    def __init__(self, message: str, exit_code: int):
        super().__init__(message)
        self.exit_code = exit_code  # type: ignore[misc]


class Species(click.ParamType):
    """The symbol of an alkali or of a noble gas, any case; completes on the command line."""

    def __init__(self, kind: str):
        self.kind = kind
        self.name = kind

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> str:
        """Return the standard spelling; UnknownNameError offers the nearest names."""
        from pertcalc import species

        return species.alkali_symbol(value) if self.kind == "alkali" else species.noble_gas_symbol(value)

    def shell_complete(self, ctx: click.Context, param: click.Parameter, incomplete: str) -> list[CompletionItem]:
        """Symbols that begin with what is typed."""
        from pertcalc.species import ALKALIS, SPECIES_GASES

        known = ALKALIS if self.kind == "alkali" else SPECIES_GASES
        return [CompletionItem(name) for name in known if name.lower().startswith(incomplete.lower())]


class AnyGas(Species):
    """A noble gas, or the label of the perturber in a curve file of the user's own: checked by the command."""

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> str:
        """Return the text; `checked_gas` decides once the options are known."""
        return str(value).strip()


class Words(click.ParamType):
    """A quantity in the user's words, turned into a plain number in the unit the library takes."""

    def __init__(self, quantity: str, bare_unit: str | None = None):
        self.quantity, self.bare_unit = quantity, bare_unit
        self.name = quantity

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> float:
        """Return the number; InputError names the words, the rule and an example."""
        from pertcalc.units import parse_quantity

        if isinstance(value, float):
            return value  # a default of ours, already in the border unit
        label = self.quantity if param is None else param.opts[0]
        return parse_quantity(self.quantity, value, label, self.bare_unit)


class Method(click.ParamType):
    """A method of this version; completes on the command line."""

    name = "method"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> str:
        """Return the name; UnknownNameError for no method of ours."""
        if value not in METHODS:
            raise UnknownNameError("method", str(value), METHODS)
        return str(value)

    def shell_complete(self, ctx: click.Context, param: click.Parameter, incomplete: str) -> list[CompletionItem]:
        """Names that begin with what is typed."""
        return [CompletionItem(name) for name in METHODS if name.startswith(incomplete)]


class Quantity(click.ParamType):
    """A measured quantity; completes on the command line."""

    name = "quantity"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> str:
        """Return the name; UnknownNameError for no quantity of ours."""
        if value not in QUANTITIES:
            raise UnknownNameError("quantity", str(value), QUANTITIES)
        return str(value)

    def shell_complete(self, ctx: click.Context, param: click.Parameter, incomplete: str) -> list[CompletionItem]:
        """Names that begin with what is typed."""
        return [CompletionItem(name) for name in QUANTITIES if name.startswith(incomplete)]


def result_options(command: Command) -> Command:
    """Add --json, --csv, -o and --force to a command."""
    options = (
        click.option("--json", "as_json", is_flag=True, help="One JSON object instead of text."),
        click.option("--csv", "as_csv", is_flag=True, help="Comma-separated rows instead of text."),
        click.option("-o", "--output", metavar="FILE", help="Write to FILE instead of the terminal."),
        click.option("--force", is_flag=True, help="Replace FILE if it exists."),
    )
    for option in reversed(options):
        command = option(command)
    return command


def rate_options(command: Command) -> Command:
    """Add --method and --curves to a command."""
    command = click.option(
        "--curves", "curve_file", metavar="FILE", help="A curve file (TOML) in place of the default curves."
    )(command)
    return method_option(command)


def method_option(command: Command) -> Command:
    """Add --method to a command."""
    return click.option(
        "--method", type=Method(), default=METHODS[0], show_default=True, help=f"One of {', '.join(METHODS)}."
    )(command)


def one_format(as_json: bool, as_csv: bool) -> None:
    """InputError when both machine formats are asked for."""
    if as_json and as_csv:
        raise InputError("--json and --csv exclude each other; give one of them.")


def checked_gas(gas: str, curve_file: str | None) -> str:
    """A gas's standard spelling; with a curve file any label goes, and the file decides."""
    from pertcalc.species import noble_gas_symbol

    try:
        return noble_gas_symbol(gas)
    except UnknownNameError:
        if curve_file is None:
            raise
        return gas


def check_targets(force: bool, *paths: str | None) -> None:
    """Refuse an output file before the computation, not after it; None is no file."""
    from pertcalc.report.output import check_target

    for path in paths:
        if path is not None:
            check_target(path, force)


class Partial(Protocol):
    """A result that may lack parts: because the user stopped it, or because one of them failed."""

    @property
    def interrupted(self) -> bool: ...
    @property
    def missing(self) -> Mapping[str, str]: ...
    @property
    def error(self) -> PertcalcError | None: ...


def end(found: Partial, failure: PertcalcError | None = None) -> None:
    """Leave with the exit code a delivered result deserves: stopped, a failed check, a part that failed, or none."""
    if found.interrupted:
        raise Shown(f"stopped by the user; not finished: {', '.join(found.missing)}.", INTERRUPTED)
    if failure is not None:
        raise failure
    if found.error is not None:
        raise found.error


def deliver(text: str, output: str | None, force: bool) -> None:
    """Print a result, or write it to the file the user named and say so on stderr."""
    if output is None:
        click.echo(text.rstrip("\n"))
        return
    from pertcalc.report.output import write_atomically

    place = write_atomically(output, text.rstrip("\n") + "\n", force)
    click.echo(f"wrote {place}", err=True)


@contextmanager
def progress_bar(label: str) -> Iterator[Callable[[int, int], None] | None]:
    """A bar on stderr as a ``progress(done, total)`` call; None where stderr is no terminal."""
    if not sys.stderr.isatty():
        yield None
        return
    with click.progressbar(length=1000, label=label, file=sys.stderr) as bar:

        def show(done: int, total: int) -> None:
            bar.update((1000 * done) // max(total, 1) - bar.pos)

        yield show
