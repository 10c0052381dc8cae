"""Start of the program."""

from __future__ import annotations

import os

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")  # before numpy: small matrices want one thread
os.environ.setdefault("OMP_NUM_THREADS", "1")


def main() -> None:
    """Run the command line."""
    from fieldkit.cli.commands import run

    run()


if __name__ == "__main__":
    main()
