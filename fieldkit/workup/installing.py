"""What is needed to install the changes that a workup offers."""

from __future__ import annotations

from collections.abc import Sequence

from fieldkit.detune.install import Installation, Yard, installations, yard
from fieldkit.detune.verdict import Verdict
from fieldkit.steel.brackets import REACH_M
from fieldkit.workup.chain import Workup


def yard_of(work: Workup) -> Yard:
    """What every installation of one job is worked out from."""
    job = work.job
    return yard(job.span, job.tapped, job.running, work.match, job.excitations, job.goal, job.units)


def installing(
    work: Workup, fixes: Sequence[Verdict], reach_m: float = REACH_M
) -> dict[int, tuple[Installation, ...]]:
    """Installation of each part of some of a workup's fixes, by rank."""
    if not fixes:
        return {}
    stands = yard_of(work)
    return {fix.rank: installations(stands, fix.change, reach_m) for fix in fixes}
