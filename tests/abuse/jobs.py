"""Hostile job files: syntax, depth, numbers, sizes, and what may stand in every text."""

from __future__ import annotations

import re
from collections.abc import Iterator
from functools import partial
from pathlib import Path

from tests.abuse.audio import wav
from tests.abuse.case import INPUT, JOB, TAP, Case

SPAN = (("span", INPUT), ("span", INPUT, "--json"))
WORKED = (("match", INPUT), ("detune", INPUT, "--json"), ("sheet", INPUT, "-o", "-"))
TEXTS = {
    "escape": r"\u001b[2J\u001b]0;owned\u0007",
    "c1": r"\u009b31m",
    "markup": "[bold red]x[/]",
    "open markup": "[/][link=javascript:1]",
    "script": "<script>alert(1)</script>",
    "entity": "&lt;&#0;&bogus;",
    "template": "{{ 7 * 7 }}{% for x in y %}",
    "table": "a | b | c",
    "right to left": r"\u202Etxt.exe",
    "null": r"a\u0000b",
    "newlines": r"a\n\n# b\r\n",
    "blank": " ",
    "percent": "%s%n%d{0}",
    "long": "x" * 200,
    "too long": "x" * 201,
    "dollar": "$x_1$ $\\\\frac{1}{0}$",
    "wide": "漢字😀e" + r"\u0301",
    "path": "../../../etc/passwd",
}
TEXT_KEYS = ("title", "name", "file", "kind", "material", "size", "direction")
NUMBERS = (
    "-1",
    "0",
    "1e308",
    "-1e308",
    "nan",
    "inf",
    "9" * 400,
    "0x7f",
    "true",
    "1e-320",
    "2026-01-01",
    '"1e999 m"',
    '"NaN m"',
    '"1 m/0"',
    '"9**9**9 m"',
    '"__import__(1) m"',
    '"1 furlong"',
    '""',
    '"\u0661 m"',
    "[1, 2]",
    "{ a = 1 }",
)
NUMBER_KEYS = ("length", "at", "speed", "frequency")
EXTRA = {
    "no support": ("[[support]]", "[[suport]]"),
    "no legs": ("[[leg]]", "[[legs]]"),
    "key twice": ('title = "Glycol booster"', 'title = "a"\ntitle = "b"'),
    "table twice": ("[contents]", '[pipe]\nsize = "NPS 4"\n[contents]'),
    "future version": ("fieldkit = 1", "fieldkit = 2"),
    "version as text": ("fieldkit = 1", 'fieldkit = "1"'),
    "version huge": ("fieldkit = 1", f"fieldkit = {'1' * 5000}"),
    "no version": ("fieldkit = 1", ""),
    "dotted": ("[contents]", "[a.b.c.d.e]\nf = 1\n[contents]"),
    "unclosed": ('name = "water"', 'name = "water'),
    "legs back and forth": (
        '[[support]]\nat = "0 m"',
        '[[leg]]\ndirection = "-x"\nlength = "4.2 m"\n[[support]]\nat = "0 m"',
    ),
    "no direction": ('direction = "+x"', "direction = [0, 0, 0]"),
    "nan direction": ('direction = "+x"', "direction = [nan, 0, 1]"),
    "microscopic": ("4.2 m", "1e-9 m"),
    "a kilometre": ("4.2 m", "1000 m"),
    "thick wall": ('schedule = "40"', 'wall = "44 mm"'),
    "foil": ('schedule = "40"', 'wall = "1e-9 m"'),
    "unknown size": ("NPS 3", "NPS 1000000"),
    "unknown material": ("carbon steel", "unobtainium"),
    "up to 5 kHz": ("[[measured]]", '[goal]\nup_to = "5000 Hz"\n[[measured]]'),
    "all kept out": ("[[measured]]", '[goal]\nkeep_out = [["0 m", "9 m"]]\n[[measured]]'),
    "hot": ("[[measured]]", '[state.running]\ntemperature = "1200 degC"\n[[measured]]'),
    "below zero": ("[[measured]]", '[state.running]\ntemperature = "-300 degC"\n[[measured]]'),
    "crushed": ("[[measured]]", '[state.running]\npressure = "1e12 Pa"\n[[measured]]'),
}


def _write(text: str | bytes, folder: Path) -> Path:
    """The job, and the tap it may name beside it."""
    (folder / "tap.wav").write_bytes(wav())
    path = folder / "job.toml"
    path.write_bytes(text.encode("utf-8", "surrogatepass") if isinstance(text, str) else text)
    return path


def _with_text(key: str, text: str) -> str:
    whole = JOB + TAP + '\n[[mass]]\nname = "valve"\nat = "2 m"\nmass = "20 kg"\n'
    return re.sub(rf'(?m)^({key}) = ".*"', lambda found: f'{found[1]} = "{text}"', whole)


def _with_number(key: str, value: str) -> str:
    return re.sub(rf'(?m)^{key} = ".*"', lambda _: f"{key} = {value}", JOB)


def _many(table: str, count: int) -> str:
    rows = {
        "support": '[[support]]\nat = "{at:.4f} m"\nkind = "clamp"\n',
        "mass": '[[mass]]\nat = "{at:.4f} m"\nmass = "1 kg"\n',
        "excitation": '[[excitation]]\nname = "e{i}"\nspeed = ["10 rpm", "9000 rpm"]\n',
        "measured": '[[measured]]\nfrequency = "{hz} Hz"\n',
        "leg": '[[leg]]\ndirection = "{way}"\nlength = "1 m"\nbend_radius = "0.1 m"\n',
        "recording": TAP,
    }
    ways = ("+y", "+z", "+x")
    made = [
        rows[table].format(at=4.2 * (i + 0.5) / count, i=i, hz=5 + i, way=ways[i % 3])
        for i in range(count)
    ]
    return JOB + "".join(made)


def _syntax() -> Iterator[tuple[str, str | bytes]]:
    yield "empty", ""
    yield "blank", "\n \n\t\n"
    yield "binary", bytes(range(256)) * 40
    yield "nulls", b"\0" * 4000
    yield "utf-16", JOB.encode("utf-16")
    yield "bom", b"\xef\xbb\xbf" + JOB.encode()
    yield "bad utf-8", JOB.encode().replace(b"Glycol", b"Gl\xff\xfecol")
    yield "carriage returns", JOB.replace("\n", "\r")
    yield "deep arrays", f"a = {'[' * 5000}{']' * 5000}\n"
    yield "deep tables", f"[{'.'.join(['a'] * 20_000)}]\n"
    yield "deep inline", f"a = {'{ a = ' * 3000}1{' }' * 3000}\n"
    yield "open arrays", "a = " + "[" * 100_000
    yield "endless line", JOB + "# " + "x" * 3_000_000
    yield "endless key", "x" * 1_000_000 + " = 1\n"
    yield "a hundred thousand keys", "".join(f"k{i} = 1\n" for i in range(100_000))
    yield "only a number", "12"
    yield "a recording", wav()
    yield "json", '{"fieldkit": 1}'


def cases() -> Iterator[Case]:
    """All of them."""
    for name, text in _syntax():
        yield Case(f"job {name}", partial(_write, text), SPAN)
    for name, (old, new) in EXTRA.items():
        yield Case(f"job {name}", partial(_write, JOB.replace(old, new, 1)), SPAN)
    for key in TEXT_KEYS:
        for name, text in TEXTS.items():
            yield Case(f"{key} {name}", partial(_write, _with_text(key, text)), SPAN[:1])
    for key in NUMBER_KEYS:
        for value in NUMBERS:
            name = f"{key} = {value[:20]}"
            yield Case(name, partial(_write, _with_number(key, value)), SPAN[:1])
    for table in ("support", "mass", "excitation", "measured", "leg", "recording"):
        yield Case(f"201 of {table}", partial(_write, _many(table, 201)), SPAN[:1])
    yield Case("40 supports", partial(_write, _many("support", 38)), SPAN[:1])
    yield Case("40 legs", partial(_write, _many("leg", 40)), SPAN[:1])
    for name in (
        "escape",
        "c1",
        "markup",
        "script",
        "template",
        "table",
        "right to left",
        "dollar",
    ):
        text = _with_text("title|name", TEXTS[name])
        yield Case(f"sheet with {name}", partial(_write, text), WORKED[2:])
    yield Case("worked with a recording", partial(_write, JOB + TAP), WORKED)
