"""The exceptions of pertcalc: few, each with its data, its exit code and the next step in its message."""

from __future__ import annotations

from collections.abc import Iterable
from difflib import get_close_matches
from typing import Any


class PertcalcError(Exception):
    """Base of every error a user can cause; ``exit_code`` is what the command line ends with."""

    exit_code = 1

    def __reduce__(self) -> tuple[Any, ...]:
        """Pickle by message and attributes, whatever the arguments were: errors cross process borders."""
        return _rebuilt, (type(self), str(self), self.__dict__)


def _rebuilt(kind: type[PertcalcError], message: str, attributes: dict[str, Any]) -> PertcalcError:
    error = kind.__new__(kind)
    Exception.__init__(error, message)
    error.__dict__.update(attributes)
    return error


class InputError(PertcalcError, ValueError):
    """Arguments that break a rule (words, units, ranges); ``problems`` lists every one of them."""

    exit_code = 2

    def __init__(self, problems: str | Iterable[str]):
        self.problems = (problems,) if isinstance(problems, str) else tuple(problems)
        super().__init__("\n".join(self.problems))


class UnknownNameError(InputError):
    """A name that is not in a closed list; the message offers the nearest ones."""

    def __init__(self, kind: str, name: str, known: Iterable[str]):
        self.kind, self.name, self.known = kind, name, tuple(known)
        near = get_close_matches(name.capitalize(), self.known, n=3, cutoff=0.4) or get_close_matches(
            name, self.known, n=3, cutoff=0.4
        )
        hint = f" Did you mean {' or '.join(near)}?" if near else ""
        super().__init__(f"{kind} {name!r} is not known.{hint} Known: {', '.join(self.known)}.")


class DataFileError(PertcalcError, ValueError):
    """A file that cannot be used; ``problems`` lists every bad field, each 'field = value: rule; next step'."""

    exit_code = 1

    def __init__(self, path: object, problems: str | Iterable[str]):
        self.path = str(path)
        self.problems = (problems,) if isinstance(problems, str) else tuple(problems)
        lines = "\n".join(f"  - {problem}" for problem in self.problems)
        super().__init__(f"{self.path}: {len(self.problems)} problem{'s' * (len(self.problems) > 1)}\n{lines}")


class OutOfRangeError(PertcalcError, ValueError):
    """A condition the data does not cover; carries the name, the value and the covered range."""

    exit_code = 1

    def __init__(self, what: str, value: float, low: float, high: float, unit: str, next_step: str):
        self.what, self.value, self.low, self.high, self.unit = what, value, low, high, unit
        super().__init__(f"{what} = {value:g} {unit} is outside {low:g} .. {high:g} {unit}. {next_step}")


class NotConvergedError(PertcalcError, RuntimeError):
    """A computation that missed its tolerance; carries the best value and its estimated error."""

    exit_code = 3

    def __init__(self, what: str, best: float, estimate: float, wanted: float):
        self.what, self.best, self.estimate, self.wanted = what, best, estimate, wanted
        super().__init__(
            f"{what} did not converge: best {best:.6g}, estimated relative error {estimate:.2g}, wanted {wanted:.2g}."
        )


class PublishedCheckError(PertcalcError):
    """A published value that the program failed to reproduce within its stated tolerance."""

    exit_code = 4
