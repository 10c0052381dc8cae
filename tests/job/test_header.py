"""``header`` of a branch in the job file: read strictly, every fault with its key."""

import pytest

from fieldkit.errors import InputError
from fieldkit.job.schema import parse_job

JOB = """
fieldkit = 1
[pipe]
size = "NPS 1"
schedule = "80"
material = "carbon steel"
[[leg]]
direction = "+y"
length = "18 in"
[[support]]
at = "0 in"
kind = {kind}
"""


def job(kind='"branch"', header=""):
    return parse_job(JOB.format(kind=kind) + (f"header = {header}\n" if header else ""))


def test_a_branch_may_name_its_header():
    support = job(header='{ size = "NPS 8", schedule = "40" }').span.supports[0]
    assert support.header.label == "NPS 8 schedule 40"
    measured = '{ outside_diameter = "219 mm", wall = "8 mm" }'
    assert job(header=measured).span.supports[0].header.wall_m == pytest.approx(8e-3)
    assert job().span.supports[0].header is None


@pytest.mark.parametrize(
    ("kind", "header", "key", "says"),
    [
        ('"anchor"', '{ size = "NPS 8", schedule = "40" }', "header", "stands on no header"),
        ('"branch"', '{ size = "NPS 99", schedule = "40" }', "header.size", "no standard pipe"),
        ('"branch"', '{ size = "NPS 8", schedule = "41" }', "header.schedule", "schedule"),
        ('"branch"', '{ size = "NPS 8" }', "header.schedule", "its wall is missing"),
        ('"branch"', "{ }", "header.size", "its size is missing"),
        ('"branch"', '{ size = "NPS 8", shedule = "40" }', "header.shedule", "not a key"),
        ('"branch"', '{ size = "NPS 1-1/2", schedule = "40" }', "header", "half as wide"),
        ('"branch"', '"NPS 8"', "header", "not a table"),
    ],
)
def test_faults_name_their_key(kind, header, key, says):
    with pytest.raises(InputError) as raised:
        job(kind, header)
    assert raised.value.place.field == f"support[0].{key}"
    assert says in str(raised.value)
