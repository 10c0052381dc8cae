"""``fieldkit sheet``: files where they are asked for, and pages that any browser opens quietly."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
import sys
import zipfile
from functools import cache
from pathlib import Path

import pytest

from fieldkit.cli.samples import sample_jobs
from tests.cli import browser
from tests.cli.running import Ran, fieldkit

JOBS = {path.parent.name: path for path in sample_jobs()}
PAPERS = {"A4": {(595, 842), (596, 842), (595, 841)}, "Letter": {(612, 792)}}
STICKS_OUT = """
<pre id="out"></pre><script>
const wide = document.documentElement.clientWidth;
const out = document.getElementById("out");
const past = e => e.getBoundingClientRect().right > wide + 1 && !e.closest("svg");
const wider = [...document.body.querySelectorAll("*")].filter(past);
out.textContent = "sticking out: " + wider.map(e => e.tagName + e.textContent).join("; ");
</script>
"""


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("sheets")


@pytest.fixture(scope="module")
def sheets(folder: Path):
    """The sheet of a sample with its bundle, written once."""

    @cache
    def written(name: str) -> tuple[Path, Path]:
        page, packed = folder / f"{name}.html", folder / f"{name}.zip"
        ran = fieldkit("sheet", JOBS[name], "-o", page, "--bundle", packed)
        assert ran.status == 0, ran.err
        assert ran.out == f"Written to {page}\nWritten to {packed}\n"
        return page, packed

    return written


@pytest.mark.parametrize("name", JOBS)
def test_a_browser_opens_the_sheet_without_a_word_and_without_a_request(name, sheets):
    page, _ = sheets(name)
    seen = browser.opened(page)
    assert seen.console == ()
    assert seen.asked_for == ()
    free = browser.opened(browser.free_copy(page, "", f"{name}-free.html"))
    assert free.asked_for == ()
    assert seen.dom.count("<section>") == 15
    assert seen.dom.count("<svg") >= 5


def test_the_check_sees_a_page_that_asks_or_complains(sheets, folder):
    page, _ = sheets("glycol-booster")
    asking = '<img src="http://127.0.0.1:9/x.png"><script>console.error("no")</script>'
    blocked = folder / "blocked.html"
    text = page.read_text(encoding="utf-8")
    blocked.write_text(text.replace("</body>", f"{asking}</body>"), encoding="utf-8")
    assert any("Content Security Policy" in line for line in browser.opened(blocked).console)
    free = browser.opened(browser.free_copy(page, asking, "asking.html"))
    assert free.asked_for == ("http://127.0.0.1:9/x.png",)
    assert any('"no"' in line for line in free.console)


@pytest.mark.parametrize("name", JOBS)
@pytest.mark.parametrize("paper", PAPERS)
def test_it_prints_on_a_sensible_number_of_pages(name, paper, sheets, folder):
    page, _ = sheets(name)
    sized = browser.free_copy(page, f"<style>@page {{ size: {paper} }}</style>", f"{name}-p.html")
    pdf = browser.printed(sized, folder / f"{name}-{paper}.pdf")
    assert 8 <= browser.page_count(pdf) <= 16
    assert browser.page_sizes(pdf) <= PAPERS[paper]


@pytest.mark.parametrize("name", JOBS)
def test_nothing_sticks_out_of_a_window_as_wide_as_paper(name, sheets):
    page, _ = sheets(name)
    seen = browser.opened(
        browser.free_copy(page, STICKS_OUT, f"{name}-w.html"), "--window-size=760,900"
    )
    found = re.search(r"sticking out: ([^<]*)</pre>", seen.dom)
    assert found is not None
    assert found[1] == ""


@cache
def detuned(job: Path):
    ran = fieldkit("detune", job, "--json")
    assert ran.status == 0, ran.err
    return ran.document["fixes"]


@pytest.mark.parametrize("name", ["glycol-booster", "small-bore"])
def test_the_answer_of_detune_stands_on_top(name, sheets):
    page, packed = sheets(name)
    with zipfile.ZipFile(packed) as held:
        text = held.read("sheet.md").decode()
        assert held.read("sheet.html") == page.read_bytes()
    best = detuned(JOBS[name])[0]
    top = re.sub(r"\\([!-/:-@\[-`{-~])", r"\1", text.partition("## 2 ")[0])
    assert best["summary"].lower() in top.lower()
    assert best["fails"].lower() in top.lower()
    for mode in best["modes_after"]:
        assert f"{mode['median_hz']:.1f}" in top


def test_brackets_and_the_finer_mesh_are_in_it(sheets):
    page, _ = sheets("small-bore")
    text = page.read_text(encoding="utf-8")
    assert "Brackets that have it" in text
    assert "largest change of a frequency" in text
    assert "sha-256" in text


def copied(folder: Path) -> Path:
    """A small job of its own: nothing recorded, modes typed in."""
    folder.mkdir(exist_ok=True)
    job = folder / "job.toml"
    text = JOBS["glycol-booster"].read_text(encoding="utf-8")
    job.write_text(re.sub(r"\[\[recording\]\].*?(?=\[goal\])", "", text, flags=re.DOTALL))
    return job


def test_left_out_it_goes_beside_the_job_and_over_an_older_sheet_only(tmp_path):
    job = copied(tmp_path)
    first = fieldkit("sheet", job)
    assert first.status == 0, first.err
    page = tmp_path / "job-sheet.html"
    assert page.is_file()
    assert fieldkit("sheet", job).status == 0
    page.write_text("<html>something else</html>", encoding="utf-8")
    refused = fieldkit("sheet", job)
    assert refused.status == 2
    assert "is no sheet; name another file" in refused.err
    assert page.read_text(encoding="utf-8") == "<html>something else</html>"


def test_a_dash_prints_markdown_and_nothing_else(tmp_path):
    ran = fieldkit("sheet", copied(tmp_path), "-o", "-")
    assert ran.status == 0
    assert ran.out.startswith("<!-- fieldkit sheet -->\n\n# Glycol booster, discharge line\n")
    assert [one.name for one in tmp_path.iterdir()] == ["job.toml"]


def test_json_names_the_files(tmp_path):
    ran = fieldkit("sheet", copied(tmp_path), "-o", tmp_path / "a.md", "--json")
    document = ran.document
    assert document["sheet"] == str(tmp_path / "a.md")
    assert document["bundle"] is None
    assert document["simulated"] is False
    assert [text.partition(":")[0] for text in document["missing"]] == ["match"]


def test_what_cannot_be_answered_is_still_written_and_said(tmp_path):
    job = copied(tmp_path)
    text = job.read_text(encoding="utf-8")
    job.write_text(re.sub(r"\[\[excitation\]\].*?\n\n", "", text, flags=re.DOTALL))
    ran = fieldkit("sheet", job)
    assert ran.status == 2
    assert "excitation" in ran.err
    assert "excitation" in (tmp_path / "job-sheet.html").read_text(encoding="utf-8")


def test_a_bundle_with_a_recording_missing_is_refused_before_any_work(tmp_path):
    job = tmp_path / "job.toml"
    shutil.copy(JOBS["glycol-booster"], job)
    ran = fieldkit("sheet", job, "--bundle", tmp_path / "out.zip")
    assert ran.status == 2
    assert "tap-vertical.flac: this recording is missing" in ran.err
    assert [one.name for one in tmp_path.iterdir()] == ["job.toml"]


def test_a_packed_job_gives_the_same_answer(sheets, tmp_path):
    _, packed = sheets("small-bore")
    with zipfile.ZipFile(packed) as held:
        held.extractall(tmp_path)
    assert json.dumps(detuned(JOBS["small-bore"])) == json.dumps(detuned(tmp_path / "job.toml"))


HOSTILE = "<script>alert(1)</script>\\u001b[31m[red]x[/red] `a` | *b* $y$"


def hostile_job(folder: Path) -> Path:
    """Title, names and file names that would steer a page, a text or a terminal."""
    name = "<img src=x onerror=alert(1)>[b]tap.flac"
    shutil.copy(JOBS["glycol-booster"].with_name("tap-vertical.flac"), folder / name)
    text = JOBS["glycol-booster"].read_text(encoding="utf-8")
    text = text.replace("Glycol booster, discharge line", HOSTILE)
    text = text.replace('name = "check valve"', f'name = "{HOSTILE}"')
    text = text.replace('name = "booster pump"', f'name = "{HOSTILE}"')
    head, _, _ = text.partition("[[recording]]")
    entry = f'[[recording]]\nfile = "{name}"\nkind = "tap"\ndirection = "vertical"\nat = "1.95 m"\n'
    goal = text[text.index("[goal]") :]
    job = folder / "job.toml"
    job.write_text(f"{head}{entry}\n{goal}", encoding="utf-8")
    return job


def test_a_hostile_job_is_plain_text_everywhere(tmp_path):
    job = hostile_job(tmp_path)
    shown: list[Ran] = [
        fieldkit("sheet", job, "-o", tmp_path / "s.html"),
        fieldkit("sheet", job, "-o", "-"),
        fieldkit(job),
        fieldkit("detune", job),
        fieldkit("peaks", job),
    ]
    for ran in shown:
        assert ran.status == 0, ran.err
        assert not [c for c in ran.out + ran.err if not c.isprintable() and c != "\n"]
    assert "<script" not in shown[1].out.replace("\\<script", "")
    page = (tmp_path / "s.html").read_text(encoding="utf-8")
    assert "<script" not in page
    assert "<img" not in page
    assert "&lt;script&gt;alert(1)&lt;/script&gt;\\u001b[31m[red]x[/red]" in page
    assert "&lt;img src=x onerror=alert(1)&gt;[b]tap.flac" in page


def test_a_browser_takes_a_hostile_job_for_text(tmp_path):
    browser.browser()
    page = tmp_path / "s.html"
    assert fieldkit("sheet", hostile_job(tmp_path), "-o", page).status == 0
    seen = browser.opened(browser.free_copy(page, "", "free.html"))
    assert seen.console == ()
    assert seen.asked_for == ()
    assert "<script" not in seen.dom
    assert "<img" not in seen.dom


def test_help_has_an_example():
    assert "Example: fieldkit sheet" in fieldkit("sheet", "--help").out


def test_the_libraries_of_the_sheet_are_loaded_by_it_alone():
    code = (
        "import sys; from fieldkit.cli import commands; from fieldkit.sheet import compose, html; "
        "from fieldkit.ui import app; print([m for m in ('matplotlib', 'jinja2') if m in "
        "sys.modules])"
    )
    ran = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert ran.stdout.strip() == "[]"
