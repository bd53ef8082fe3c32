"""The gate: what it judges, what it keeps, what it takes from the ledger, and how it ends."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from collections.abc import Callable, Iterator, Sequence
from contextlib import closing
from dataclasses import dataclass, field, replace
from datetime import date
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import pytest
from click.testing import CliRunner, Result
from pages import page
from texts import BY_3, RING

import prover
from prover import cli, task
from prover.errors import UserError, Where
from prover.gate.ledger import Kept, Ledger, digest
from prover.gate.manifest import Manifest, Waiver
from prover.gate.runner import Excused, Run
from prover.report.gate import render
from prover.report.look import Look
from prover.task import Answer, Task

ROOT = Path(prover.__file__).parents[1]

# Counts to a parameter; high for the lower half of its counts, an input cycle later.
COUNTER = """\
module counter #(parameter N = 4, parameter WIDTH = 3) (input clk, output reg tick);
  reg [WIDTH-1:0] count;
  always @(posedge clk) begin
    count <= count >= N - 1 ? 0 : count + 1;
    tick <= count < N / 2;
  end
endmodule
"""


# A fifth, high for two input cycles. Count 7 holds itself, and 5 and 6 lead there.
STICKS = """\
module sticks (input clk, input rst, output reg tick);
  reg [2:0] count;
  always @(posedge clk) begin
    if (rst) count <= 3'd0;
    else if (count == 3'd4) count <= 3'd0;
    else if (count != 3'd7) count <= count + 3'd1;
    tick <= count < 3'd2;
  end
endmodule
"""


@dataclass
class Inline:
    """Does tasks here and now, as the processes do them, whose start takes longer than such dividers do."""

    folder: Path
    works: bool = True
    lost_after: int | None = None
    lost_by: BaseException = field(default_factory=lambda: UserError("the cluster is gone"))
    apart: bool = False

    def run(self, tasks: Sequence[Task], tell: Callable[[str], None]) -> Iterator[tuple[int, Answer]]:
        home = os.getcwd()
        for number, asked in enumerate(tasks):
            assert self.works
            if number == self.lost_after:
                raise self.lost_by
            said: list[task.Message] = []
            task._laid_out(Task.from_json(asked.as_json()), str(self.folder), said.append)
            os.chdir(home)
            yield number, task.collected([json.loads(json.dumps(each)) for each in said])


MANIFEST = """\
[divider.third]
files = "third.v"
ratio = 3

[divider.counter]
files = "counter.v"
set = { N = "2,4,6" }
ratio = "N"

[divider.sticks]
files = "sticks.v"
ratio = 5
high = 4
"""
TEXTS = {"third": BY_3, "counter": COUNTER, "sticks": STICKS}


@pytest.fixture
def inline(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Inline:
    """Who does the tasks unless --workers is given."""
    given = cli._crew
    place = tmp_path / "place"
    place.mkdir()
    crew = Inline(place)
    monkeypatch.setattr(cli, "_crew", lambda workers, *rest: given(workers, *rest) if workers else crew)
    return crew


@pytest.fixture
def folder(tmp_path: Path, inline: Inline, monkeypatch: pytest.MonkeyPatch) -> Path:
    made = tmp_path / "made"
    made.mkdir()
    monkeypatch.chdir(made)
    write(made, MANIFEST, **TEXTS)
    return made


def write(folder: Path, manifest: str | None = None, **texts: str) -> None:
    if manifest is not None:
        (folder / "subharmonic.toml").write_text(manifest, encoding="utf-8")
    for name, text in texts.items():
        (folder / f"{name}.v").write_text(text, encoding="utf-8")


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, list(arguments), catch_exceptions=False)


def gate(*options: str) -> tuple[int, dict[str, tuple[str, str]], Any]:
    """Status, each divider's verdict and where it is from, and all that JSON tells."""
    result = run("gate", "--json", "out.json", *options)
    assert "Traceback" not in result.output
    told = json.loads(Path("out.json").read_text())
    found = {each["name"]: (each["verdict"], each["source"]) for each in told["gate"]["dividers"]}
    return result.exit_code, found, told


def table(text: str) -> list[str]:
    """The lines of the table and those below it."""
    lines = text.splitlines()
    last = max((number for number, line in enumerate(lines) if line.startswith("took ")), default=-1)
    return [line for line in lines[last + 1 :] if line]


def taken(name: str) -> tuple[Kept, str, str]:
    """A kept verdict with its report and its certificate, taken out of the ledger."""
    told = json.loads(Path("out.json").read_text())["gate"]["dividers"]
    (key,) = [each["key"] for each in told if each["name"] == name]
    with closing(Ledger(LEDGER)) as ledger:
        kept = ledger.find(key)
        assert kept is not None
        texts = ledger.text(kept, "report"), ledger.text(kept, "certificate")
        ledger.drop([key])
    return kept, *texts


def put(kept: Kept, report: str, certificate: str) -> None:
    with closing(Ledger(LEDGER)) as ledger:
        ledger.keep(replace(kept, certificate=digest(certificate)), report, certificate, None)


LEDGER = Path(".subharmonic/ledger.sqlite")
NEW = {
    "third": ("proved", "new"),
    "counter[N=2]": ("proved", "new"),
    "counter[N=4]": ("proved", "new"),
    "counter[N=6]": ("proved", "new"),
    "sticks": ("refuted", "new"),
}
KEPT = {name: (verdict, "kept") for name, (verdict, _) in NEW.items()}


# -- what is judged and what is kept -----------------------------------------------------------------------


def test_a_second_run_judges_nothing_and_tells_the_same(folder: Path, inline: Inline) -> None:
    status, found, told = gate()
    assert (status, found) == (1, NEW)
    inline.works = False
    status, found, again = gate()
    assert (status, found) == (1, KEPT)
    assert again["reports"] == told["reports"]
    assert [report["verdict"] for report in told["reports"]] == ["proved"] * 4 + ["refuted"]
    lines = table(run("gate").stdout)
    assert [line.split()[:3] for line in lines] == [
        ["PROVED", "third", "kept"],
        ["PROVED", "counter", "kept"],
        ["REFUTED", "sticks", "kept"],
        ["5", "dividers:", "4"],
    ]
    assert "N=2,4,6: 3 dividers" in lines[1]
    assert lines[2].endswith("no-stuck, recovery")
    assert lines[3].startswith("5 dividers: 4 proved, 1 refuted (5 kept, in ")
    # Of a divider that is not proved the whole report is told.
    assert "counterexample to no-stuck" in run("gate").stdout


def test_only_what_changed_is_judged(folder: Path) -> None:
    gate()
    for texts, judged in (
        ({"sticks": STICKS.replace("count != 3'd7", "count != 3'd6")}, ["sticks"]),
        (
            {"counter": COUNTER.replace("count >= N - 1", "count > N - 2")},
            [f"counter[N={n}]" for n in (2, 4, 6)],
        ),
    ):
        write(folder, **texts)
        status, found, _ = gate()
        assert status == 1
        assert sorted(name for name, (_, source) in found.items() if source == "new") == judged
    # And what is as it was before is known still.
    write(folder, **TEXTS)
    assert gate()[1] == KEPT


@pytest.mark.parametrize(
    ("before", "after"),
    [("", "// a comment\n/* another */\n\n"), (";", " ;  // at the end of the line\n"), ("=", " = ")],
)
def test_comments_and_white_space_change_places_and_nothing_else(
    folder: Path, inline: Inline, before: str, after: str
) -> None:
    """What is kept says what a new run says, the time it took aside."""
    write(folder, sticks=STICKS.replace("endmodule", "initial $display(tick);\nendmodule"))
    gate()
    for name in TEXTS:
        path = folder / f"{name}.v"
        text = path.read_text()
        safe = (
            text
            if before == "=" and name != "third"
            else text.replace(before, after)
            if before
            else after + text
        )
        path.write_text(safe.replace("< =", "<=").replace("> =", ">=").replace("=  =", "=="))
    inline.works = False
    kept = gate()
    assert kept[1] == KEPT
    inline.works = True
    afresh = gate("--afresh", "--ledger", "other.sqlite")
    for report in kept[2]["reports"] + afresh[2]["reports"]:
        del report["seconds"]
    assert kept[2]["reports"] == afresh[2]["reports"]


def test_a_file_under_another_name_is_the_same_content(folder: Path, inline: Inline) -> None:
    gate()
    (folder / "third.v").rename(folder / "a third.v")
    write(folder, MANIFEST.replace("third.v", "a third.v"))
    inline.works = False
    _, found, told = gate()
    assert found == KEPT
    assert told["reports"][0]["design"]["files"] == ["a third.v"]


@pytest.mark.parametrize(
    ("old", "new", "judged"),
    [
        ("ratio = 3", "ratio = 3\nwithin = 2", ["third"]),
        ("high = 4", "high = 5", ["sticks"]),
        ('N = "2,4,6"', 'N = "2..4"', ["counter[N=3]"]),
        ("ratio = 3", 'ratio = 3\nfin = "50MHz"', ["third"]),
        ("ratio = 3", "ratio = 3\neffort = 100", []),
        ("ratio = 3", 'ratio = 3\nwaive.recovery = { reason = "x", until = 2099-01-01 }', []),
        ("[divider.third]", "# a comment\n[divider.third]", []),
    ],
)
def test_options_that_decide_are_judged_again(folder: Path, old: str, new: str, judged: list[str]) -> None:
    gate()
    write(folder, MANIFEST.replace(old, new))
    _, found, _ = gate()
    assert [name for name, (_, source) in found.items() if source == "new"] == judged


def test_includes_and_defines_count(folder: Path) -> None:
    (folder / "inc").mkdir()
    (folder / "inc" / "limit.vh").write_text("`define LIMIT 2'd2 // by 3\n")
    write(
        folder,
        '[divider.a]\nfiles = "a.v"\nratio = 3\ninclude = "inc"\n',
        a='`include "limit.vh"\n' + BY_3.replace("count >= 2'd2", "count >= `LIMIT"),
    )
    assert gate()[1] == {"a": ("proved", "new")}
    (folder / "inc" / "limit.vh").write_text("`define LIMIT 2'd2\n")
    assert gate()[1] == {"a": ("proved", "kept")}
    (folder / "inc" / "limit.vh").write_text("`define LIMIT 2'd1\n")
    status, found, _ = gate()
    assert (status, found) == (1, {"a": ("refuted", "new")})


def test_afresh_judges_all_again(folder: Path) -> None:
    gate()
    assert gate("--afresh")[1] == NEW


def test_another_program_judges_all_again(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    gate()
    with monkeypatch.context() as patched:
        patched.setattr("prover.gate.runner.identity", lambda: "0.0.0+other")
        status, found, told = gate()
    # What judged is the program as it is, so nothing is kept for the other one.
    assert (status, set(found.values())) == (2, {("error", "new")})
    assert "this program was changed while the gate was running" in told["errors"][0]["message"]
    monkeypatch.setattr("prover.gate.runner.identity", lambda: "0.0.0+other")
    monkeypatch.setattr("prover.task.identity", lambda: "0.0.0+other")
    assert gate()[1] == NEW


def test_what_was_left_open_is_judged_again_with_more_effort(folder: Path) -> None:
    gate()
    kept, report, certificate = taken("third")
    left = tuple(replace(each, verdict="open") for each in kept.properties)
    put(replace(kept, properties=left, effort=60.0), report, certificate)
    for effort, expected in ((50, ("open", "kept")), (60, ("open", "kept")), (70, ("proved", "new"))):
        write(folder, MANIFEST.replace("ratio = 3", f"ratio = 3\neffort = {effort}"))
        assert gate()[1]["third"] == expected
    write(folder, MANIFEST)
    assert gate()[1] == KEPT


def test_a_manifest_elsewhere_names_files_from_its_own_folder(
    folder: Path, inline: Inline, monkeypatch: pytest.MonkeyPatch
) -> None:
    gate()
    (folder / "deep" / "er").mkdir(parents=True)
    inline.works = False
    for place, manifest, name in (
        ("deep/er", [], "../../third.v"),
        (".", [str(folder / "subharmonic.toml")], "third.v"),
    ):
        monkeypatch.chdir(folder / place)
        _, found, told = gate(*manifest)
        assert found == KEPT
        assert told["reports"][0]["design"]["files"] == [name]


def test_a_source_that_changes_meanwhile_lends_its_verdict_to_nothing(
    folder: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    pack = task.packed

    def changed(asked: Task, content: Any, base: str) -> Any:
        if asked.files == ("third.v",):
            write(folder, third=RING)
        return pack(asked, content, base)

    with monkeypatch.context() as patched:
        patched.setattr("prover.gate.runner.packed", changed)
        status, found, told = gate()
    assert status == 2
    assert found == {**NEW, "third": ("error", "new")}
    assert "changed while the gate was running" in told["errors"][0]["message"]
    write(folder, third=BY_3)
    assert gate()[1] == {**KEPT, "third": ("proved", "new")}


# -- errors, faults and the status -------------------------------------------------------------------------


def test_one_that_cant_be_read_stops_no_other(folder: Path) -> None:
    write(folder, third=BY_3.replace("if (rst)", "if rst"))
    status, found, told = gate()
    assert status == 2
    assert found == {**NEW, "third": ("error", "new")}
    assert (told["errors"][0]["file"], told["errors"][0]["line"]) == ("third.v", 6)
    # Where the file is named is where there is something to be done.
    (folder / "third.v").unlink()
    _, found, told = gate()
    assert found == {**KEPT, "third": ("error", "new")}
    assert (told["errors"][0]["file"], told["errors"][0]["line"]) == ("subharmonic.toml", 2)
    assert "ERROR    third" in run("gate").stdout


def test_what_is_wrong_with_an_option_is_told_with_its_line_in_the_manifest(folder: Path) -> None:
    """Also where only the sources show it, and for which value of a range."""
    write(
        folder,
        MANIFEST.replace('ratio = "N"', 'ratio = "N - 2"').replace("high = 4", 'high = 4\nclock = "ck"'),
    )
    result = run("gate")
    assert result.exit_code == 2
    assert (
        "divider counter[N=2]\nerror: subharmonic.toml:8: ratio 0: an output period has to be a whole number of "
        'half-cycles\n    ratio = "N - 2"\n    ^\n'
    ) in result.stdout
    assert (
        "divider sticks\nerror: subharmonic.toml:14: --clock ck: sticks has no such input\n" in result.stdout
    )


def test_a_crash_and_a_hang_cost_only_themselves_and_are_not_kept(
    folder: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    bad = """
import os, time
from prover import api, task
ask = api.check
def check(files, spec, *rest):
    if files[0] == "third.v":
        os._exit(3)
    if spec.parameters.get("N") == 4:
        time.sleep(1000)
    return ask(files, spec, *rest)
api.check = check
task.main(place)
"""
    with monkeypatch.context() as patched:
        patched.setattr("prover.pool.MAIN", bad)
        hangs = property(lambda task: 2.0 if task.spec.parameters.get("N") == 4 else 300.0)
        patched.setattr(Task, "limit", hangs)
        status, found, _ = gate("--workers", "1")
    assert status == 70
    assert found == {**NEW, "third": ("fault", "new"), "counter[N=4]": ("open", "new")}
    assert gate()[1] == {**KEPT, "third": ("proved", "new"), "counter[N=4]": ("proved", "new")}


def test_an_interrupted_run_says_what_is_kept(folder: Path, inline: Inline) -> None:
    inline.lost_after, inline.lost_by = 2, KeyboardInterrupt()
    result = run("gate")
    assert (result.exit_code, result.stdout) == (130, "")
    assert "interrupted; what was judged by then is kept" in result.stderr
    inline.lost_after = None
    found = gate()[1]
    assert [source for _, source in found.values()] == ["kept", "kept", "new", "new", "new"]


def test_what_is_known_is_told_also_where_whoever_judges_is_lost(folder: Path, inline: Inline) -> None:
    gate()
    write(
        folder, **{name: text.replace("2'd1", "2'b1").replace("3'd1", "3'b1") for name, text in TEXTS.items()}
    )
    inline.lost_after = 1
    result = run("gate", "--json", "out.json")
    assert result.exit_code == 2
    assert result.stderr.startswith("error: the cluster is gone")
    told = json.loads(Path("out.json").read_text())["gate"]["dividers"]
    assert [(each["name"], each["verdict"], each["source"]) for each in told] == [
        ("third", "proved", "new"),
        *((f"counter[N={n}]", "proved", "kept") for n in (2, 4, 6)),
        ("sticks", "open", "new"),
    ]
    # It is no event, and the next run goes on from there.
    assert "OPEN" not in run("history", "sticks.v").stdout
    inline.lost_after = None
    assert gate()[1] == {**KEPT, "sticks": ("refuted", "new")}


@pytest.mark.parametrize(
    ("options", "message"),
    [
        (["missing.toml"], "can't read missing.toml"),
        (["--workers", "0"], "--workers 0"),
        (["--workers", "1", "--wait", "5"], "--wait without --cluster"),
        (["--ledger", ""], "--ledger '' names no file"),
        (["--ledger", "-"], "--ledger '-' names no file"),
        (["--ledger", "."], "is a folder"),
        (["--vcd", "a.vcd"], "several dividers"),
        (["--json", "nowhere/a.json"], "no folder"),
        (["--json", "subharmonic.toml"], "would be overwritten"),
        (["--html", "third.v"], "would be overwritten"),
        (["--ledger", "third.v"], "is no ledger, or one that is damaged"),
        (["--ledger", "/proc/ledger.sqlite"], "can't write the ledger"),
        (["--ledger", "third.v/ledger.sqlite"], "can't write the ledger"),
    ],
)
def test_usage_errors(folder: Path, options: list[str], message: str) -> None:
    result = run("gate", *options)
    assert result.exit_code == 2
    assert message in result.stderr
    assert "\nhint: " in result.stderr
    assert (folder / "third.v").read_text() == BY_3


def test_a_ledger_that_can_be_written_no_longer_ends_with_an_error_after_the_verdicts(
    folder: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """SQLite's word for a full disk, once one verdict is kept."""
    keep = Ledger.keep

    def full(ledger: Ledger, *rest: Any) -> None:
        keep(ledger, *rest)
        ledger._base.execute("PRAGMA max_page_count = 1")

    with monkeypatch.context() as patched:
        patched.setattr(Ledger, "keep", full)
        result = run("gate", "--json", "out.json")
    assert result.exit_code == 2
    assert (
        "error: can't write the ledger .subharmonic/ledger.sqlite: database or disk is full" in result.stderr
    )
    told = json.loads(Path("out.json").read_text())
    assert {each["name"]: (each["verdict"], each["source"]) for each in told["gate"]["dividers"]} == NEW
    sources = sorted(source for _, source in gate()[1].values())
    assert sources[:1] == ["kept"]
    assert sources.count("new") >= 1


# -- certificates ------------------------------------------------------------------------------------------


def test_kept_certificates_are_checked_again(folder: Path) -> None:
    gate()
    rechecked = {name: (verdict, "rechecked") for name, (verdict, _) in NEW.items()}
    assert gate("--recheck")[1] == rechecked
    # Also where the files are not the same to the byte any more.
    write(folder, **{name: f"// more\n{text}" for name, text in TEXTS.items()})
    (folder / "third.v").rename(folder / "moved.v")
    write(folder, MANIFEST.replace("third.v", "moved.v"))
    assert gate("--recheck")[1] == rechecked


def test_a_certificate_that_bears_something_else_is_rejected(folder: Path) -> None:
    """It is altered, or another divider's, with all seals made to fit."""
    gate()
    third, other = taken("third"), taken("counter[N=4]")
    put(*other)
    altered = third[2].replace('"bound": 3', '"bound": 2')
    assert altered != third[2]
    for certificate in (altered, other[2], "{}"):
        put(third[0], third[1], certificate)
        assert gate()[1] == KEPT
        status, found, told = gate("--recheck")
        assert status == 2
        assert found["third"] == ("error", "rechecked")
        assert "its kept certificate is rejected: " in told["errors"][0]["message"]
        assert found["sticks"] == ("refuted", "rechecked")
    # It is dropped, and judged again.
    assert gate()[1] == {**KEPT, "third": ("proved", "new")}


def test_a_kept_verdict_that_the_certificate_does_not_bear_is_rejected(folder: Path) -> None:
    gate()
    kept, report, certificate = taken("sticks")
    better = tuple(replace(each, verdict="proved") for each in kept.properties)
    put(replace(kept, properties=better), report, certificate)
    status, found, told = gate("--recheck")
    assert (status, found["sticks"]) == (2, ("error", "rechecked"))
    assert "no-stuck is kept as proved, and the certificate bears refuted" in told["errors"][0]["message"]


def test_without_a_certificate_recheck_judges_again(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    with monkeypatch.context() as patched:
        patched.setattr(task, "_certify", lambda *rest: None)
        gate()
    assert "no certificate" in table(run("gate").stdout)[0]
    assert gate("--recheck")[1] == NEW
    assert gate("--recheck")[1]["third"] == ("proved", "rechecked")


STEPS = """\
module steps (input clk, input rst, input [1:0] div, output reg tick);
  reg [1:0] left;
  always @(posedge clk or posedge rst)
    if (rst) {left, tick} <= 3'd0;
    else if (left == 0) {left, tick} <= {div, ~tick};
    else left <= left - 2'd1;
endmodule
"""


def test_the_certificate_of_a_claim_for_each_value_is_kept_and_checked_again(folder: Path) -> None:
    write(folder, '[divider.steps]\nfiles = "steps.v"\neach = "div"\nratio = "2*(div+1)"\n', steps=STEPS)
    assert gate()[1] == {"steps": ("proved", "new")}
    _, found, told = gate()
    assert found == {"steps": ("proved", "kept")}
    assert told["gate"]["dividers"][0]["certified"]
    write(folder, steps=f"// more\n{STEPS}")
    assert gate("--recheck")[1] == {"steps": ("proved", "rechecked")}
    # One that is about fewer values does not bear it out.
    kept, report, certificate = taken("steps")
    write(folder, '[divider.steps]\nfiles = "steps.v"\neach = "div=0..2"\nratio = "2*(div+1)"\n')
    gate()
    fewer = taken("steps")[2]
    assert fewer != certificate
    put(kept, report, fewer)
    write(folder, '[divider.steps]\nfiles = "steps.v"\neach = "div"\nratio = "2*(div+1)"\n')
    status, found, told = gate("--recheck")
    assert (status, found) == (2, {"steps": ("error", "rechecked")})
    assert "its kept certificate is rejected: " in told["errors"][0]["message"]


# -- waivers -----------------------------------------------------------------------------------------------

EXCUSED = (
    MANIFEST
    + """
[divider.sticks.waive.no-stuck]
reason = "reset is always given"
until = UNTIL
[divider.sticks.waive.recovery]
reason = "reset is always given"
until = UNTIL
"""
)


def test_a_waiver_excuses_and_every_report_repeats_its_reason(folder: Path) -> None:
    write(folder, EXCUSED.replace("UNTIL", "2999-12-31"))
    status, found, told = gate("--junit", "out.xml", "--sarif", "out.sarif", "--html", "out.html")
    assert (status, found["sticks"]) == (0, ("proved", "new"))
    reason = "reset is always given (until 2999-12-31)"
    waived = [each["waived"] for each in told["reports"][4]["properties"] if each["waived"]]
    assert waived == [reason, reason]
    for name in ("out.xml", "out.sarif", "out.html"):
        assert reason in (folder / name).read_text()
    assert [each["state"] for each in told["gate"]["waivers"]] == ["counts", "counts"]
    lines = table(run("gate").stdout)
    assert "no-stuck waived; recovery waived" in lines[2]
    assert "sticks: no-stuck until 2999-12-31: reset is always given" in lines[3]


def test_an_expired_waiver_fails_the_gate(folder: Path) -> None:
    write(folder, EXCUSED.replace("UNTIL", "2020-02-29"))
    status, found, told = gate()
    assert (status, found["sticks"]) == (1, ("refuted", "new"))
    assert {each["state"] for each in told["gate"]["waivers"]} == {"expired"}
    lines = table(run("gate").stdout)
    assert lines[3].startswith(
        "EXPIRED   subharmonic.toml:15: sticks: no-stuck was waived until 2020-02-29: reset"
    )
    assert "5 dividers: 4 proved, 1 refuted; 2 waivers expired" in lines[-1]


def test_an_expired_waiver_of_something_proved_fails_the_gate_as_well(folder: Path) -> None:
    entry = '[divider.third]\nfiles = "third.v"\nratio = 3\n'
    write(folder, entry + 'waive.recovery = { reason = "old", until = 2020-01-01 }\n')
    status, found, _ = gate("--html", "out.html", "--junit", "out.xml", "--sarif", "out.sarif")
    assert (status, found) == (1, {"third": ("proved", "new")})
    root = page((folder / "out.html").read_text(encoding="utf-8"))
    # The page is no all-clear either.
    assert root.of("overall")[0].text == "error1 proved, but a waiver has expired"
    (told,) = root.get("waivers").all("li")
    assert told.text.startswith(
        "EXPIRED subharmonic.toml:4: third: recovery was waived until 2020-01-01: old"
    )
    suites = ElementTree.parse(folder / "out.xml").getroot()
    assert [(suite.get("name"), suite.get("failures")) for suite in suites] == [
        ("third", "0"),
        ("waivers", "1"),
    ]
    (failure,) = suites.iter("failure")
    assert failure.get("message") == "the waiver expired on 2020-01-01: old"
    log = json.loads((folder / "out.sarif").read_text())["runs"][0]
    (failed,) = (result for result in log["results"] if result["kind"] == "fail")
    assert (failed["ruleId"], failed["level"]) == ("waiver", "error")
    place = failed["locations"][0]["physicalLocation"]
    assert (place["artifactLocation"]["uri"], place["region"]["startLine"]) == ("subharmonic.toml", 4)


def test_a_waiver_of_what_is_proved_by_now_is_told(folder: Path) -> None:
    write(folder, MANIFEST + '[defaults.waive.recovery]\nreason = "old"\nuntil = 2999-01-01\n')
    status, _, told = gate()
    assert status == 1
    # One of every divider is needed as long as one divider needs it.
    assert [(each["divider"], each["state"]) for each in told["gate"]["waivers"]] == [(None, "counts")]
    assert "waived    subharmonic.toml:14: all: recovery until 2999-01-01: old" in table(run("gate").stdout)
    sticks = MANIFEST.index("[divider.sticks]")
    write(folder, MANIFEST[:sticks] + '[defaults.waive.recovery]\nreason = "old"\nuntil = 2999-01-01\n')
    assert (
        "note      subharmonic.toml:10: all: recovery is proved by now: take its waiver out (old)"
        in table(run("gate").stdout)
    )
    write(folder, MANIFEST + '[divider.third.waive.recovery]\nreason = "old"\nuntil = 2999-01-01\n')
    assert (
        "note      subharmonic.toml:14: third: recovery is proved by now: take its waiver out (old)"
        in table(run("gate").stdout)
    )


@pytest.mark.parametrize(
    ("today", "told"),
    [
        (date(2028, 12, 16), "waived    subharmonic.toml:4: third: enable until 2028-12-31: old"),
        (
            date(2028, 12, 17),
            "waived    subharmonic.toml:4: third: enable until 2028-12-31 (14 more days): old",
        ),
        (
            date(2028, 12, 30),
            "waived    subharmonic.toml:4: third: enable until 2028-12-31 (1 more day): old",
        ),
        (date(2028, 12, 31), "(today is the last day): old"),
        (date(2029, 1, 1), "EXPIRED   subharmonic.toml:4: third: enable was waived until 2028-12-31: old"),
    ],
)
def test_the_last_days_of_a_waiver_are_told(tmp_path: Path, today: date, told: str) -> None:
    where = Where("subharmonic.toml", 4)
    waiver = Waiver("enable", "old", date(2028, 12, 31), where)
    days = (waiver.until - today).days
    excused = Excused("third", waiver, "expired" if days < 0 else "counts", days, "")
    manifest = Manifest(tmp_path / "subharmonic.toml", ())
    assert told in render(Run(manifest, (), (excused,), 0.0, None), Look())


def test_a_waiver_of_what_is_not_judged_is_told(folder: Path) -> None:
    """The divider has no input that moves, so that no enable is judged."""
    write(folder, MANIFEST + 'waive.enable = { reason = "old", until = 2999-01-01 }\n')
    assert "note      subharmonic.toml:14: sticks: enable is not judged: take its waiver out (old)" in table(
        run("gate").stdout
    )


# -- reports on all ----------------------------------------------------------------------------------------


def test_every_form_of_report_is_made_of_kept_verdicts_too(folder: Path, inline: Inline) -> None:
    (folder / "new").mkdir()
    (folder / "kept").mkdir()
    made = {}
    for place in ("new", "kept"):
        paths = [f"--{form}={place}/out.{form}" for form in ("junit", "sarif", "html")]
        assert run("gate", *paths, "--vcd", place).exit_code == 1
        inline.works = False
        made[place] = sorted(os.listdir(folder / place))
        suites = ElementTree.parse(folder / place / "out.junit").getroot()
        assert [suite.attrib["name"] for suite in suites] == list(NEW)
        made[f"{place} log"] = json.loads((folder / place / "out.sarif").read_text())["runs"][0]["results"]
    assert made["new"] == made["kept"]
    assert made["new log"] == made["kept log"]
    assert "sticks-no-stuck.vcd" in made["new"]


def test_one_result_on_standard_output(folder: Path) -> None:
    result = run("gate", "--json", "-")
    assert json.loads(result.stdout)["schema"] == "subharmonic/reports-1"


def test_names_are_shown_harmlessly(folder: Path) -> None:
    write(folder, '[divider."\\u001b[31mred"]\nfiles = "third.v"\nratio = 3\n')
    result = run("gate")
    assert result.exit_code == 0
    assert "\x1b" not in result.output
    assert "\\x1b[31mred" in result.output


# -- history -----------------------------------------------------------------------------------------------


def test_history_tells_what_changed(folder: Path) -> None:
    gate()
    gate()
    write(folder, sticks=STICKS.replace("else if (count != 3'd7) ", "else "))
    gate()
    write(folder, MANIFEST.replace("high = 4", "high = 5"))
    gate()
    for until in ("2999-12-31", "2998-12-31", "2020-02-29"):
        write(folder, EXCUSED.replace("UNTIL", until), **TEXTS)
        gate()
    lines = run("history", "sticks.v").stdout.splitlines()
    assert lines[0].split() == ["UTC", "verdict", "divider", "content", "what", "changed"]
    told = [line.split(maxsplit=5)[2:] for line in lines[1:]]
    assert [(verdict, name) for verdict, name, *_ in told] == [
        *(("REFUTED", "sticks"), ("PROVED", "sticks"), ("REFUTED", "sticks"), ("PROVED", "sticks")),
        *(("PROVED", "sticks"), ("REFUTED", "sticks")),
    ]
    assert [changed for *_, changed in told] == [
        "first seen; no-stuck, recovery",
        "sources",
        "high 4 -> 5; high-time, recovery, reset",
        "sources, high 5 -> 4, a waiver of no-stuck, a waiver of recovery",
        "another waiver of no-stuck, another waiver of recovery",
        "no waiver of no-stuck, no waiver of recovery; no-stuck, recovery",
    ]
    contents = [content for _, _, content, _ in told]
    assert contents[0] == contents[3]
    assert contents[1] == contents[2] != contents[0]
    (line,) = run("history", str(folder / "counter.v")).stdout.splitlines()[1:]
    assert "counter[N=2] and 2 more" in line


def test_history_from_elsewhere(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    gate()
    told = run("history", "third.v").stdout
    (folder / "deeper").mkdir()
    for place, file in (("deeper", "../third.v"), ("..", "made/third.v")):
        monkeypatch.chdir(folder / place)
        assert run("history", file).stdout == told


def test_history_goes_on_when_a_file_has_another_name(folder: Path) -> None:
    gate()
    (folder / "third.v").rename(folder / "moved.v")
    write(folder, MANIFEST.replace("third.v", "moved.v"))
    gate()
    for name in ("third.v", "moved.v"):
        lines = run("history", name).stdout.splitlines()[1:]
        assert [line.split(maxsplit=5)[5] for line in lines] == ["first seen", "names of files"]


def test_history_of_what_is_not_known(folder: Path) -> None:
    assert "there is no ledger" in run("history", "third.v").stderr
    gate()
    result = run("history", "other.v")
    assert (result.exit_code, result.stdout) == (2, "")
    assert "has nothing on other.v" in result.stderr


def test_the_folder_of_the_ledger_is_for_no_repository(folder: Path) -> None:
    gate()
    assert sorted(os.listdir(folder / ".subharmonic")) == [".gitignore", "ledger.sqlite"]
    assert (folder / ".subharmonic" / ".gitignore").read_text() == "*\n"


# -- two at once, one of them killed -----------------------------------------------------------------------


KILLED = """
import os, random, signal, sys, time, traceback
from pathlib import Path
import numpy, z3
from prover import analyse, api, cli, recheck
from prover.gate import opened, read, run_gate
from prover.report import certificate
from test_gate import Inline

def once():
    manifest = read(None, cli._manifest_options(), cli._spec_of)
    place = Path(f"place{os.getpid()}").resolve()
    place.mkdir(exist_ok=True)
    run_gate(manifest, opened(manifest, None), Inline(place), afresh=True)

def forked(work):
    process = os.fork()
    if process == 0:
        status = 1
        try:
            work()
            status = 0
        except BaseException:
            traceback.print_exc()
        finally:
            os._exit(status)
    return process

def until_told():
    while not Path("stop").exists():
        once()

draw = random.Random(7)
beside = forked(until_told)
for _ in range(50):
    victim = forked(once)
    time.sleep(draw.uniform(0.0, 0.35))
    os.kill(victim, signal.SIGKILL)
    os.waitpid(victim, 0)
Path("stop").touch()
sys.exit(os.waitstatus_to_exitcode(os.waitpid(beside, 0)[1]))
"""


def test_gates_killed_at_fifty_random_moments_beside_another(folder: Path) -> None:
    """No verdict is lost or false, no lock is left, and the next run completes."""
    paths = os.pathsep.join([str(ROOT), str(ROOT / "tests")])
    done = subprocess.run(
        [sys.executable, "-c", KILLED],
        env={**os.environ, "PYTHONPATH": paths},
        cwd=folder,
        capture_output=True,
        text=True,
        check=False,
    )
    assert (done.returncode, done.stderr[-2000:]) == (0, "")
    assert gate()[1] == KEPT
    with closing(Ledger(LEDGER)) as ledger:
        assert ledger._base.execute("PRAGMA integrity_check").fetchone() == ("ok",)
        told = [(event.divider, event.verdict) for event in ledger.history()]
    # Each divider once: no run found anything else than the one before.
    assert sorted(told) == sorted((name, verdict) for name, (verdict, _) in NEW.items())
    assert [file.name for file in LEDGER.parent.glob("ledger*")] == ["ledger.sqlite"]
