"""The command line: what it exits with, where results go, and that nothing else happens."""

from __future__ import annotations

import json
import os
import stat
import subprocess
import sys
import threading
import time
from fractions import Fraction
from pathlib import Path

import pytest
from click.testing import CliRunner, Result
from texts import BY_3, RING, SECOND, SPINS, STICKS_AT_7, written

import prover
from prover import cli, output
from prover.errors import InternalError, UserError, Where

ESCAPE = "\x1b[31m"


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, list(arguments), catch_exceptions=False)


def python(*arguments: str) -> subprocess.CompletedProcess[str]:
    root = str(Path(prover.__file__).parents[1])
    environment = {**os.environ, "PYTHONPATH": root}
    return subprocess.run(
        [sys.executable, *arguments], capture_output=True, text=True, check=False, env=environment
    )


# -- exit status -------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "options", "status"),
    [
        (BY_3, ["--ratio", "3"], 0),
        (BY_3, ["--ratio", "3", "--high", "2"], 1),
        (BY_3, ["--ratio", "5"], 1),
        (STICKS_AT_7, ["--ratio", "5", "--high", "4"], 1),
        (SPINS, ["--ratio", "2"], 1),
    ],
)
def test_the_verdict_is_the_exit_status(tmp_path: Path, text: str, options: list[str], status: int) -> None:
    assert run("check", written(tmp_path, text), *options).exit_code == status


LONG = 10**22 + Fraction(1, 2)
"""A ratio whose period is no machine word, and that no float is."""

# A sixth, counted in a word of 80 bits, which is negative from a count of 8 on.
IN_80_BITS = """\
module by_6 (input clk, input rst, output reg tick);
  reg [3:0] count;
  wire [79:0] place = {count, 76'd0} + 80'd1;
  wire signed [79:0] shifted = $signed(place) >>> 3;
  always @(posedge clk)
    if (rst) {count, tick} <= 5'd0;
    else begin
      count <= place[79:76] >= 4'd5 || shifted < -80'sd5 ? 4'd0 : place[79:76] + 4'd1;
      tick <= count < 4'd3;
    end
endmodule
"""


def test_claims_beyond_a_machine_word_are_judged_and_certified(tmp_path: Path) -> None:
    source, certificate = written(tmp_path, BY_3), tmp_path / "c.json"
    result = run(
        "check", source, "--ratio", "10_000_000_000_000_000_000_000.5", "--high", "3", "--json", "-",
        "--certificate", str(certificate),
    )  # fmt: skip
    assert result.exit_code == 1
    told = json.loads(result.stdout)["spec"]
    assert (Fraction(told["ratio"]), told["period_half_cycles"]) == (LONG, 2 * LONG)
    assert run("recheck", str(certificate)).exit_code == 0


def test_lengths_beyond_a_machine_word_are_judged_while_inputs_move(tmp_path: Path) -> None:
    text = BY_3.replace("input rst", "input rst, input [1:0] div").replace(">= 2'd2", ">= div")
    result = run(
        "check",
        written(tmp_path, text),
        "--ratio",
        f"{10**22}*(div+1)",
        "--moving",
        "div=1..2",
        "--effort",
        "5",
    )
    assert (result.exit_code, result.stderr) == (1, "")
    assert "REFUTED   ratio-change" in result.stdout


def test_words_of_more_than_64_bits(tmp_path: Path) -> None:
    source = written(tmp_path, IN_80_BITS)
    assert run("check", source, "--ratio", "6").exit_code == 0
    assert run("check", source, "--ratio", "8").exit_code == 1


@pytest.mark.parametrize("command", ["check", "several", "compare", "gate"])
def test_verdicts_are_told_also_where_a_result_cant_be_written(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, command: str
) -> None:
    """No file can be made in a system's folder of processes; the text names no wave that was not written."""
    monkeypatch.chdir(tmp_path)
    Path("a.v").write_text(BY_3)
    Path("b.v").write_text(BY_3.replace("by_3", "other").replace("2'd2", "2'd1"))
    Path("subharmonic.toml").write_text('[divider.b]\nfiles = "b.v"\nratio = 3\n')
    asked = {
        "check": ["check", "b.v", "--ratio", "3", "--vcd", "b.vcd"],
        "several": ["check", "a.v", "b.v", "--ratio", "3", "--vcd", "./"],
        "compare": ["compare", "a.v", "b.v", "--vcd", "b.vcd"],
        "gate": ["gate", "--vcd", "./"],
    }[command]
    result = run(*asked, "--html", "/proc/out.html")
    assert result.exit_code == 2
    assert "REFUTED" in result.stdout
    assert ".vcd" not in result.stdout
    assert result.stderr.startswith("error: can't write /proc/out.html")
    assert not list(tmp_path.glob("*.vcd"))


def test_too_little_effort_is_open(tmp_path: Path) -> None:
    result = run("check", written(tmp_path, BY_3), "--ratio", "3", "--effort", "1e-9")
    assert result.exit_code == 3
    assert "PROVED" not in result.output


def test_a_waived_refutation_does_not_count_and_is_told(tmp_path: Path) -> None:
    reason = "reset is always applied"
    waivers = [
        "--waive",
        f"no-stuck={reason}",
        "--waive",
        f"recovery={reason}",
        "--waive",
        "glitch-free=an enable",
    ]
    result = run("check", written(tmp_path, STICKS_AT_7), "--ratio", "5", "--high", "4", *waivers)
    assert result.exit_code == 0
    assert result.output.count("reset is always applied") == 2
    assert "verdict  PROVED (3 waived)" in result.output


@pytest.mark.parametrize(("text", "status"), [(BY_3, 0), (RING, 0), (SPINS, 1)])
def test_measure(tmp_path: Path, text: str, status: int) -> None:
    assert run("measure", written(tmp_path, text)).exit_code == status


@pytest.mark.parametrize(
    "options",
    [
        [],
        ["--ratio", "0"],
        ["--ratio", "-3"],
        ["--ratio", "three"],
        ["--ratio", "1e999999999"],
        ["--ratio", "2.3"],
        ["--ratio", "2.5"],
        ["--ratio", "3", "--high", "6"],
        ["--ratio", "3", "--high", "2.5"],
        ["--ratio", "3", "--high", "9" * 5000],
        ["--ratio", "3", "--within", "-1"],
        ["--ratio", "3", "--clock", "oscillator"],
        ["--ratio", "3", "--reset", "rst=2"],
        ["--ratio", "3", "--output", "tock"],
        ["--ratio", "3", "--module", "by_4"],
        ["--ratio", "3", "--set", "DEPTH=4"],
        ["--ratio", "3", "--set", "DEPTH"],
        ["--ratio", "3", "--hold", "rst=4"],
        ["--ratio", "3", "--hold", "rst=0", "--hold", "rst=0"],
        ["--ratio", "3", "--start", "never"],
        ["--ratio", "3", "--start", "initial"],
        ["--ratio", "3", "--waive", "ratio"],
        ["--ratio", "3", "--waive", "ratio="],
        ["--ratio", "3", "--waive", "duty=because"],
        ["--ratio", "3", "--fin", "fast"],
        ["--ratio", "3", "--fin", "1e999999999"],
        ["--ratio", "3", "--source-duty", "55..45"],
        ["--ratio", "3", "--source-duty", "1e-999999999"],
        ["--ratio", "3", "--effort", "0"],
        ["--ratio", "3", "--effort", "inf"],
        ["--ratio", "3", "--effort", "nan"],
        ["--ratio", "3", "--certify", "x"],
    ],
)
def test_nonsense_options_end_with_2_and_a_hint(tmp_path: Path, options: list[str]) -> None:
    result = run("check", written(tmp_path, BY_3), *options)
    assert result.exit_code == 2
    assert result.stdout == ""
    assert result.stderr.startswith("error: ")
    assert "\nhint: " in result.stderr
    assert os.listdir(tmp_path) == ["divider.v"]


def test_a_syntax_error_is_told_with_its_line(tmp_path: Path) -> None:
    path = written(tmp_path, BY_3.replace("if (rst)", "if rst"))
    result = run("check", path, "--ratio", "3", "--json", str(tmp_path / "out.json"))
    assert result.exit_code == 2
    assert f"{path}:6: " in result.stderr
    assert os.listdir(tmp_path) == ["divider.v"]


def test_a_fault_of_ours_says_so_without_a_traceback(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def fail(*_: object, **__: object) -> None:
        raise InternalError("the search is at odds with its certificate")

    monkeypatch.setattr("prover.api.check", fail)
    result = run("check", written(tmp_path, BY_3), "--ratio", "3")
    assert result.exit_code == 70
    assert "fault of this program" in result.stderr
    assert "at odds with its certificate" in result.stderr
    assert "Traceback" not in result.stderr
    monkeypatch.setenv("SUBHARMONIC_TRACEBACK", "1")
    with pytest.raises(InternalError):
        run("check", written(tmp_path, BY_3), "--ratio", "3")


# -- help --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("command", [[], *([name] for name in cli.main.commands)])
def test_help_fits_a_screen_and_shows_an_example(command: list[str]) -> None:
    result = run(*command, "--help")
    assert result.exit_code == 0
    lines = result.stdout.splitlines()
    assert len(lines) <= 40
    assert max(map(len, lines)) <= 80
    assert "Example" in result.stdout


def test_help_imports_nothing_heavy() -> None:
    code = (
        "import sys\n"
        "from prover.cli import main\n"
        "try:\n    main(['check', '--help'])\nexcept SystemExit:\n    pass\n"
        "heavy = {'z3', 'numpy', 'rich', 'pyverilog', 'vcd', 'ply'} & set(sys.modules)\n"
        "print('heavy:', sorted(heavy))\n"
    )
    done = python("-c", code)
    assert done.returncode == 0, done.stderr
    assert done.stdout.splitlines()[-1] == "heavy: []"


def test_runs_as_a_module() -> None:
    done = python("-m", "prover", "--version")
    assert (done.returncode, done.stdout) == (0, f"subharmonic {prover.__version__}\n")


def test_a_whole_run_as_a_module(tmp_path: Path) -> None:
    done = python("-m", "prover", "check", written(tmp_path, BY_3), "--ratio", "3")
    assert done.returncode == 0, done.stderr
    assert done.stderr == ""
    assert "verdict  PROVED" in done.stdout


# -- results -----------------------------------------------------------------------------------------------


def test_json_on_standard_output_is_all_of_it(tmp_path: Path) -> None:
    result = run("check", written(tmp_path, BY_3), "--ratio", "3", "--json", "-")
    assert json.loads(result.stdout)["verdict"] == "proved"
    assert result.stderr == ""


def test_files_are_written_and_nothing_else(tmp_path: Path) -> None:
    path = written(tmp_path, STICKS_AT_7)
    options = ["--json", str(tmp_path / "report.json"), "--vcd", str(tmp_path / "broken.vcd")]
    result = run("check", path, "--ratio", "5", "--high", "4", *options)
    assert result.exit_code == 1
    # no-stuck, recovery and glitch-free are refuted: the first takes the path, the others are named after theirs.
    expected = ["broken-glitch-free.vcd", "broken-recovery.vcd", "broken.vcd", "divider.v", "report.json"]
    assert sorted(os.listdir(tmp_path)) == expected
    assert f"trace written to {tmp_path / 'broken.vcd'}" in result.stdout
    assert json.loads((tmp_path / "report.json").read_text())["verdict"] == "refuted"


def test_a_folder_takes_one_wave_for_each_refuted_property(tmp_path: Path) -> None:
    folder = tmp_path / "waves"
    folder.mkdir()
    run("check", written(tmp_path, STICKS_AT_7), "--ratio", "5", "--high", "4", "--vcd", str(folder))
    assert sorted(os.listdir(folder)) == ["glitch-free.vcd", "no-stuck.vcd", "recovery.vcd"]


def test_a_proof_writes_no_wave(tmp_path: Path) -> None:
    run("check", written(tmp_path, BY_3), "--ratio", "3", "--vcd", str(tmp_path / "broken.vcd"))
    assert os.listdir(tmp_path) == ["divider.v"]


@pytest.mark.parametrize(
    "target", ["missing/report.json", ".", "divider.v"], ids=["no folder", "a folder", "the source"]
)
def test_a_result_that_has_no_place_is_refused(tmp_path: Path, target: str) -> None:
    path = written(tmp_path, BY_3)
    result = run("check", path, "--ratio", "3", "--json", str(tmp_path / target))
    assert result.exit_code == 2
    assert "hint: " in result.stderr
    assert os.listdir(tmp_path) == ["divider.v"]
    assert Path(path).read_text() == BY_3


def test_two_results_in_one_place_are_refused(tmp_path: Path) -> None:
    path = written(tmp_path, BY_3)
    for place in ("-", str(tmp_path / "out")):
        assert run("check", path, "--ratio", "3", "--json", place, "--vcd", place).exit_code == 2
    assert os.listdir(tmp_path) == ["divider.v"]


def test_when_one_result_cannot_be_written_none_is(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    replace = os.replace

    def fail_on_waves(source: str, target: str) -> None:
        if target.endswith(".vcd"):
            raise OSError(28, "No space left on device")
        replace(source, target)

    monkeypatch.setattr(os, "replace", fail_on_waves)
    options = ["--json", str(tmp_path / "report.json"), "--vcd", str(tmp_path / "broken.vcd")]
    result = run("check", written(tmp_path, STICKS_AT_7), "--ratio", "5", "--high", "4", *options)
    assert result.exit_code == 2
    assert "No space left" in result.stderr
    assert os.listdir(tmp_path) == ["divider.v"]


def test_a_device_is_written_to_and_not_replaced() -> None:
    output.write_files([output.Result(os.devnull, "text")])
    assert stat.S_ISCHR(os.stat(os.devnull).st_mode)


def test_a_file_keeps_its_permissions_and_a_link_its_target(tmp_path: Path) -> None:
    file, link = tmp_path / "file", tmp_path / "link"
    file.write_text("old")
    file.chmod(0o640)
    link.symlink_to(file)
    output.write_files([output.Result(str(link), "new")])
    assert link.is_symlink()
    assert file.read_text() == "new"
    assert stat.S_IMODE(file.stat().st_mode) == 0o640


# -- what is printed ---------------------------------------------------------------------------------------


def test_the_same_input_gives_the_same_report_but_for_the_time(tmp_path: Path) -> None:
    path = written(tmp_path, STICKS_AT_7)
    first, second = (run("check", path, "--ratio", "5", "--high", "4").stdout.splitlines() for _ in range(2))
    assert first[-1].startswith("took ")
    assert first[:-1] == second[:-1]
    assert "\x1b" not in "".join(first)


def test_escapes_are_shown_and_not_obeyed(tmp_path: Path) -> None:
    missing = run("check", str(tmp_path / f"{ESCAPE}gone.v"), "--ratio", "3")
    unknown = run(f"{ESCAPE}check")
    waived = run("check", written(tmp_path, BY_3), "--ratio", "5", "--waive", f"ratio=old {ESCAPE}chip")
    (tmp_path / "divider.v").write_text(BY_3.replace("if (rst)", f"if {ESCAPE} rst"))
    unreadable = run("check", str(tmp_path / "divider.v"), "--ratio", "3")
    for result in (missing, unknown, waived, unreadable):
        assert "\x1b" not in result.output
        assert "[31m" in result.output
    for result in (unknown, waived):
        assert r"\x1b[31m" in result.output
    assert [r.exit_code for r in (missing, unknown, unreadable)] == [2, 2, 2]


def test_the_caret_stays_under_its_column() -> None:
    where = Where("a.v", 3, 4, "a\x1b\tb c")
    lines = cli._user_error(UserError("odd", where)).splitlines()
    assert lines[1:] == ["    a\\x1b b c", "          ^"]


def test_progress_leaves_no_thread_behind(monkeypatch: pytest.MonkeyPatch) -> None:
    class Terminal:
        @staticmethod
        def isatty() -> bool:
            return True

    monkeypatch.setattr(cli, "PATIENCE", 0.0)
    monkeypatch.setenv("TERM", "xterm")
    before = threading.active_count()
    with cli.Progress(Terminal()) as progress:  # type: ignore[arg-type]
        for count in range(3):
            progress.tell(f"step {count} [of] 3")
        time.sleep(0.3)
        assert threading.active_count() == before + 1
    assert threading.active_count() == before


def test_progress_hides_no_cursor_that_a_killed_run_could_not_give_back(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """DECTCEM: ESC [ ? 25 l hides the cursor, ESC [ ? 25 h shows it (from memory)."""
    monkeypatch.setattr(cli, "PATIENCE", 0.0)
    monkeypatch.setenv("FORCE_COLOR", "1")
    monkeypatch.setenv("TERM", "xterm")

    class Terminal:
        @staticmethod
        def isatty() -> bool:
            return True

    streams = sys.stdout, sys.stderr
    with cli.Progress(Terminal()) as progress:  # type: ignore[arg-type]
        progress.tell("something")
        time.sleep(0.4)
        sent = capsys.readouterr().err
        # Else what they can show would be told wrongly.
        assert streams == (sys.stdout, sys.stderr)
    assert "something" in sent
    assert sent.rfind("\x1b[?25h") >= sent.rfind("\x1b[?25l")


def test_no_progress_without_a_terminal(tmp_path: Path) -> None:
    done = python(
        "-m", "prover", "check", written(tmp_path, SECOND), "--ratio", "50000000", "--start", "reset"
    )
    assert done.stderr == ""
