"""Several dividers in one run: which files make a divider, one verdict for each, the worst status, and what is written."""

from __future__ import annotations

import json
import os
from pathlib import Path

import pytest
from click.testing import CliRunner, Result
from texts import BY_3, RING, SPINS, STICKS_AT_7

from prover import cli
from prover.several import groups
from prover.spec import Spec

STAGE = STICKS_AT_7[: STICKS_AT_7.index("module sticks")]
STICKS = STICKS_AT_7[len(STAGE) :]
BROKEN = BY_3.replace("if (rst)", "if rst")
# What a worker's process runs, with something done to it at one of the files.
FAILING = """
import os, time
from prover import api, task
ask = api.check
def check(files, *rest):
    if files[0].endswith({at!r}):
        {how}
    return ask(files, *rest)
api.check = check
task.main(place)
"""
BENCH = "module bench; reg clk = 0; always #5 clk = ~clk; endmodule\n"


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, list(arguments), catch_exceptions=False)


def written(folder: Path, **texts: str) -> list[str]:
    """Files by name; two underscores stand for a folder."""
    for name, text in texts.items():
        path = folder / f"{name.replace('__', '/')}.v"
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")
    return [str(folder / f"{name.replace('__', '/')}.v") for name in texts]


# -- which files make a divider ----------------------------------------------------------------------------


def test_files_with_one_top_are_one_divider(tmp_path: Path) -> None:
    files = written(tmp_path, lib=STAGE, top=STICKS, bench=BENCH)
    assert groups(files, Spec()) is None
    result = run("check", *files, "--ratio", "5", "--high", "4", "--json", "-")
    assert result.exit_code == 1
    assert json.loads(result.stdout)["design"]["files"] == files


@pytest.mark.parametrize("broken", ["lib", "top"])
def test_one_divider_of_which_a_file_is_unreadable_is_an_error(tmp_path: Path, broken: str) -> None:
    texts = {"lib": STAGE, "top": STICKS}
    texts[broken] += ")\n"
    result = run("check", *written(tmp_path, **texts), "--ratio", "5")
    assert (result.exit_code, result.stdout) == (2, "")
    assert f"{broken}.v:" in result.stderr


def test_files_with_several_tops_are_a_divider_each_with_the_modules_they_need(tmp_path: Path) -> None:
    again = STICKS.replace("sticks_at_7", "again")
    third, lib, sticks, again = written(tmp_path, third=BY_3, lib=STAGE, sticks=STICKS, again=again)
    assert groups([third, lib, sticks, again], Spec()) == [(third,), (sticks, lib), (again, lib)]
    # With a module named they are one again.
    assert groups([third, lib, sticks], Spec(module="by_3")) is None


def test_below_a_folder_every_file_with_ports_is_a_divider(tmp_path: Path) -> None:
    files = written(tmp_path, b=BY_3, a__ring=RING, a__bench=BENCH, notes="// nothing\n", c=BROKEN)
    (tmp_path / ".hidden").mkdir()
    written(tmp_path, **{".hidden__x": RING})
    (tmp_path / "readme.txt").write_text("no Verilog")
    (tmp_path / "sv.sv").write_text(RING.replace("module ring", "module other"))
    expected = [files[1], files[0], files[4], str(tmp_path / "sv.sv")]
    assert groups([str(tmp_path)], Spec()) == [(name,) for name in expected]


def test_two_files_with_modules_of_one_name_do_not_mix(tmp_path: Path) -> None:
    one = written(tmp_path, one=STICKS_AT_7, two=STICKS_AT_7.replace("sticks_at_7", "other"), three=STAGE)
    assert groups(one, Spec()) == [(name,) for name in one]


def test_a_folder_without_a_divider_is_an_error(tmp_path: Path) -> None:
    result = run("check", str(tmp_path), "--ratio", "3")
    assert result.exit_code == 2
    assert "\nhint: " in result.stderr


# -- verdicts and results ----------------------------------------------------------------------------------


def test_each_has_its_report_and_a_line_in_the_table(tmp_path: Path) -> None:
    written(tmp_path, a=BY_3, b=RING, c=BROKEN, d=SPINS)
    result = run("check", str(tmp_path), "--ratio", "3")
    assert result.exit_code == 2
    assert result.stderr == ""
    assert result.stdout.count("\nverdict  ") == 3
    table = result.stdout[result.stdout.index("4 dividers\n") :].splitlines()
    assert [line.split()[0] for line in table[1:5]] == ["PROVED", "REFUTED", "ERROR", "REFUTED"]
    assert [line.split()[1] for line in table[1:5]] == [str(tmp_path / f"{x}.v") for x in "abcd"]
    assert "line 6: syntax error" in table[3]
    assert "ring: ratio, " in table[2]
    assert table[5] == "1 proved, 2 refuted, 1 error"
    assert f"error: {tmp_path / 'c.v'}:6: " in result.stdout


@pytest.mark.parametrize(
    ("texts", "status"),
    [
        ({"a": BY_3, "b": BY_3}, 0),
        ({"a": BY_3, "b": RING}, 1),
        ({"a": BROKEN, "b": RING, "c": BY_3}, 2),
    ],
)
def test_the_status_is_the_worst(tmp_path: Path, texts: dict[str, str], status: int) -> None:
    written(tmp_path, **texts)
    assert run("check", str(tmp_path), "--ratio", "3").exit_code == status


def test_open_is_better_than_refuted_and_worse_than_proved(tmp_path: Path) -> None:
    written(tmp_path, a=BY_3, b=RING)
    result = run("check", str(tmp_path), "--ratio", "3", "--effort", "1e-9")
    assert result.exit_code == 3
    order = [cli.SEVERITY.index(s) for s in (cli.Status.PROVED, cli.Status.OPEN, cli.Status.REFUTED)]
    assert order == sorted(order)


def test_a_fault_of_ours_stops_no_other(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("prover.pool.MAIN", FAILING.format(at="b.v", how="raise ValueError(files)"))
    written(tmp_path, a=BY_3, b=RING, c=BY_3)
    result = run("check", str(tmp_path), "--ratio", "3")
    assert result.exit_code == 70
    assert "2 proved, 1 fault" in result.stdout
    assert "Traceback" not in result.output


def test_json_holds_all_reports_and_errors(tmp_path: Path) -> None:
    written(tmp_path, a=BY_3, b=RING, c=BROKEN)
    result = run("check", str(tmp_path), "--ratio", "3", "--json", "-")
    told = json.loads(result.stdout)
    assert told["schema"] == "subharmonic/reports-1"
    assert [report["schema"] for report in told["reports"]] == ["subharmonic/report-1"] * 2
    assert [report["verdict"] for report in told["reports"]] == ["proved", "refuted"]
    (error,) = told["errors"]
    assert (error["kind"], error["file"], error["line"]) == ("error", str(tmp_path / "c.v"), 6)
    assert error["hint"]


def test_waves_go_into_a_folder_under_the_names_of_their_files(tmp_path: Path) -> None:
    waves = tmp_path / "waves"
    waves.mkdir()
    written(tmp_path, src__a__ring=RING, src__b__ring=RING, src__third=BY_3)
    source = str(tmp_path / "src")
    single = run("check", source, "--ratio", "3", "--vcd", str(tmp_path / "out.vcd"))
    assert single.exit_code == 2
    assert "name a folder" in single.stderr
    assert run("check", source, "--ratio", "3", "--vcd", str(waves)).exit_code == 1
    names = sorted(os.listdir(waves))
    assert "ring-ratio.vcd" in names
    assert "ring-2-ratio.vcd" in names
    assert not any(name.startswith("third") for name in names)


def test_a_certificate_is_of_one_divider(tmp_path: Path) -> None:
    written(tmp_path, a=BY_3, b=RING)
    out = tmp_path / "out.json"
    assert run("check", str(tmp_path), "--ratio", "3", "--certificate", str(out)).exit_code == 2
    assert not out.exists()


def test_measuring_a_folder(tmp_path: Path) -> None:
    written(tmp_path, a=BY_3, b=RING)
    result = run("measure", str(tmp_path))
    assert result.exit_code == 0
    assert "by_3: period 6, high 3" in result.stdout
    assert "ring: " in result.stdout.splitlines()[-2]
    assert result.stdout.splitlines()[-1] == "2 measured"


def test_names_of_files_are_shown_harmlessly(tmp_path: Path) -> None:
    written(tmp_path, **{"\x1b[31mred": BY_3, "plain": BROKEN})
    result = run("check", str(tmp_path), "--ratio", "3")
    assert result.exit_code == 2
    assert "\x1b" not in result.output
    assert "\\x1b[31mred" in result.output
