"""The ledger: what is kept comes back or is not believed, whatever happens to the file, the disk or the process."""

from __future__ import annotations

import os
import random
import signal
import sqlite3
import subprocess
import sys
import time
from contextlib import closing
from dataclasses import replace
from pathlib import Path

import pytest

import prover
from prover.errors import InternalError, UserError
from prover.gate import ledger as module
from prover.gate.ledger import Event, Kept, Ledger, Property, digest

ENVIRONMENT = {**os.environ, "PYTHONPATH": str(Path(prover.__file__).parents[1])}
REPORT, CERTIFICATE = "a report " * 500, "a certificate " * 500
PROVED = (Property("ratio", "proved", "says", 0), Property("recovery", "proved", "says", 2))
KEPT = Kept(
    "k" * 64, "2026-12-01T00:00:00+00:00", 60.0, 0.5, PROVED, "", digest(REPORT), digest(CERTIFICATE), ()
)
EVENT = Event("tick[N=3]", "tick", "2026", ("tick.v",), "proved", "", "s", "p", {"ratio": "3"}, {})


def numbered(number: int) -> Kept:
    return replace(KEPT, key=digest(str(number)))


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "folder" / "ledger.sqlite"


def filled(path: Path, count: int = 30) -> None:
    with closing(Ledger(path)) as ledger:
        for number in range(count):
            ledger.keep(numbered(number), REPORT, CERTIFICATE, replace(EVENT, divider=f"d{number}"))


def read_all(path: Path, count: int) -> None:
    """Read what `filled` has written; an entry that is missing is no entry, and all others are as they were."""
    with closing(Ledger(path)) as ledger:
        for number in range(count):
            kept = ledger.find(numbered(number).key)
            assert kept in (None, numbered(number))
            if kept is not None:
                assert ledger.text(kept, "report") == REPORT
        assert len(list(ledger.history())) <= count


# -- what is kept ------------------------------------------------------------------------------------------


def test_what_is_kept_comes_back(path: Path) -> None:
    with closing(Ledger(path)) as ledger:
        assert ledger.find(KEPT.key) is None
        ledger.keep(KEPT, REPORT, CERTIFICATE, EVENT)
    with closing(Ledger(path)) as ledger:
        assert ledger.find(KEPT.key) == KEPT
        assert ledger.text(KEPT, "report") == REPORT
        assert ledger.text(KEPT, "certificate") == CERTIFICATE
        assert list(ledger.history()) == [EVENT]
    with closing(Ledger(path, to_read=True)) as ledger:
        assert ledger.find(KEPT.key) == KEPT


def test_a_verdict_without_a_certificate(path: Path) -> None:
    with closing(Ledger(path)) as ledger:
        kept = replace(KEPT, certificate="")
        ledger.keep(kept, REPORT, "", None)
        assert ledger.find(kept.key) == kept


def test_an_open_verdict_gives_way_and_a_decided_one_does_not(path: Path) -> None:
    left = replace(KEPT, properties=(PROVED[0], Property("recovery", "open", "why", 0)))
    with closing(Ledger(path)) as ledger:
        for kept, stays in ((left, left), (KEPT, KEPT), (left, KEPT), (replace(KEPT, seconds=9), None)):
            ledger.keep(kept, REPORT, CERTIFICATE, None)
            assert ledger.find(KEPT.key) == (stays or kept)


def test_two_answers_to_one_question_are_a_fault(path: Path) -> None:
    other = replace(KEPT, properties=(Property("ratio", "refuted", "says", 0), PROVED[1]))
    with closing(Ledger(path)) as ledger:
        ledger.keep(KEPT, REPORT, CERTIFICATE, None)
        with pytest.raises(InternalError, match="ratio is refuted, and the ledger holds it proved"):
            ledger.keep(other, REPORT, CERTIFICATE, EVENT)
        assert ledger.find(KEPT.key) == KEPT
        assert list(ledger.history()) == []


def test_dropping(path: Path) -> None:
    filled(path, 3)
    with closing(Ledger(path)) as ledger:
        assert ledger.older_than("2026-11-30") == []
        assert len(ledger.older_than("2026-12-02")) == 3
        ledger.drop([numbered(1).key, "nothing"])
        assert [ledger.find(numbered(number).key) is None for number in range(3)] == [False, True, False]


def test_history_holds_what_changed_and_no_repetition(path: Path) -> None:
    later = replace(EVENT, run="2027")
    refuted = replace(later, verdict="refuted", says="ratio")
    with closing(Ledger(path)) as ledger:
        ledger.note([EVENT, replace(EVENT, divider="other")])
        ledger.note([later])
        ledger.note([refuted])
        ledger.keep(KEPT, REPORT, CERTIFICATE, replace(refuted, run="2028"))
        ledger.note([later])
        told = [(event.divider, event.run, event.verdict) for event in ledger.history()]
    assert told == [
        ("tick[N=3]", "2026", "proved"),
        ("other", "2026", "proved"),
        ("tick[N=3]", "2027", "refuted"),
        ("tick[N=3]", "2027", "proved"),
    ]


# -- what is damaged ---------------------------------------------------------------------------------------


def damaged(path: Path, query: str, *values: object) -> None:
    with closing(sqlite3.connect(path)) as base, base:
        base.execute(query, values)


@pytest.mark.parametrize(
    "query",
    [
        "UPDATE kept SET told = replace(told, 'proved', 'refuted')",
        "UPDATE kept SET told = 5",
        "UPDATE kept SET seal = 'none'",
        "UPDATE texts SET data = x'00' WHERE kind = 'report'",
        "UPDATE texts SET data = 'text' WHERE kind = 'report'",
        "DELETE FROM texts WHERE kind = 'report'",
        "UPDATE texts SET data = (SELECT data FROM texts WHERE kind = 'certificate') WHERE kind = 'report'",
        "DROP TABLE kept",
        "ALTER TABLE texts RENAME TO other",
    ],
)
def test_an_entry_that_is_not_as_it_was_written_is_not_believed(path: Path, query: str) -> None:
    filled(path, 1)
    damaged(path, query)
    with pytest.raises(UserError) as told:
        read_all(path, 1)
    assert f"the ledger {path} is damaged: " in told.value.message
    assert "move it away" in told.value.hint


def test_history_that_is_not_as_it_was_written_is_told(path: Path) -> None:
    filled(path, 1)
    damaged(path, "UPDATE history SET told = '{'")
    with closing(Ledger(path)) as ledger, pytest.raises(UserError, match="is damaged"):
        list(ledger.history())


def test_bytes_overwritten_anywhere_are_told_or_do_no_harm(path: Path, tmp_path: Path) -> None:
    """Never another verdict, and no error but the user's."""
    filled(path)
    whole = path.read_bytes()
    draw = random.Random(5)
    broken = 0
    for _ in range(60):
        data = bytearray(whole)
        at = draw.randrange(len(data))
        data[at : at + 400] = draw.randbytes(min(400, len(data) - at))
        other = tmp_path / "other.sqlite"
        other.write_bytes(data)
        told = None
        try:
            read_all(other, 30)
        except UserError as error:
            told = error
        broken += told is not None
        assert told is None or (str(other) in told.message and told.hint)
    assert broken > 10


@pytest.mark.parametrize("size", [0.3, 0.6, 0.95])
def test_a_file_cut_short_is_told(path: Path, size: float) -> None:
    filled(path)
    data = path.read_bytes()
    path.write_bytes(data[: int(len(data) * size)])
    with pytest.raises(UserError, match="is damaged"):
        read_all(path, 30)


def test_another_file_is_no_ledger(path: Path) -> None:
    path.parent.mkdir()
    path.write_text("module tick; endmodule\n" * 100)
    with pytest.raises(UserError, match="is no ledger, or one that is damaged from its beginning"):
        Ledger(path)
    path.unlink()
    damaged(path, "CREATE TABLE kept (key)")
    with pytest.raises(UserError, match="is no ledger"):
        Ledger(path)
    with pytest.raises(UserError, match="is no ledger"):
        Ledger(path, to_read=True)


def test_a_ledger_of_another_version_is_left_alone(path: Path) -> None:
    filled(path, 1)
    damaged(path, "PRAGMA user_version = 7")
    before = path.read_bytes()
    with pytest.raises(UserError, match="a ledger of version 7"):
        Ledger(path)
    assert path.read_bytes() == before


# -- where it can't be written -----------------------------------------------------------------------------


def test_a_file_in_place_of_the_folder(path: Path) -> None:
    path.parent.write_text("")
    with pytest.raises(UserError, match=r"can't write the ledger .*: can't make its folder: File exists"):
        Ledger(path)


def test_a_folder_in_place_of_the_file(path: Path) -> None:
    path.mkdir(parents=True)
    with pytest.raises(UserError, match="is a folder"):
        Ledger(path)


@pytest.mark.parametrize("place", ["/proc/subharmonic/ledger.sqlite", "/proc/ledger.sqlite"])
def test_a_folder_that_takes_no_files(place: str) -> None:
    """Nobody, root not excepted, can make a file in the system's folder of processes."""
    with pytest.raises(UserError, match="can't write the ledger "):
        Ledger(Path(place))


def test_a_ledger_that_is_only_to_be_read(path: Path) -> None:
    filled(path, 1)
    with closing(Ledger(path, to_read=True)) as ledger:
        assert ledger.find(numbered(0).key) is not None
        with pytest.raises(UserError, match=r"can't write the ledger .*readonly"):
            ledger.keep(KEPT, REPORT, CERTIFICATE, None)


FULL = """
import random, resource, signal, sys
from pathlib import Path
from prover.errors import UserError
from prover.gate.ledger import Kept, Ledger, digest
path = Path(sys.argv[1])
signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
limit = path.stat().st_size + 8192
resource.setrlimit(resource.RLIMIT_FSIZE, (limit, limit))
noise = random.Random(1).randbytes(200_000).hex()
try:
    Ledger(path).keep(Kept("k" * 64, "2026", 1.0, 1.0, (), "", digest(noise), "", ()), noise, "", None)
except UserError as error:
    print(error.message)
"""


def test_a_full_disk_is_told_and_what_was_kept_stays(path: Path) -> None:
    """The system's limit on a file's size stands in for a disk without room: writing fails in the same way."""
    filled(path, 5)
    done = subprocess.run(
        [sys.executable, "-c", FULL, str(path)], capture_output=True, text=True, check=False, env=ENVIRONMENT
    )
    assert f"can't write the ledger {path}: " in done.stdout
    assert done.stderr == ""
    with closing(Ledger(path)) as ledger:
        assert all(ledger.text(numbered(number), "report") == REPORT for number in range(5))
        assert ledger.find(KEPT.key) is None


def test_pages_used_up_are_told_and_what_was_kept_stays(path: Path) -> None:
    """SQLite's own word for a full disk."""
    filled(path, 5)
    with closing(Ledger(path)) as ledger:
        ledger._base.execute("PRAGMA max_page_count = 1")
        noise = random.Random(1).randbytes(200_000).hex()
        with pytest.raises(UserError, match=r"can't write the ledger .*full") as told:
            ledger.keep(replace(KEPT, report=digest(noise)), noise, "", EVENT)
        assert "what it holds already is as it was" in told.value.hint
        assert ledger.find(numbered(4).key) == numbered(4)
        assert ledger.find(KEPT.key) is None


def test_a_ledger_that_another_run_holds_is_told(path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    filled(path, 1)
    monkeypatch.setattr(module, "PATIENCE", 0.05)
    with closing(sqlite3.connect(path, isolation_level=None)) as other:
        other.execute("BEGIN EXCLUSIVE")
        with pytest.raises(UserError, match=r"has been locked by another run for 0.05 seconds"):
            Ledger(path)
        other.execute("ROLLBACK")
    read_all(path, 1)


def test_waiting_for_another_run_can_be_interrupted(path: Path) -> None:
    """The one that holds the ledger goes on until this one has ended, so that it ends by the signal alone."""
    filled(path, 1)
    script = """
import sys
from pathlib import Path
from prover.gate.ledger import Ledger
print("x", flush=True)
Ledger(Path(sys.argv[1]))
"""
    with closing(sqlite3.connect(path, isolation_level=None)) as other:
        other.execute("BEGIN EXCLUSIVE")
        process = subprocess.Popen(
            [sys.executable, "-c", script, str(path)],
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            env=ENVIRONMENT,
        )
        assert process.stdout is not None
        process.stdout.read(1)
        time.sleep(0.3)
        process.send_signal(signal.SIGINT)
        _, told = process.communicate(timeout=module.PATIENCE / 2)
        assert b"KeyboardInterrupt" in told
    read_all(path, 1)


# -- killed at any moment ----------------------------------------------------------------------------------

WRITER = """
import sys
from pathlib import Path
from prover.gate.ledger import Event, Kept, Ledger, Property, digest
path, first = Path(sys.argv[1]), int(sys.argv[2])
report, certificate = "a report " * 500, "a certificate " * 500
ledger = Ledger(path)
for number in range(first, first + 1000):
    properties = Property("ratio", "proved", "says", 0), Property("recovery", "proved", "says", 2)
    key = digest(str(number))
    ledger.keep(
        Kept(key, "2026-12-01T00:00:00+00:00", 60.0, 0.5, properties, "", digest(report), digest(certificate), ()),
        report, certificate, Event(f"d{number}", "d", "2026", ("d.v",), "proved", "", "s", "p", {}, {}),
    )
    print(number, flush=True)
"""


def test_writers_killed_at_fifty_random_moments_lose_nothing_and_leave_no_lock(path: Path) -> None:
    """Two at once, one of which is killed; what a writer has told is kept, and no entry is there in part."""
    path.parent.mkdir()
    draw = random.Random(6)
    told: set[int] = set()
    first = 0

    def writer() -> subprocess.Popen[str]:
        nonlocal first
        first += 1000
        command = [sys.executable, "-c", WRITER, str(path), str(first)]
        return subprocess.Popen(command, stdout=subprocess.PIPE, text=True, env=ENVIRONMENT)

    running = writer()
    for _ in range(50):
        victim = writer()
        time.sleep(draw.uniform(0.05, 0.35))
        # The one killed is the new one or the one that has been writing for long.
        if draw.random() < 0.5:
            victim, running = running, victim
        victim.kill()
        told |= {int(line) for line in victim.communicate()[0].split("\n")[:-1]}
    running.kill()
    told |= {int(line) for line in running.communicate()[0].split("\n")[:-1]}
    with closing(Ledger(path)) as ledger:
        assert ledger._base.execute("PRAGMA integrity_check").fetchone() == ("ok",)
        events = [event.divider for event in ledger.history()]
        kept = [number for number in range(first + 1000) if ledger.find(digest(str(number)))]
        assert told <= set(kept)
        assert len(told) > 50
        # Whatever is there is whole, and stands in the history once.
        assert sorted(events) == sorted(f"d{number}" for number in kept)
        for number in kept:
            assert ledger.text(numbered(number), "report") == REPORT
            assert ledger.text(numbered(number), "certificate") == CERTIFICATE
    assert sorted(file.name for file in path.parent.iterdir()) == ["ledger.sqlite"]
