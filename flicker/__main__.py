"""`python -m flicker`, and the entry point of the installed command."""

from __future__ import annotations


def main() -> None:
    """Run the command line and leave with its exit status."""
    from flicker.cli import program

    program(prog_name="flicker")


if __name__ == "__main__":
    main()
