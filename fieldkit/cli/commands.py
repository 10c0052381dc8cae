"""The commands; ``fieldkit JOB`` opens the app."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Annotated, Any

import typer
from typer.core import TyperGroup

from fieldkit import __version__
from fieldkit.cli import (
    capturing,
    curves,
    how,
    installing,
    mapping,
    output,
    rechecking,
    sheet,
    spacing,
    waterfall,
)

OPEN = "open"

JobFile = Annotated[Path, typer.Argument(metavar="JOB", help="Job file (TOML).")]
AsJson = Annotated[bool, typer.Option("--json", help="Print one JSON document.")]
Channel = Annotated[int, typer.Option(help="Channel to read, counted from 1.", min=1)]
Rate = Annotated[
    float | None,
    typer.Option("--rate", help="Sampling rate in Hz of text files without a time column."),
]

UpTo = Annotated[float, typer.Option(help="Highest frequency modes are looked for, Hz.", min=5.0)]


class _OpensJobs(TyperGroup):
    """A first word that is no command is a job file to open."""

    def parse_args(self, ctx: Any, args: list[str]) -> list[str]:
        """Put ``open`` before a job file, or where nothing is said at all."""
        asked = {"--help", "--version", "--install-completion", "--show-completion"}
        if not args or (args[0] not in self.commands and args[0] not in asked):
            args = [OPEN, *args]
        return super().parse_args(ctx, args)


app = typer.Typer(
    cls=_OpensJobs,
    add_completion=True,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    help="Find why a pipe shakes, and the smallest change that cures it.",
    epilog="Example: fieldkit samples/glycol-booster/job.toml",
)


def run() -> None:
    """Entry point of the program."""
    app(prog_name="fieldkit")


def _version(asked: bool) -> None:
    if asked:
        sys.stdout.write(f"fieldkit {__version__}\n")
        raise typer.Exit


@app.callback()
def main(
    version: Annotated[
        bool, typer.Option("--version", callback=_version, is_eager=True, help="Print the version.")
    ] = False,
) -> None:
    """Find why a pipe shakes, and the smallest change that cures it."""


@app.command(OPEN, epilog="Example: fieldkit samples/glycol-booster/job.toml")
def open_(
    job: Annotated[
        Path | None, typer.Argument(metavar="[JOB]", help="Job file; none opens the start screen.")
    ] = None,
) -> None:
    """Open the app on a job; print its advice where the output is no terminal."""
    if not sys.stdout.isatty() and job is not None:
        _print_advice(job)
        return
    with output.answering(as_json=False):
        if not sys.stdout.isatty():
            output.reject(
                "the app needs a terminal; name a job file to get its advice as text", as_json=False
            )
        from fieldkit.capture.quiet import libraries_kept_quiet
        from fieldkit.ui.app import FieldkitApp

        with libraries_kept_quiet():
            FieldkitApp(job).run()


@app.command(epilog="Example: fieldkit sample my-samples")
def sample(
    folder: Annotated[Path, typer.Argument(metavar="DIR", help="Folder to copy them into.")],
    as_json: AsJson = False,
) -> None:
    """Copy the sample jobs with their recordings into a folder."""
    with output.answering(as_json=as_json):
        from fieldkit.cli.samples import copy_samples

        jobs = copy_samples(folder)
        lines = ["Copied. Open one with", *(f"  fieldkit {job}" for job in jobs)]
        output.answer({"jobs": [str(job) for job in jobs]}, lines, as_json=as_json)


@app.command(epilog="Example: fieldkit peaks tap-1.flac tap-2.flac --json")
def peaks(
    files: Annotated[
        list[Path], typer.Argument(metavar="FILE", help="Tap recordings, or one job file.")
    ],
    as_json: AsJson = False,
    channel: Channel = 1,
    rate: Rate = None,
    up_to: UpTo = 200.0,
    response: Annotated[
        Path | None,
        typer.Option(
            metavar="FILE.csv", help="Write the frequency response of recordings with a hammer."
        ),
    ] = None,
) -> None:
    """Find the taps in recordings, and natural frequencies and damping from them."""
    with output.answering(as_json=as_json):
        from fieldkit import workup
        from fieldkit.cli.response_files import write_responses
        from fieldkit.sheet import documents, responses, tables
        from fieldkit.sheet.origin import marked

        progress = output.progress()
        job = _job_among(files)
        entries = (
            job.recordings_of("tap")
            if job
            else [workup.entry_for(path, "tap", channel, rate) for path in files]
        )
        readings = workup.tap_readings(entries, progress)
        evidence = workup.evidence_from(readings, job, progress, up_to)
        highest_hz = job.goal.up_to_hz if job else up_to
        found = [workup.response_reading(r, evidence, highest_hz) for r in readings]
        inputs = [*files, *(entry.path for entry in entries)]
        written = write_responses(response, found, highest_hz, inputs) if response else {}
        output.clear_progress()
        document = documents.peaks(
            readings, evidence, responses.documents(found, highest_hz, written)
        )
        lines = [
            *tables.peaks(readings, evidence),
            *responses.lines(found, highest_hz, job.units if job else "SI", written),
        ]
        output.answer(*marked(document, lines, entries), as_json=as_json)


@app.command(epilog="Example: fieldkit running samples/glycol-booster/job.toml")
def running(
    files: Annotated[
        list[Path], typer.Argument(metavar="FILE", help="Running recordings, or one job file.")
    ],
    as_json: AsJson = False,
    channel: Channel = 1,
    rate: Rate = None,
    up_to: UpTo = 200.0,
    over_time: waterfall.Asked = False,
) -> None:
    """Read the lines, the level and the natural frequencies of running recordings."""
    with output.answering(as_json=as_json):
        from fieldkit import workup
        from fieldkit.sheet import documents, tables
        from fieldkit.sheet import findings as told
        from fieldkit.sheet.origin import marked
        from fieldkit.workup.diagnosing import diagnosed

        job = _job_among(files)
        entries = (
            job.recordings_of("running")
            if job
            else [workup.entry_for(path, "running", channel, rate) for path in files]
        )
        highest_hz = job.goal.up_to_hz if job else up_to
        if over_time:
            waterfall.answer(entries, job, highest_hz, as_json=as_json)
            return
        progress = output.progress()
        readings = tuple(
            workup.read_running_entry(entry, highest_hz, progress) for entry in entries
        )
        found = diagnosed(job, readings, progress)
        output.clear_progress()
        document = told.with_running(documents.running(readings, job), found)
        lines = [
            *tables.running(readings, job),
            *told.diagnosis_lines(found),
            *told.severity_lines(found.running, job.units if job else "SI"),
        ]
        output.answer(*marked(document, lines, entries), as_json=as_json)


capturing.register(app)


@app.command(epilog="Example: fieldkit span samples/riser/job.toml")
def span(
    job_file: JobFile,
    as_json: AsJson = False,
    spaced: spacing.Asked = False,
    spans: spacing.Spans = spacing.USUAL,
    support: spacing.Kind = None,
) -> None:
    """Compute the modes of the span and compare them with a handbook estimate."""
    with output.answering(as_json=as_json):
        from fieldkit import workup
        from fieldkit.sheet import documents, tables

        progress = output.progress()
        job = _load(job_file)
        if spaced:
            document, lines = spacing.answered(job, progress, spans, support)
            output.clear_progress()
            output.answer(document, lines, as_json=as_json)
            return
        states = workup.state_modes(job, progress)
        weights, notes = workup.at_rest(job)
        output.clear_progress()
        output.answer(
            documents.span(states, weights, notes),
            tables.span(job, states, weights, notes),
            as_json=as_json,
        )


@app.command(epilog="Example: fieldkit match samples/glycol-booster/job.toml")
def match(job_file: JobFile, as_json: AsJson = False) -> None:
    """Fit the unknowns of the span to the tap."""
    with output.answering(as_json=as_json):
        from fieldkit import workup
        from fieldkit.sheet import documents, tables
        from fieldkit.sheet import findings as told
        from fieldkit.sheet.origin import marked
        from fieldkit.workup.findings import findings, with_next_blow

        progress = output.progress()
        job = _load(job_file)
        evidence = workup.measured(job, progress)
        states = workup.state_modes(job, progress)
        found = workup.matching(job, evidence, states, progress)
        further = findings(job, evidence, (), found, None, progress)
        found = with_next_blow(found, further)
        output.clear_progress()
        document = told.with_blows(documents.match(found), further)
        lines = [
            *tables.match(found, job.units),
            *told.blow_lines(further, job.units),
            *told.contradiction_lines(further),
        ]
        output.answer(*marked(document, lines, job.recordings), as_json=as_json)


@app.command(epilog="Example: fieldkit detune samples/glycol-booster/job.toml --json")
def detune(
    job_file: JobFile,
    as_json: AsJson = False,
    number: installing.FixNumber = None,
    reach: installing.Reach = None,
    map_: mapping.MapOption = None,
    holds: mapping.HeldOption = mapping.Held.BOTH,
    curve: curves.CurveOption = None,
) -> None:
    """Rank changes that move every mode out of every excitation band, with what each needs."""
    with output.answering(as_json=as_json):
        from fieldkit import workup
        from fieldkit.sheet import documents, tables
        from fieldkit.sheet import findings as told
        from fieldkit.sheet.order_response import with_amplification
        from fieldkit.sheet.origin import marked

        if map_ is not None:
            mapping.answer(job_file, map_, holds, as_json=as_json)
            return
        reach_m = installing.reach_m(reach)
        work = workup.run(_load(job_file), output.progress())
        output.clear_progress()
        _stop_where_refused(work, as_json=as_json)
        assert work.detuning is not None
        if curve is not None:
            curves.answer(work, number, curve, as_json=as_json)
            return
        matched = work.match.warnings if work.match else ()
        extra = list(dict.fromkeys([*work.warnings, *matched]))
        best = max((one.chance for one in work.detuning.fixes), default=work.detuning.chance_now)
        lines = [
            *told.detune_top(work.findings),
            *tables.detune(work.detuning, work.job.units),
            *told.better_measurement(work.findings, best, work.job.goal.chance),
            *tables.warnings(extra),
        ]
        document = told.with_diagnosis(documents.detune(work.detuning, extra), work.findings)
        document = with_amplification(document, work)
        if as_json or number is not None:
            document, installs = installing.installed(work, document, number, reach_m)
        if number is not None:
            lines = installing.detailed(number, work, installs)
        output.answer(*marked(document, lines, work.job.recordings), as_json=as_json)


sheet.register(app)
rechecking.register(app)
how.register(app)


def _print_advice(job_file: Path) -> None:
    with output.answering(as_json=False):
        from fieldkit import workup
        from fieldkit.sheet import advice

        work = workup.run(_load(job_file), output.progress())
        output.clear_progress()
        output.answer({}, advice.lines(work), as_json=False)
        _stop_where_refused(work, as_json=False)


def _stop_where_refused(work: Any, *, as_json: bool) -> None:
    """Bad input anywhere on the way to the answer, or no answer, ends with its sentence."""
    blocking = [r for r in work.refused if r.step in ("tap", "match", "detune")]
    bad = [r.reason for r in blocking if r.bad_input]
    if bad:
        output.reject(bad[0], as_json=as_json)
    if work.detuning is None:
        reasons = [r.reason for r in blocking] or ["nothing to answer with"]
        output.refuse("; ".join(reasons), as_json=as_json)


def _load(path: Path) -> Any:
    from fieldkit.job.schema import load_job

    return load_job(path)


def _job_among(files: list[Path]) -> Any:
    """The job when the one file named is a job file, else None."""
    if len(files) == 1 and files[0].suffix.lower() == ".toml":
        return _load(files[0])
    return None
