"""Writing a result to a file: never over an existing one unless told so, never half."""

from __future__ import annotations

import os
import tempfile
from contextlib import suppress
from pathlib import Path

from pertcalc.errors import InputError, PertcalcError


def check_target(path: str | Path, force: bool) -> Path:
    """The path of a file that may be written; asked before a long computation.

    Raises
    ------
    InputError
        It is a folder, its folder does not exist or may not be written, or it exists and ``force`` is false.
    """
    place = Path(path)
    folder = place.parent
    if place.is_dir():
        raise InputError(f"output file = {str(place)!r} is a folder; name a file.")
    if not folder.is_dir():
        raise InputError(f"output file = {str(place)!r}: the folder {str(folder)!r} does not exist; make it first.")
    if place.exists() and not force:
        raise InputError(f"output file = {str(place)!r} exists; add --force to replace it, or name another file.")
    if not os.access(folder, os.W_OK):
        raise InputError(f"output file = {str(place)!r}: the folder {str(folder)!r} may not be written to.")
    return place


def write_atomically(path: str | Path, text: str, force: bool = False) -> Path:
    """Write text so that the file is either complete or not there; errors as `check_target`."""
    place = check_target(path, force)
    handle, name = tempfile.mkstemp(dir=place.parent, prefix=f".{place.name}.", suffix=".part")
    try:
        # mkstemp makes a private file; the result gets the rights any new file would have.
        mask = os.umask(0)
        os.umask(mask)
        os.fchmod(handle, 0o666 & ~mask)
        with os.fdopen(handle, "w", encoding="utf-8") as file:
            file.write(text)
        os.replace(name, place)
    except BaseException as problem:
        with suppress(OSError):
            os.unlink(name)
        if isinstance(problem, OSError):
            raise PertcalcError(f"output file = {str(place)!r} cannot be written: {problem.strerror}.") from problem
        raise
    return place
