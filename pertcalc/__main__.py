"""``python -m pertcalc``: the command line."""

from __future__ import annotations

from pertcalc.cli import cli


def main() -> None:
    """Run the command line; the name is fixed so that completion and usage lines say ``pertcalc``."""
    cli(prog_name="pertcalc")


if __name__ == "__main__":
    main()
