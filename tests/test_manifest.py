"""The manifest: what its entries come to, and that nothing in it is passed over."""

from __future__ import annotations

import os
import subprocess
import sys
from datetime import date
from fractions import Fraction
from pathlib import Path

import pytest
from cases_format import CASES, read_case

import prover
from prover import cli
from prover.errors import UserError, Where
from prover.gate.manifest import Manifest, find_manifest, read_manifest
from prover.spec import Spec


def read(folder: Path, text: str) -> Manifest:
    path = folder / "subharmonic.toml"
    path.write_text(text, encoding="utf-8")
    return read_manifest(path, cli._manifest_options(), cli._spec_of)


FULL = """\
[defaults]
effort = 30
include = "inc"
fin = "50MHz"

[divider.ping]
files = ["ping.v", "stage.v"]
ratio = 2.5
high = 2
module = "ping"
clock = "clk"
reset = "rst_n=0"
output = "q[1]"
set = { WIDTH = 4, LIMIT = "8'h1f" }
hold = { en = 1 }
define = { FAST = 1, "NAME" = "text" }
include = ["inc", "sub/../more"]
start = "initial"
within = 20
source-duty = "45..55"
effort = 2.5

[divider."by value"]
files = "sample.v"
ratio = "2*(div+1)"
each = ["div=1..15"]
where = "div != 3"

[divider.mean]
files = "modem.v"
ratio = "16/3"
mean = true
"""


def test_every_option_of_check_has_its_place(tmp_path: Path) -> None:
    ping, sample, modem = read(tmp_path, FULL).dividers
    assert ping.files == ("ping.v", "stage.v")
    assert ping.spec == Spec(
        ratio=Fraction(5, 2),
        high=2,
        module="ping",
        clock="clk",
        reset="rst_n=0",
        output="q[1]",
        parameters={"WIDTH": 4, "LIMIT": 31},
        holds={"en": 1},
        defines={"FAST": "1", "NAME": "text"},
        include=("inc", "more"),
        start="initial",
        within=20,
        fin=Fraction(50_000_000),
        source_duty=(Fraction(45), Fraction(55)),
        effort=2.5,
    )
    assert (sample.name, sample.spec.each, sample.spec.effort) == ("by value", {"div": ((1, 15),)}, 30)
    assert sample.spec.ratio_formula is not None
    assert sample.spec.ratio_formula.text == "2*(div+1)"
    assert (modem.spec.ratio, modem.spec.mean) == (Fraction(16, 3), True)


def test_ranges_make_one_entry_many(tmp_path: Path) -> None:
    text = '[divider.tick]\nfiles = "tick.v"\nratio = "N*M"\nset = { N = "2..4", W = 9, M = [1, "3..4"] }\n'
    found = read(tmp_path, text).dividers
    assert [divider.name for divider in found] == [
        *("tick[N=2,M=1]", "tick[N=2,M=3]", "tick[N=2,M=4]", "tick[N=3,M=1]", "tick[N=3,M=3]"),
        *("tick[N=3,M=4]", "tick[N=4,M=1]", "tick[N=4,M=3]", "tick[N=4,M=4]"),
    ]
    assert found[1].spec.parameters == {"W": 9, "N": 2, "M": 3}
    assert {divider.entry for divider in found} == {"tick"}


def test_waivers_have_a_reason_and_a_last_day(tmp_path: Path) -> None:
    text = """\
[defaults.waive.recovery]
reason = "for all"
until = 2027-01-31
[divider.a]
files = "a.v"
ratio = 3
waive.recovery = { reason = " ours ", until = 2026-02-28 }
[divider.b]
files = "b.v"
ratio = 3
"""
    a, b = read(tmp_path, text).dividers
    (ours,), (shared,) = a.waivers, b.waivers
    assert (ours.name, ours.text, ours.where.line) == ("recovery", "ours (until 2026-02-28)", 7)
    assert (shared.name, shared.text, shared.where.line) == ("recovery", "for all (until 2027-01-31)", 1)
    assert [ours.expired(date(2026, 2, day)) for day in (27, 28)] == [False, False]
    assert ours.expired(date(2026, 3, 1))
    assert a.spec.waivers == {}


ENTRY = '[divider.a]\nfiles = "a.v"\nratio = 3\n'


@pytest.mark.parametrize(
    ("text", "line", "message", "hint"),
    [
        ("[divider.a\n", 1, "no TOML", "[divider.NAME]"),
        (ENTRY + ENTRY, 4, "[divider.a] is there twice", "a name of its own"),
        (ENTRY + "ratio = 4\n", 4, "ratio is there twice", "give it once"),
        ("ratio = 3\n" + ENTRY, 1, "ratio stands above all tables", "below [divider.NAME]"),
        ("[divider.a]\nfiles = a.v\n", 2, "no TOML", 'files = "…"'),
        ("[divider.a]\nset = {\n  N = 3 }\n", 2, "no TOML", "on one line"),
        ('[divider.""]\nfiles = "a.v"\nratio = 3\n', 1, "a divider without a name", "[divider.NAME]"),
        ("[[divider]]\nfiles = 'a.v'\n", 1, "a list, where a table is wanted", "[divider.NAME]"),
        ('[divider.a]\nfiles = "a.v', 2, "no TOML", "files = "),
        ("", None, "no divider in it", "[divider.NAME]"),
        ("[divider]\n", None, "no divider in it", "[divider.NAME]"),
        (ENTRY + "ratoi = 3\n", 4, "[divider.a] no key is called 'ratoi'", "did you mean ratio?"),
        (ENTRY + "source_duty = 50\n", 4, "'source_duty'", "did you mean source-duty?"),
        (ENTRY + "\n\nvcd = 'a.vcd'\n", 6, "vcd is no part of a claim", "give --vcd to the command"),
        (ENTRY + "workers = 2\n", 4, "workers is no part of a claim", "give --workers to the command"),
        (ENTRY + "zzz = 2\n", 4, "'zzz'", "there are clock, "),
        ("[dividers.a]\nratio = 3\n", 1, "'dividers'", "did you mean divider?"),
        ("[defaults]\nfiles = 'a.v'\n" + ENTRY, 2, "[defaults] no key is called 'files'", "each divider's own"),
        ('[divider.a]\nfiles = "a.v"\n', 1, "[divider.a] no ratio", "ratio = 3"),
        ("[divider.a]\nratio = 3\n", 1, "[divider.a] no files", 'files = "divider.v"'),
        ("[divider.a]\nratio = 3\nfiles = []\n", 3, "no files", "say which"),
        ("[divider.a]\nratio = 3\nfiles = ''\n", 3, "no files", "say which"),
        ("[divider.a]\nfiles = 'a.v'\nratio = inf\n", 3, "inf, where a number is wanted", "a formula"),
        ("[divider.a]\nratio = 3\nfiles = [1, true]\n", 3, "true or false, where a text", "quotes"),
        ('[divider.a]\nfiles = "a.v"\nratio = "three"\nhigh = 1\n[divider.b]\n', 5, "no files", "say which"),
        ('[divider.a]\nfiles = "a.v"\nratio = 0\n', 3, "ratio 0: ", "positive"),
        ('[divider.a]\nfiles = "a.v"\nratio = [3, 5]\n', 3, "one value, not a list", "write ratio ="),
        ('[divider.a]\nfiles = "a.v"\nratio = 2026-01-01\n', 3, "a date", "quotes"),
        (ENTRY + "high = 6\n", 4, "high time 6", "between 1 and 5"),
        (ENTRY + 'start = "never"\n', 4, "'never' is not one of", ""),
        (ENTRY + "start = { a = 1 }\n", 4, "one value, not a table", "write start ="),
        (ENTRY + 'set = "N=2..5"\n', 4, "'2..5' is not a whole number", 'set = { N = "2..512" }'),
        (ENTRY + 'set = { N = "5..2" }\n', 4, "no range of values", "2..512"),
        (ENTRY + "set = { N = { a = 1 } }\n", 4, "a table, where a text", ""),
        (ENTRY + 'set.N = "2..x"\n', 4, "no range of values", "2..512"),
        (ENTRY + 'set = { N = "1..99999" }\n', 1, "more than 20000 dividers", "narrow"),
        (ENTRY + 'waive = "recovery"\n', 4, "a text, where a table is wanted", ""),
        (ENTRY + '[divider.a.waive]\nduty = { reason = "x", until = 2027-01-31 }\n', 5, "'duty'", "there are enable, "),
        (ENTRY + "[divider.a.waive.recovery]\nuntil = 2027-01-31\n", 4, "without a reason", "say why"),
        (ENTRY + '[divider.a.waive.recovery]\nreason = "x"\n', 4, "without its last day", "until ="),
        (ENTRY + 'waive.ratio = { reason = "x", until = "2027-01-31" }\n', 4, "until is a text", "no quotes"),
        (ENTRY + 'waive.ratio = { reason = "x", until = 2027-01-31T09:00:00Z }\n', 4, "until is a date or", "2027-01-31"),
        (ENTRY + 'waive.ratio = { reason = "x", until = 31.12.2027 }\n', 4, "no TOML", "until = 2027-01-31"),
        (ENTRY + 'waive.ratio = { reason = "x", until = 2027-02-30 }\n', 4, "no TOML", "until = 2027-01-31"),
        (ENTRY + 'waive.ratio = { reason = "x", till = 2027-01-31 }\n', 4, "'till'", "did you mean until?"),
        (ENTRY + "mean = 1\n", 4, "mean is true or false", "mean = true"),
        ('divider = 3\n', 1, "a number, where a table is wanted", ""),
        ('[divider]\na = "a.v"\n', 2, "a text, where a table is wanted", "[divider.a]"),
    ],
)  # fmt: skip
def test_what_is_not_understood_is_told_with_its_line(
    tmp_path: Path, text: str, line: int | None, message: str, hint: str
) -> None:
    with pytest.raises(UserError) as told:
        read(tmp_path, text)
    assert message in told.value.message
    assert hint in told.value.hint
    assert (told.value.where.line if told.value.where else None) == line
    assert "subharmonic.toml" in str(told.value)


def test_a_mark_of_the_encoding_is_passed_over(tmp_path: Path) -> None:
    assert [each.name for each in read(tmp_path, "\ufeff" + ENTRY).dividers] == ["a"]


def test_what_the_sources_show_to_be_wrong_is_told_with_the_line_of_its_option(tmp_path: Path) -> None:
    text = '[defaults]\nhold = { en = 1 }\n[divider.a]\nratio = 3\nfiles = ["x.v", "reset.v"]\noutput = "q"\n'
    (divider,) = read(tmp_path, text).dividers
    for message, line in (
        ("--hold en: a has no such input", 2),
        ("--output q: a has no such output", 6),
        ("reset.v: No such file or directory", 5),
        ("ratio 0: an output period has to be a whole number", 4),
        ("something else", 3),
    ):
        placed = divider.placed(UserError(message, hint="h"))
        assert (placed.where.line if placed.where else 0, placed.message, placed.hint) == (line, message, "h")
    own = UserError("--hold en", Where("x.v", 9))
    assert divider.placed(own) is own


def test_names_that_no_file_can_have_are_told_with_their_line(tmp_path: Path) -> None:
    """The system call takes a name that ends with a null byte; an encoding may lack a character."""
    (tmp_path / "subharmonic.toml").write_text(
        '[divider.a]\nratio = 3\nfiles = "\\u0000.v"\n', encoding="utf-8"
    )
    (tmp_path / "by_name.toml").write_text('[divider.a]\nratio = 3\nfiles = "\u00b5.v"\n', encoding="utf-8")
    ascii_only = {"LC_ALL": "C", "PYTHONUTF8": "0", "PYTHONCOERCECLOCALE": "0"}
    kept = {name: value for name, value in os.environ.items() if name not in ("LANG", "LC_CTYPE")}
    for name, more, told in (
        ("subharmonic.toml", {}, r"error: subharmonic.toml:3: ?.v: no name of a file"),
        ("by_name.toml", ascii_only, "v: file names are in ascii here, which"),
    ):
        done = subprocess.run(
            [sys.executable, "-m", "prover", "gate", name],
            cwd=tmp_path,
            env={**kept, "PYTHONPATH": str(Path(prover.__file__).parents[1]), **more},
            capture_output=True,
            encoding="utf-8",
            check=False,
        )
        assert (done.returncode, done.stderr) == (2, "")
        assert f"error: {name}:3: " in done.stdout
        assert told in done.stdout


def test_properties_of_moving_inputs_can_be_waived(tmp_path: Path) -> None:
    (divider,) = read(tmp_path, ENTRY + 'waive.enable = { reason = "x", until = 2027-01-31 }\n').dividers
    assert [waiver.name for waiver in divider.waivers] == ["enable"]


def test_a_manifest_that_cant_be_read(tmp_path: Path) -> None:
    for data in (b"\xff\xfe", b"a" * 4_000_001, b"a = " + b"[" * 100_000):
        (tmp_path / "subharmonic.toml").write_bytes(data)
        with pytest.raises(UserError, match=r"subharmonic\.toml"):
            read_manifest(tmp_path / "subharmonic.toml", {}, cli._spec_of)
    for name in ("missing.toml", "missing/"):
        with pytest.raises(UserError, match="can't read"):
            read_manifest(tmp_path / name, {}, cli._spec_of)


def test_the_nearest_manifest_is_in_force(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    inner = tmp_path / "a" / "b"
    inner.mkdir(parents=True)
    monkeypatch.chdir(inner)
    with pytest.raises(UserError, match=r"no subharmonic\.toml"):
        find_manifest(Path())
    (tmp_path / "subharmonic.toml").write_text(ENTRY)
    assert find_manifest(Path()) == Path("../../subharmonic.toml")
    (inner / "subharmonic.toml").write_text(ENTRY)
    assert find_manifest(Path()) == Path("subharmonic.toml")
    monkeypatch.chdir(tmp_path)
    found = read_manifest(Path("a/b"), cli._manifest_options(), cli._spec_of)
    assert (found.path, found.folder) == (Path("a/b/subharmonic.toml"), Path("a/b"))


def test_the_manifest_of_the_cases_names_cases_and_sweeps_a_parameter() -> None:
    """One divider with every value of its parameter up to 512, and no entry whose claim its case refutes."""
    path = CASES / "subharmonic.toml"
    swept: dict[str, list[int]] = {}
    for divider in read_manifest(path, cli._manifest_options(), cli._spec_of).dividers:
        (file,) = divider.files
        case = read_case(CASES / file)
        if divider.parameters:
            swept.setdefault(divider.entry, []).append(divider.parameters["N"])
            continue
        stated = [g for g in case.groups if not g.error and cli._spec_of(g.options) == divider.spec]
        assert all("proved" in group.verdicts for group in stated), divider.name
    assert swept == {"flow_by_any_n": list(range(2, 513))}
