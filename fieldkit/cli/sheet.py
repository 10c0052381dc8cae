"""``fieldkit sheet JOB``: the report that another engineer can check, and the bundle."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Annotated, Any

import typer

from fieldkit.cli import output
from fieldkit.sheet.plain import clean

JobFile = Annotated[Path, typer.Argument(metavar="JOB", help="Job file (TOML).")]
Out = Annotated[
    Path | None,
    typer.Option(
        "--output", "-o", metavar="FILE",
        help="Where to write it, .html or .md; - prints Markdown. "
        "[default: JOB-sheet.html beside the job]",
    ),
]  # fmt: skip
Bundle = Annotated[
    Path | None,
    typer.Option(
        metavar="FILE.zip", help="Pack job, recordings and sheet into one file for the office."
    ),
]
AsJson = Annotated[bool, typer.Option("--json", help="Print one JSON document.")]


def register(app: typer.Typer) -> None:
    """Add the command."""
    app.command(epilog="Example: fieldkit sheet samples/glycol-booster/job.toml -o booster.html")(
        sheet
    )


def sheet(
    job_file: JobFile, out: Out = None, bundle: Bundle = None, as_json: AsJson = False
) -> None:
    """Write everything another engineer needs to check the answer, as one HTML or Markdown file."""
    with output.answering(as_json=as_json):
        from fieldkit import workup
        from fieldkit.job.schema import load_job
        from fieldkit.sheet.basis import basis_of
        from fieldkit.sheet.bundle import check_bundle, write_bundle
        from fieldkit.sheet.compose import sheet as composed
        from fieldkit.sheet.markdown import markdown
        from fieldkit.sheet.writing import check_target, usual_path, write_sheet

        job = load_job(job_file)
        printed = out is not None and str(out) == "-"
        target = None if printed else out or usual_path(job)
        if target is not None:
            check_target(target)
        if bundle is not None:
            check_bundle(job, bundle)
        progress = output.progress()
        work = workup.run(job, progress)
        document = composed(work, basis_of(job), progress)
        output.clear_progress()
        if target is not None:
            write_sheet(document, target)
        if bundle is not None:
            write_bundle(job, document, bundle)
        if printed and not as_json:
            sys.stdout.write(markdown(document))
        else:
            _tell(work, target, bundle, as_json=as_json)
        _stop_where_refused(work)


def _tell(work: Any, target: Path | None, bundle: Path | None, *, as_json: bool) -> None:
    """Where it was written, and what could not be answered."""
    files = [path for path in (target, bundle) if path is not None]
    document = {
        "sheet": str(target) if target else None,
        "bundle": str(bundle) if bundle else None,
        "missing": [f"{refusal.step}: {refusal.reason}" for refusal in work.refused],
        "simulated": bool(work.simulated),
    }
    output.answer(document, [f"Written to {clean(str(p))}" for p in files], as_json=as_json)


def _stop_where_refused(work: Any) -> None:
    """Written all the same, with what is missing and why; the status says that it is not whole."""
    blocking = [r for r in work.refused if r.step in ("tap", "match", "detune")]
    bad = [r.reason for r in blocking if r.bad_input]
    if bad:
        output.reject(bad[0], as_json=False)
    if work.detuning is None:
        output.unanswered("; ".join(r.reason for r in blocking) or "nothing to answer with")
