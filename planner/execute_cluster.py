"""Jobs on a Dask cluster: workers on other machines that a scheduler knows, or ``local`` for a cluster of this one.

Every worker is asked who it is before it gets work, newcomers too; one of another version, other sources or other
arithmetic is refused by name and the rest go on. What a lost worker had, the scheduler gives to another; when the
scheduler itself is gone, the study ends with what has come back.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from concurrent.futures import Future
from typing import Any

from distributed import Client, LocalCluster

from planner.chunk import Done, Missing, Refused, work
from planner.errors import LostWorkersError
from planner.execute_pool import cores
from planner.identity import Identity, identity
from sim.errors import RequestError

CONNECT_SECONDS = 5
LOOK_SECONDS = 2.0
LOOK_SECONDS_IDLE = 0.3
PATIENCE_SECONDS = 60.0
REFUSED_PATIENCE_SECONDS = 3.0
"""How long a study waits while the cluster has no worker, or only ones that must not compute."""


class Cluster:
    """A connection to a scheduler, and the workers that may compute for this study."""

    def __init__(
        self,
        address: str,
        workers: int | None,
        notice: Callable[[str], None],
        *,
        patience_seconds: float = PATIENCE_SECONDS,
    ) -> None:
        self._address, self._notice, self._patience = address, notice, patience_seconds
        self._own: LocalCluster | None = None
        if address == "local":
            # A free port of this machine alone: by default the page of Dask would stand open, on one fixed port.
            page = "127.0.0.1:0"
            self._own = LocalCluster(n_workers=workers or cores(), threads_per_worker=1, dashboard_address=page)
        try:
            self._client = Client(self._own or address, timeout=CONNECT_SECONDS, set_as_default=False)
        except (OSError, ValueError) as error:
            raise RequestError(
                "--cluster",
                f"no scheduler at {address} ({str(error).splitlines()[0]})",
                "the address of a running scheduler, such as tcp://host:8786",
                "start one with: dask scheduler",
            ) from None
        self._accepted: dict[str, int] = {}
        self._refused: dict[str, str] = {}
        self._expected = identity()
        self._executor = self._client.get_executor(pure=False)
        self._looked = 0.0
        self._idle_since: float | None = None
        self._look()

    @property
    def workers(self) -> int:
        return sum(self._accepted.values())

    @property
    def wanted(self) -> str:
        return ""  # other machines see no file of this one; the scheduler takes back what is not in work

    def submit(self, expected: Identity, packed_chunk: bytes) -> Future[Done | Missing | Refused]:
        future: Future[Done | Missing | Refused] = self._executor.submit(work, expected, packed_chunk)
        return future

    def tick(self) -> bool:
        if time.monotonic() - self._looked < (LOOK_SECONDS if self._accepted else LOOK_SECONDS_IDLE):
            return False
        before = set(self._accepted)
        self._look()
        # The scheduler moves what a lost worker had to the others that were there when it was sent, if one is left.
        return bool(before) and not before & set(self._accepted)

    def mend(self) -> None:
        self._look()

    def refuse(self, refused: Refused) -> None:
        """Take out a worker that changed its sources after it was asked who it is."""
        self._looked = 0.0
        self._accepted.clear()
        self._look()

    def close(self) -> None:
        self._client.close(timeout=2)
        if self._own is not None:
            self._own.close(timeout=5)

    def _look(self) -> None:
        """Ask the scheduler for its workers, and new workers who they are."""
        self._looked = time.monotonic()
        known = self._ask_scheduler()
        new = [name for name in known if name not in self._accepted and name not in self._refused]
        gone = [name for name in self._accepted if name not in known]
        self._refused = {name: why for name, why in self._refused.items() if name in known}
        for name in gone:
            del self._accepted[name]
            self._notice(f"worker {name} is gone: what it had is done again")
        for name, who in self._ask_workers(new).items():
            why = who.differs_from(self._expected) if isinstance(who, Identity) else _in_words(who)
            if why:
                self._refused[name] = why
                self._notice(f"worker {name} is refused: {why}")
            else:
                self._accepted[name] = known[name]
        if self._accepted and (new or gone):
            self._executor = self._client.get_executor(pure=False, workers=list(self._accepted), retries=2)
        self._be_patient()

    def _ask_scheduler(self) -> dict[str, int]:
        """Return each worker's name with its number of threads; LostWorkersError when the scheduler is gone."""
        try:
            if self._client.status != "running":
                raise OSError(self._client.status)
            found = self._client.sync(self._client.scheduler.identity, n_workers=-1, callback_timeout=CONNECT_SECONDS)
        except (OSError, TimeoutError, AttributeError, RuntimeError):
            raise LostWorkersError(
                f"the scheduler at {self._address} is gone", 0, 0, "start it and the same command again with --resume"
            ) from None
        return {name: int(worker["nthreads"]) for name, worker in found["workers"].items()}

    def _ask_workers(self, names: list[str]) -> dict[str, Any]:
        """Return each worker's identity, or the error that it answered with."""
        if not names:
            return {}
        answers: dict[str, Any] = self._client.run(identity, workers=names, on_error="return")
        return answers

    def _be_patient(self) -> None:
        if self._accepted:
            self._idle_since = None
            return
        now = time.monotonic()
        if self._idle_since is None:
            self._idle_since = now
            self._notice(f"the cluster at {self._address} has no worker for this study now: waiting for one")
        if self._refused and now - self._idle_since > REFUSED_PATIENCE_SECONDS:
            raise RequestError(
                "--cluster",
                "; ".join(f"worker {name}: {why}" for name, why in self._refused.items()),
                "workers that run this very version of Spoolwright",
                "install the same version, from the same sources, on every machine of the cluster",
            )
        if now - self._idle_since > self._patience:
            raise LostWorkersError(
                f"the cluster at {self._address} has had no worker for {self._patience:.0f} seconds",
                0,
                0,
                "start workers and the same command again with --resume",
            )


def _in_words(error: object) -> str:
    return f"it cannot run Spoolwright ({type(error).__name__}: {error})"
