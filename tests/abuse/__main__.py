"""Hostile inputs through every command: ``python -m tests.abuse --seed 1``.

Prints what failed and one line of counts; exit status 1 where anything failed. The inputs are made
by this package; the seed is that of the mutated ones, and of which also run as programs.
"""

from __future__ import annotations

import argparse
import random
import sys
from collections.abc import Iterator

from tests.abuse import audio, columns, jobs, mutations, places
from tests.abuse.case import Case
from tests.abuse.trial import Tally, tried


def corpus(seed: int, mutated: int) -> Iterator[Case]:
    """Every case of every kind."""
    yield from audio.cases()
    yield from columns.cases()
    yield from jobs.cases()
    yield from places.cases()
    yield from mutations.cases(seed, mutated)


def told(failure: str) -> None:
    """At once, so that a run that is stopped has told what it found."""
    sys.stdout.write(failure)
    sys.stdout.flush()


def main() -> None:
    """Run them."""
    asked = argparse.ArgumentParser(description=__doc__)
    asked.add_argument("--seed", type=int, default=1)
    asked.add_argument("--mutated", type=int, default=60, help="of each of three kinds")
    asked.add_argument("--alone", type=int, default=25, help="that also run as programs")
    asked.add_argument("--only", default="", help="part of the names of those to run")
    options = asked.parse_args()
    cases = [case for case in corpus(options.seed, options.mutated) if options.only in case.name]
    tally = tried(cases, Tally(tell=told))
    some = random.Random(options.seed).sample(cases, min(options.alone, len(cases)))
    programs = tried(some, Tally(tell=told), alone=True)
    sys.stdout.write(f"in one process: {tally.line()}\n")
    sys.stdout.write(f"as programs: {programs.line()}\n")
    sys.exit(int(bool(tally.failures or programs.failures)))


if __name__ == "__main__":
    main()
