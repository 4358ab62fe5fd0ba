"""`python -m flicker`, and the entry point of the installed command."""

from __future__ import annotations


def main() -> None:
    """Run the command line and leave with its exit status."""
    import os

    # many small systems are solved: threads of the linear algebra only wait for each other, before numpy is loaded
    for library in ("OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
        os.environ.setdefault(library, "1")
    from flicker.cli import program

    program(prog_name="flicker")


if __name__ == "__main__":
    main()
