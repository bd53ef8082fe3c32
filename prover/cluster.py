"""The same tasks on a Dask cluster: every task brings its sources and runs in a process of its own on some worker.

A worker that dies is the scheduler's business: its tasks go to another. The cluster's workers need this program, of
the same version, and nothing of this machine's files. Needs the extra `cluster`.
"""

from __future__ import annotations

import json
import logging
from collections.abc import Iterator, Sequence
from dataclasses import asdict, dataclass
from typing import Any

from prover.content import identity
from prover.errors import UserError
from prover.pool import Tell, Worker
from prover.task import Answer, Task, rechecked

PATIENCE = 20
"""Seconds to wait for the scheduler's first answer."""


def do(text: str) -> str:
    """One task, done in a process of its own; runs on the cluster's workers. Text to text: a task, an answer."""
    worker = Worker()
    try:
        answer = worker.ask(Task.from_json(text), lambda doing: None)
    finally:
        worker.close()
    return json.dumps(asdict(answer))


def _answer(text: str) -> Answer:
    fields: dict[str, Any] = json.loads(text)
    fields["left_open"] = tuple(fields["left_open"])
    if fields["rechecked"] is not None:
        fields["rechecked"] = rechecked(fields["rechecked"])
    return Answer(**fields)


@dataclass(frozen=True)
class Cluster:
    """A Dask cluster, by its scheduler's address."""

    address: str
    apart: bool = True

    def run(self, tasks: Sequence[Task], tell: Tell) -> Iterator[tuple[int, Answer]]:
        """Each task's number and answer, in the order in which they are done. Raises UserError where the cluster
        can't be reached, is lost, or runs another version."""
        from distributed import Client, as_completed

        # What it would log is told as an error, once.
        for name in ("distributed", "distributed.client"):
            logging.getLogger(name).setLevel(logging.CRITICAL)
        tell(f"reaching the cluster at {self.address}")
        _reach(self.address)
        client = Client(self.address, timeout=PATIENCE, set_as_default=False)
        try:
            futures = {
                client.submit(do, task.as_json(), pure=False, retries=0): number
                for number, task in enumerate(tasks)
            }
            for count, future in enumerate(as_completed(futures, loop=client.loop), 1):
                yield futures[future], self._result(future)
                future.release()
                tell(f"{count} of {len(tasks)} done on {self.address}")
        finally:
            client.close(timeout=PATIENCE)

    def _result(self, future: Any) -> Answer:
        import asyncio
        import concurrent.futures

        from distributed import KilledWorker

        try:
            answer = _answer(future.result())
        except KilledWorker:
            return Answer(fault="one after the other, several of the cluster's workers died of it")
        except (asyncio.CancelledError, concurrent.futures.CancelledError):
            raise UserError(
                f"--cluster {self.address}: the scheduler was lost", hint="start the cluster again, and this"
            ) from None
        except Exception as fault:
            raise UserError(
                f"--cluster {self.address}: {type(fault).__name__}: {fault}",
                hint="all its workers need this program, of this version",
            ) from None
        if answer.prover and answer.prover != identity():
            raise UserError(
                f"--cluster {self.address}: a worker runs {answer.prover}, this is {identity()}",
                hint="install the same version of this program and of its packages on all of them",
            )
        return answer


def _reach(address: str) -> None:
    """Raise UserError where nobody listens at the scheduler's address."""
    import socket

    _, _, place = address.rpartition("://")
    host, _, port = place.rpartition(":")
    try:
        socket.create_connection((host.strip("[]"), int(port)), PATIENCE).close()
    except (OSError, ValueError, OverflowError) as fault:
        raise UserError(
            f"--cluster {address}: no scheduler answers: {fault}",
            hint="give the address that the scheduler tells when it starts, with its port",
        ) from None


def needs() -> None:
    """Raise UserError where Dask isn't installed."""
    from importlib.util import find_spec

    if find_spec("distributed") is None:
        raise UserError(
            "--cluster needs Dask, which isn't installed", hint="install .[cluster] in place of ."
        )
