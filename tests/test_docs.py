"""README.md and DEVELOPERS.md against the program: what they name exists, what they quote comes out."""

from __future__ import annotations

import json
import re
import shlex
import subprocess
import sys
from pathlib import Path

import click
import pytest
from click.testing import CliRunner, Result

import prover
from properties import NAMES
from prover import Spec, cli, formula
from prover.errors import UserError
from prover.report.json import SCHEMA
from prover.spec import PLAIN_RATIO, read_duty_range, read_each, read_frequency, read_number, read_ratio

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
CELL = re.compile(r"(?<!\\)\|")


def table(document: str, first: str) -> list[list[str]]:
    """The rows of the table whose first heading is `first`, a list of cells each."""
    found = re.search(rf"^\| {re.escape(first)} \|.*\n\| ---.*\n((?:\|.*\n)+)", document, re.MULTILINE)
    assert found, first
    rows = [[cell.strip() for cell in CELL.split(line)[1:-1]] for line in found[1].splitlines()]
    assert len({len(row) for row in rows}) == 1
    return rows


def quoted(text: str) -> list[str]:
    """What stands between backticks."""
    return re.findall(r"`([^`]+)`", text)


def options(command: click.Command, hidden: bool = False) -> set[str]:
    shown = [p for p in command.params if getattr(p, "hidden", False) == hidden]
    return {name for parameter in shown for name in parameter.opts if name.startswith("--")}


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli.main, list(arguments), catch_exceptions=False)


# -- commands, options, statuses ---------------------------------------------------------------------------


def test_the_options_are_those_of_the_commands() -> None:
    rows = {re.findall(r"--[a-z-]+", row[0])[0]: row[1] for row in table(README, "option")}
    both = options(cli.check) & options(cli.measure)
    assert {name for name, of in rows.items() if of == "both"} == both
    assert {name for name, of in rows.items() if of == "check"} == options(cli.check) - both
    assert {name for name, of in rows.items() if of == "recheck"} == options(cli.recheck) - both
    assert options(cli.measure) == both
    of_compare = {re.findall(r"--[a-z-]+", row[0])[0] for row in table(README, "option of `compare`")}
    assert of_compare <= options(cli.compare)
    assert options(cli.compare) - of_compare <= set(rows)
    of_gate = {re.findall(r"--[a-z-]+", row[0])[0] for row in table(README, "option of `gate`")}
    assert of_gate <= options(cli.gate)
    assert options(cli.gate) - of_gate <= set(rows)
    assert options(cli.history) == {"--ledger"}
    named = set(re.findall(r"(?<![\w-])--[a-z][a-z-]*", README))
    assert named - options(cli.compare, hidden=True) == set(rows) | of_compare | of_gate
    for name in options(cli.compare, hidden=True):
        assert "--" + name.split("-", 3)[3] in options(cli.compare)


def test_the_values_of_options_are_understood() -> None:
    for row in table(README, "option"):
        for text in quoted(row[2]):
            if row[0].startswith("`--ratio"):
                assert (
                    read_ratio(text) > 0 if PLAIN_RATIO.fullmatch(text) else formula.read(text, row[0]).names
                )
            elif row[0].startswith(("`--each", "`--where")):
                assert (
                    read_each(text)[1] if row[0].startswith("`--each") else formula.read(text, row[0]).names
                )
            elif row[0].startswith("`--fin"):
                assert read_frequency(text) > 0
            elif row[0].startswith("`--source-duty"):
                assert read_duty_range(text)
    (lag,) = [row for row in table(README, "option of `compare`") if row[0].startswith("`--lag")]
    assert all(isinstance(read_number(text, "--lag"), int) for text in quoted(lag[1]) if text != "any")


def test_the_commands_are_those_there_are() -> None:
    named = set(re.findall(r"(?:^\$ |\.venv/bin/|`)subharmonic ([a-z]+)\b", README, re.MULTILINE))
    assert named == set(cli.main.commands)


def test_the_exit_statuses_are_those_there_are() -> None:
    assert [int(row[0]) for row in table(README, "status")] == [status.value for status in cli.Status]


def test_the_default_effort_is_as_stated() -> None:
    (row,) = [row for row in table(README, "option") if row[0].startswith("`--effort")]
    assert f"; {Spec().effort:g} where it is left out" in row[2]


# -- what is quoted ----------------------------------------------------------------------------------------

EXAMPLES = re.findall(r"^```console\n\$ subharmonic (.*)\n((?:.*\n)*?)```", README, re.MULTILINE)
ENDS = {"verdict  REFUTED": 1, "verdict  PROVED": 0}


def timeless(text: str) -> str:
    """The text with what may be another in each run of a gate alike: dates, how long it took, digests of content."""
    dates, took, digests = (
        r"\d{4}-\d\d-\d\d \d\d:\d\d:\d\d",
        r"(?<= in )\d+\.\d\d s(?=\)$)",
        r"\b[0-9a-f]{12}\b",
    )
    return re.sub(f"{dates}|{took}|{digests}", "…", text, flags=re.MULTILINE)


@pytest.mark.parametrize(("command", "printed"), EXAMPLES, ids=[command for command, _ in EXAMPLES])
def test_an_example_prints_what_is_quoted(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path, command: str, printed: str
) -> None:
    (tmp_path / "cases").symlink_to(ROOT / "cases", target_is_directory=True)
    monkeypatch.chdir(tmp_path)
    if command.startswith("recheck"):
        for earlier, _ in EXAMPLES:
            if "--certificate" in earlier:
                run(*shlex.split(earlier))
    if command.startswith(("gate", "history")):
        (manifest,) = re.findall(r"^```toml\n((?:.*\n)*?)```", README, re.MULTILINE)
        (tmp_path / "subharmonic.toml").write_text(manifest, encoding="utf-8")
        run("gate")
    result = run(*shlex.split(command))
    # Dots stand for lines left out; all others come in this order, and next to one another.
    parts = [part.strip("\n") for part in f"\n{timeless(printed)}".split("\n...\n") if part.strip()]
    assert len(parts) > 1
    at = 0
    for part in parts:
        at = f"\n{timeless(result.stdout)}".find(f"\n{part}\n", at)
        assert at >= 0, part
    assert result.exit_code == ENDS.get(parts[-1], 0)


def test_the_example_for_each_command_is_there() -> None:
    assert {command.split()[0] for command, _ in EXAMPLES} == set(cli.main.commands)


def test_the_commands_of_the_first_set_up_line_prove_their_case(monkeypatch: pytest.MonkeyPatch) -> None:
    lines = re.findall(r"^```sh\n(.*)\n```", README, re.MULTILINE)
    assert len(lines) == 2
    monkeypatch.chdir(ROOT)
    command = lines[0].split(".venv/bin/subharmonic ")[1]
    result = run(*shlex.split(command))
    assert (result.exit_code, "verdict  PROVED\n" in result.stdout) == (0, True)
    assert lines[1].endswith(".venv/bin/python -m pytest")


def test_the_hook_that_is_named_is_there() -> None:
    hooks = (ROOT / ".pre-commit-hooks.yaml").read_text(encoding="utf-8")
    assert re.findall(r"^- id: (.*)$", hooks, re.MULTILINE) == re.findall(
        r"^      - id: (.*)$", README, re.MULTILINE
    )
    (entry,) = re.findall(r"^  entry: subharmonic (.*)$", hooks, re.MULTILINE)
    assert entry in cli.main.commands


def test_the_python_example_runs() -> None:
    (code,) = re.findall(r"^```python\n((?:.*\n)*?)```", README, re.MULTILINE)
    done = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    assert [line.split()[:2] for line in done.stdout.splitlines()] == [[name, "proved"] for name in NAMES]
    (imported,) = re.findall(r"^from prover import (.*)$", code, re.MULTILINE)
    assert set(imported.split(", ")) <= set(prover.__all__)


def test_the_table_of_json_keys_is_complete() -> None:
    result = run(
        "check", str(ROOT / "cases/gauge/ping_by_7_rtl.v"), "--ratio", "7", "--output", "ping", "--json", "-"
    )
    report = json.loads(result.stdout)
    rows = table(README, "key")
    assert {name for row in rows for name in quoted(row[0])} == set(report) - {"schema"}
    assert f'"schema": "{SCHEMA}"' in README
    named = {name for row in rows for name in quoted(row[1])}
    assert set(report["design"]) | set(report["design"]["reset"]) | set(report["spec"]) <= named
    assert set(report["properties"][0]) <= named
    assert {"period_half_cycles", "high_half_cycles", "wave"} <= set(report["measured"]["from_reset"])
    (recovery,) = [each for each in report["properties"] if each["name"] == "recovery"]
    assert {"worst_half_cycles", "exact"} <= set(recovery["facts"])


def test_the_properties_are_those_there_are() -> None:
    assert [quoted(row[0]) for row in table(README, "property")] == [[name] for name in NAMES]


# -- the Verilog that is read ------------------------------------------------------------------------------

STAGE = "module stage (input ck, output reg q); parameter SKIP = 0; always @(posedge ck) q <= ~q; endmodule\n"
KEEP = """\
primitive keep (q, c, d);
  output reg q; input c, d;
  table
    r 0 : ? : 0;
    r 1 : ? : 1;
    f ? : ? : -;
    ? * : ? : -;
  endtable
endprimitive
"""
BENCH = "module bench; reg c; divider d (c, ); initial c = 0; always #5 c = ~c; endmodule\n"
MACRO = "`timescale 1ns / 1ps\n`ifndef PICK\n`define PICK(v, i) v[i]\n`endif\n"
PORTS = "input clk, output tick"


def divider(body: str, ports: str = PORTS, before: str = "") -> str:
    """A counter by 4 on `clk` with something beside it."""
    return f"""{before}module divider ({ports});
  reg [1:0] count;
  always @(posedge clk) count <= count + 2'd1;
  assign tick = count[1];
  {body}
endmodule
"""


def clocked(statement: str) -> str:
    return divider(f"reg q; always @(posedge clk) {statement}")


# Sources for each row of the table, all of which are read.
ACCEPTED = {
    "modules, ANSI and old-style ports": [
        "module d (clk, tick); input clk; inout tick; reg q; always @(posedge clk) q <= ~q; assign tick = q; "
"endmodule"
    ],
    "parameters, localparams": [
        divider("localparam int L = 2; stage #(.SKIP(L)) one (clk, ); stage #(1) two (clk, );", before=STAGE),
        divider("stage one (clk, ); defparam one.SKIP = 1;", before=STAGE),
    ],
    "hierarchy": [
        divider("wire [1:0] q; stage pair [1:0] (.ck(clk), .q(q)); wire net = pair[0].q;", before=STAGE),
        divider("wire ck = clk, q; stage one (.*);", before=STAGE),
    ],
    "generate": [
        divider("genvar i; for (i = 0; i < 2; i = i + 1) begin : g wire net = count[i]; end"),
        divider("generate case (1) 1: wire a = clk; default: wire b = clk; endcase endgenerate"),
divider("generate if (1) wire c = clk; endgenerate"),
    ],
    "`assign`, implicit nets, tri-state": [divider("assign net = count[0] ? clk : 1'bz;")],
    "gates and user-defined primitives": [
        divider("wire a, b, c; nand (a, clk, count[0]); xnor (b, clk, a); buf (c, a); bufif0 (net, a, b);"),
        divider("wire net; keep one (net, clk, count[0]);", before=KEEP),
    ],
    "clocked blocks": [
        divider("reg q; always @(posedge clk or negedge clk) q <= ~q;"),
        divider("reg q; wire gated = clk & count[0]; always @(negedge gated) q <= ~q;"),
    ],
    "asynchronous set, clear and load": [
        divider(
            "always @(posedge clk, negedge c, posedge s) if (!c) q <= 0; else if (s) q <= count[0]; "
"else q <= ~q;",
            "input clk, input c, input s, output tick, output reg q",
        )
    ],
    "combinational blocks and latches": [
        divider("reg a, b; always @(count or clk) a = ^count & clk; always @* if (clk) b = count[0];")
    ],
    "statements": [
        divider("reg n; always @* begin casez (count) 2'b1?: n = 0; default n = 1; endcase end"),
        divider("reg n; always @* begin n = 0; casex (count) 2'bx1: n = 1; endcase if (clk) n = ~n; end"),
        divider("reg n; always @* begin : b integer i; n = 0; for (i = 0; i < 2; i = i + 1) n = clk; end"),
    ],
    "functions and tasks": [
        divider("function automatic integer f(input integer n); f = n == 0 ? 0 : 1 + f(n - 1); endfunction "
"wire net = f(3);"),
        divider("reg [1:0] n; task t; input [1:0] a; n <= a + 1; endtask always @(posedge clk) t(count);"),
    ],
    "operators": [
        divider("wire signed [3:0] net = $signed(count) >>> 1 ** 2;"),
divider("wire [3:0] net = $clog2(5) % 3 - $unsigned(count);"),
    ],
    "real constants": [
        divider("localparam integer N = 27e6 / 2 - 1; wire net = count >= 57.6e3 / 9600 - 0.5;"),
        divider("localparam integer N = $rtoi($ceil(2.5)) + $itor(3) / $floor(2.5);"),
    ],
    "selects and concatenation": [
        divider("reg [7:0] r; reg c; always @(posedge clk) {c, r[count +: 2]} <= {3{r[count]}} + r[5 -: 2];")
    ],
    "memories": [
        divider("reg m [0:1]; reg r; initial begin m[0] = 1; m[1] = 0; end always @(posedge clk) r <= m[r];"),
        divider("reg [3:0] m [0:3]; always @(posedge clk) m[count] <= m[0] + 1;"),
    ],
    "initial values": [divider("reg a = 0, b; initial b = 1'b1; always @(posedge clk) {a, b} <= {b, a};")],
    "directives": [divider("wire net = `PICK(count, 0);", before=MACRO)],
    "SystemVerilog": [
        divider("typedef enum logic {LOW, HIGH} level; level l; always_ff @(posedge clk) l <= HIGH;"),
        divider("logic [3:0] n, m = '0; always_comb begin : add n = 4'(count); n++; n += 2; end : add"),
        divider("reg x; always_latch if (clk) x = count[0];"),
    ],
    "simulation only": [
        divider('reg q; always @(posedge clk) begin q <= #1 ~q; $display("%b", q); end', before=BENCH),
        divider("specify (clk => tick) = 1; endspecify nand #2 (net, clk, count[0]);"),
        divider("assert property (@(posedge clk) 1);"),
    ],
}  # fmt: skip

# Sources for the rows of which no case shows the message, or not every message.
REFUSED = {
    "two drivers of one bit": [divider("wand net; assign net = count[0]; assign net = count[1];")],
    "`=` and `<=` on one register": [clocked("begin q = 1; q <= count[0]; end")],
    "edges and levels in one list": [divider("reg q; always @(posedge clk or count) q <= count[0];")],
    "data that is the register's own clock": [
        divider("reg a, b; always @(posedge clk) a <= ~a; always @(posedge a) b <= a;")
    ],
    "a set or clear under a further condition": [
        divider(
            "always @(posedge clk, posedge c) if (c) begin if (count[0]) q <= 0; end else q <= ~q;",
            "input clk, input c, output tick, output reg q",
        )
    ],
    "a latch in `always_comb`": [divider("always_comb if (clk) q = count[0];", f"{PORTS}, output reg q")],
    "delays, events and waits in a process": [
        clocked("#1 q <= 1;"),
        clocked("fork q <= 1; join"),
        clocked("begin : b disable b; end"),
        clocked("force q = 1;"),
        clocked("wait (q) q <= 1;"),
        divider("reg q; initial forever #5 q = ~q;"),
    ],
    "real variables, random numbers, files": [
        divider("real net;"),
        divider("wire [3:0] net = 7.5 % 2;"),
        clocked("q <= $random;"),
        divider('reg [3:0] m [0:3]; initial $readmemh("m.hex", m);'),
    ],
    "a net that is read and never driven": [
        divider("wire e; always @(posedge clk) q <= e;", f"{PORTS}, output reg q")
    ],
    "files outside the given folders": [divider("", before='`include "/rates.vh"\n')],
    "arrays of several dimensions": [divider("logic [1:0][3:0] net;"), divider("reg [3:0] m [0:1][0:1];")],
    "structs, interfaces, packages": [
        divider("typedef struct packed {logic a;} pair; pair net;"),
        divider("", before="interface plug; endinterface\n"),
        divider("", before="package rates; endpackage\n"),
    ],
    "switches, pulls and strengths": [
        divider("wire net; tran (net, tick);"),
        divider("pullup (tick);"),
        divider("wire net; assign (strong0, weak1) net = clk;"),
    ],
    "sources without measure": [
        divider("reg [8192:0] r;"),
        divider("reg q; always @* begin q = 0; while (1) q = ~q; end"),
        divider("wire net = `A;", before="`define A `B\n`define B `A\n"),
    ],
}


def refusal(path: Path) -> UserError | None:
    try:
        prover.read([path])
    except UserError as error:
        return error
    return None


def test_every_row_of_what_is_accepted_is_read(tmp_path: Path) -> None:
    rows = [row[0] for row in table(README, "accepted")]
    assert set(ACCEPTED) == set(rows)
    path = tmp_path / "divider.v"
    for row in rows:
        for source in ACCEPTED[row]:
            path.write_text(source, encoding="utf-8")
            error = refusal(path)
            assert error is None, f"{row}: {error}"


def test_every_row_of_what_is_refused_is_refused_with_its_place(tmp_path: Path) -> None:
    rows = {row[0]: quoted(row[2]) for row in table(README, "refused")}
    assert set(REFUSED) <= set(rows)
    path = tmp_path / "divider.v"
    for row, names in rows.items():
        # A row without a case needs a source here.
        assert names or REFUSED.get(row), row
        for name in names:
            error = refusal(ROOT / "cases" / "refused" / f"{name}.v")
            assert error is not None, name
            assert error.where is not None, name
        for source in REFUSED.get(row, []):
            path.write_text(source, encoding="utf-8")
            error = refusal(path)
            assert error is not None, f"{row}: {source}"
            assert error.where is not None, f"{row}: {source}"


# -- the developers' guide ---------------------------------------------------------------------------------


def test_the_layout_names_every_file_and_no_other() -> None:
    named = [name for row in table(DEVELOPERS, "file") for name in quoted(row[0])]
    found = {
        str(path.relative_to(ROOT))
        for folder in ("prover", "properties")
        for suffix in ("*.py", "*.json", "*.css")
        for path in (ROOT / folder).rglob(suffix)
    }
    assert sorted(named) == sorted(found)


def test_the_keys_of_a_case_are_those_in_use() -> None:
    stated = {name for row in table(DEVELOPERS, "key") for name in quoted(row[0])}
    used = set()
    for path in (ROOT / "cases").rglob("*.v"):
        head = re.match(r"(?://.*\n)*", path.read_text(encoding="utf-8"))
        assert head
        used |= set(re.findall(r"^// (unit delay|check)(?=: )", head[0], re.MULTILINE))
        checked, compared, _ = head[0].partition("// compare: ")
        used |= set(re.findall(r"^// (.+?)(?=: )", checked.partition("// check: ")[2], re.MULTILINE))
        used |= {"compare"} if compared else set()
    assert used == stated


def test_the_keys_of_a_pair_are_those_in_use() -> None:
    stated = {name for row in table(DEVELOPERS, "key of a pair") for name in quoted(row[0])}
    used = set()
    for path in (ROOT / "cases").rglob("*.v"):
        head = re.match(r"(?://.*\n)*", path.read_text(encoding="utf-8"))
        assert head
        compared = head[0].partition("// compare: ")[2]
        used |= set(re.findall(r"^// (.+?)(?=: )", compared, re.MULTILINE)) - {"compare"}
    assert used == stated


def test_the_files_that_are_named_exist() -> None:
    for document in (README, DEVELOPERS):
        for name in re.findall(r"\b(?:cases|tests|prover|properties)/[\w/.]*\w", document):
            if "NAME" not in name:
                assert (ROOT / name).exists() or (ROOT / f"{name}.py").exists(), name


def test_the_checks_that_are_named_are_those_that_ci_runs() -> None:
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    named = [text for row in table(DEVELOPERS, "command")[1:] for text in quoted(row[0])]
    for command in named:
        if command.startswith(("python tests/bench", "SUBHARMONIC_PROGRAMS", "SUBHARMONIC_LONG")):
            # Benches want a quiet machine, the long runs have time.
            continue
        assert f'/{command.split()[0]}" {" ".join(command.split()[1:])}'.rstrip() in script, command


def test_the_lines_are_short_and_hold_no_address() -> None:
    for document in (README, DEVELOPERS):
        assert not re.search(r"\w://", document)
        fenced = False
        for line in document.splitlines():
            fenced ^= line.startswith("```")
            if not fenced and not line.startswith("|"):
                assert len(line) <= 118, line
