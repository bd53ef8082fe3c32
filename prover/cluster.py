"""The same tasks on a Dask cluster: every task brings its sources and runs in a process of its own on some worker.

A worker that dies is the scheduler's business: its tasks go to another. The cluster's workers need this program, of
the same version, and nothing of this machine's files. Needs the extra `cluster`.
"""

from __future__ import annotations

import json
import logging
import time
from collections.abc import Iterator, Sequence
from dataclasses import asdict, dataclass
from typing import Any

from prover.content import identity
from prover.errors import UserError
from prover.pool import Tell, Worker
from prover.task import Answer, Task, rechecked

PATIENCE = 20
"""Seconds to wait for the scheduler's first answer."""

WAIT = 60.0
"""Seconds to wait for a worker where there is none, if nobody says how long."""

STEP = 2.0
"""Seconds between two looks at whether there are workers."""


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
    """A Dask cluster, by its scheduler's address; `wait` is how many seconds it may be without any worker."""

    address: str
    wait: float = WAIT
    apart: bool = True

    def run(self, tasks: Sequence[Task], tell: Tell) -> Iterator[tuple[int, Answer]]:
        """Each task's number and answer, in the order in which they are done. Raises UserError where the cluster
        can't be reached, is lost, has no workers for too long, or runs another version."""
        from distributed import Client

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
            pending = set(futures)
            at_work = time.monotonic()
            while pending:
                done, pending = self._completed(client, pending)
                for future in done:
                    yield futures[future], self._result(future)
                    future.release()
                working = bool(done) or _has_workers(client)
                at_work = time.monotonic() if working else at_work
                counted = f"{len(tasks) - len(pending)} of {len(tasks)} done on {self.address}"
                tell(counted if working else f"{counted}; waiting for a worker")
                if time.monotonic() - at_work > self.wait:
                    raise UserError(
                        f"--cluster {self.address}: no worker for {self.wait:g} s",
                        hint=f"start one with `dask worker {self.address}`, or give more time with --wait",
                    )
        finally:
            client.close(timeout=PATIENCE)

    def _completed(self, client: Any, pending: set[Any]) -> tuple[set[Any], set[Any]]:
        """Those that are done within a short time, and those that are not."""
        import asyncio
        import concurrent.futures

        from distributed import wait

        try:
            with client.as_current():
                found = wait(pending, timeout=STEP, return_when="FIRST_COMPLETED")
        except TimeoutError:
            return set(), pending
        except (asyncio.CancelledError, concurrent.futures.CancelledError):
            raise self._lost() from None
        return set(found.done), set(found.not_done)

    def _lost(self) -> UserError:
        return UserError(
            f"--cluster {self.address}: the scheduler was lost", hint="start the cluster again, and this"
        )

    def _result(self, future: Any) -> Answer:
        import asyncio
        import concurrent.futures

        from distributed import KilledWorker

        try:
            answer = _answer(future.result())
        except KilledWorker:
            return Answer(fault="one after the other, several of the cluster's workers died of it")
        except (asyncio.CancelledError, concurrent.futures.CancelledError):
            raise self._lost() from None
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


def _has_workers(client: Any) -> bool:
    try:
        return bool(client.scheduler_info()["workers"])
    except (OSError, TimeoutError):
        # A scheduler that is lost cancels what waits for it.
        return False


def _reach(address: str) -> None:
    """Raise UserError where no scheduler answers at the address."""
    import asyncio
    import socket

    scheme, _, place = address.rpartition("://")
    host, _, port = place.rpartition(":")
    try:
        if not host or not port.isdecimal():
            raise ValueError("there is no host and port in it, such as tcp://192.0.2.1:8786")
        # A refusal is known at once so, and a client would go on trying.
        socket.create_connection((host.strip("[]"), int(port)), PATIENCE).close()
        asyncio.run(_greet(f"{scheme or 'tcp'}://{place}"))
    except TimeoutError:
        why = "what listens there does not answer as one"
    except Exception as fault:
        why = str(fault)
    else:
        return
    raise UserError(
        f"--cluster {address}: no scheduler answers: {why}",
        hint="give the address that the scheduler tells when it starts, with its port",
    )


async def _greet(address: str) -> None:
    """Dask's greeting and no more: its client would wait for ever for one that does not know it."""
    import asyncio

    from distributed import Security
    from distributed.comm import connect

    arguments = Security().get_connection_args("client")
    comm = await asyncio.wait_for(connect(address, timeout=PATIENCE, **arguments), PATIENCE)
    await comm.close()


def needs() -> None:
    """Raise UserError where Dask isn't installed."""
    from importlib.util import find_spec

    if find_spec("distributed") is None:
        raise UserError(
            "--cluster needs Dask, which isn't installed", hint="install .[cluster] in place of ."
        )
