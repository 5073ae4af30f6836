"""The pool of Dask workers: local processes, or an external scheduler."""

import contextlib
import logging
import os
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any, Protocol

import dask.config
from distributed import Client, Future, LocalCluster
from distributed.security import Security

from sweepmill.revisions import results_revision
from sweepmill_service.lifeline import STARTED_TOPIC, KernelLoader, Lifeline, StartReporter
from sweepmill_worker.sample import sample_plain, versions
from sweepmill_worker.warm import JOBS, compile_ahead

log = logging.getLogger(__name__)

WAIT_SECONDS = 10.0
THREAD_SETTINGS = ("OMP_NUM_THREADS", "MKL_NUM_THREADS", "OPENBLAS_NUM_THREADS", "NUMBA_NUM_THREADS")
SINGLE_THREADED = dict.fromkeys(THREAD_SETTINGS, "1")
CONFIGURATION: dict[str, Any] = {
    "distributed.scheduler.http.routes": [],
    "distributed.worker.http.routes": [],
    "distributed.scheduler.work-stealing": False,  # buys nothing for independent batches
    "distributed.scheduler.allowed-failures": 0,  # failures are counted by us, per batch, in the database
    "distributed.scheduler.worker-ttl": "5 minutes",
    "distributed.scheduler.no-workers-timeout": "60s",
    "distributed.worker.daemon": True,
    "distributed.worker.profile.enabled": False,
    # Housekeeping of Dask that nobody reads here; an idle service took 8 % of a core, now 2 %
    "distributed.admin.system-monitor.interval": "1h",
    "distributed.admin.tick.interval": "1s",
    "distributed.worker.memory.monitor-interval": "1s",
    "distributed.scheduler.active-memory-manager.start": False,
    "distributed.nanny.pre-spawn-environ": SINGLE_THREADED | {"DASK_LOGGING__DISTRIBUTED": "critical"},
}


class PoolUnavailable(Exception):
    """The pool cannot be used; the message says why."""


@dataclass(frozen=True)
class WorkerInfo:
    """One usable worker process."""

    name: str
    address: str
    threads: int
    assigned: tuple[str, ...]  # names of tasks


class Pool(Protocol):
    """What the dispatcher needs of a pool. Methods raise PoolUnavailable or what Dask raises."""

    def open(self) -> None:
        """Start or connect; ends by itself."""

    def close(self) -> None:
        """Give everything up; never raises."""

    def alive(self) -> bool:
        """Whether the scheduler answers."""

    def workers(self) -> list[WorkerInfo]:
        """Usable workers."""

    def mismatches(self) -> list[str]:
        """Workers that are not used because their versions differ, with what differs."""

    def submit(self, key: str, *arguments: Any) -> Future:
        """Hand a task over: the arguments of ``sample_plain``."""

    def gather(self, futures: list[Future]) -> list[Any]:
        """Results of finished tasks."""

    def started(self, key: str) -> str | None:
        """The worker on which a task was seen to begin."""


class _DaskPool:
    """What both kinds have in common."""

    def __init__(self) -> None:
        self._client: Client | None = None
        self._started: dict[str, str] = {}
        self._checked: dict[str, str | None] = {}  # address -> what differs

    @property
    def client(self) -> Client:
        """The connection. Raises PoolUnavailable before ``open``."""
        if self._client is None:
            raise PoolUnavailable("the pool is not open")
        return self._client

    def alive(self) -> bool:
        """Whether the scheduler answers."""
        return self._client is not None and self._client.status == "running"

    def workers(self) -> list[WorkerInfo]:
        """Usable workers, as the scheduler knows them now."""
        found = self._identities()
        self._check_versions(set(found))
        assigned = self._call(self.client.processing)
        return [
            WorkerInfo(str(one["name"]), address, int(one["nthreads"]), tuple(map(str, assigned.get(address, ()))))
            for address, one in found.items()
            if self._checked.get(address) is None
        ]

    def mismatches(self) -> list[str]:
        """Workers left out, one line each."""
        return [f"worker {address} {why}" for address, why in self._checked.items() if why is not None]

    def submit(self, key: str, *arguments: Any) -> Future:
        """Hand a task over; it is never computed for another name, nor retried by Dask."""
        where = None
        if any(why is not None for why in self._checked.values()):
            where = [address for address, why in self._checked.items() if why is None]
        return self.client.submit(sample_plain, *arguments, key=key, pure=False, retries=0, workers=where)

    def gather(self, futures: list[Future]) -> list[Any]:
        """Results of finished tasks, in order."""
        results: list[Any] = self._call(self.client.gather, futures)
        return results

    def started(self, key: str) -> str | None:
        """The worker on which a task was seen to begin; asking forgets it."""
        return self._started.pop(key, None)

    def _call(self, function: Callable[..., Any], *arguments: Any, **options: Any) -> Any:
        """Call a method of the client that may wait, but not for ever. Raises TimeoutError."""
        return self.client.sync(function, *arguments, callback_timeout=WAIT_SECONDS, **options)

    def _connect(self, target: Any, security: Security | None = None) -> None:
        self._client = Client(target, timeout=WAIT_SECONDS, set_as_default=False, security=security)
        self._client.register_plugin(StartReporter())
        self._client.subscribe_topic(STARTED_TOPIC, self._note_start)

    def _note_start(self, event: tuple[float, dict[str, str]]) -> None:
        self._started[event[1]["task"]] = event[1]["worker"]

    def _disconnect(self) -> None:
        client, self._client = self._client, None
        self._started.clear()
        self._checked.clear()
        if client is not None:
            with contextlib.suppress(OSError, TimeoutError, RuntimeError):
                client.close(timeout=2)

    def _identities(self) -> dict[str, Mapping[str, Any]]:
        workers: dict[str, Mapping[str, Any]] = self._call(self.client.scheduler.identity, n_workers=-1)["workers"]
        return workers

    def _check_versions(self, addresses: set[str]) -> None:
        self._checked = {address: why for address, why in self._checked.items() if address in addresses}
        fresh = sorted(addresses - self._checked.keys())
        if fresh:
            answers = self._call(self.client.run, worker_versions, workers=fresh, on_error="return")
            self._checked.update((address, difference(answer)) for address, answer in answers.items())


@cache
def worker_versions() -> dict[str, str]:
    """Runs on a worker: everything that could change a result."""
    return {**versions(), "revisions": results_revision()}


def difference(answer: object) -> str | None:
    """What makes the answer of :func:`worker_versions` differ from this process's, None if nothing does."""
    if not isinstance(answer, Mapping):
        return f"cannot run this version of sweepmill: {answer}"
    mine = worker_versions()
    names = [name for name in mine if name != "python" and answer.get(name) != mine[name]]
    return ", ".join(f"has {name} {answer.get(name)}, the service {mine[name]}" for name in names) or None


class LocalPool(_DaskPool):
    """Worker processes of this machine, one thread each, that end with this process."""

    def __init__(self, workers: int, sites: int = 1024, kernels: Sequence[str] = tuple(JOBS)) -> None:
        """So many processes, with these kernels compiled for systems of up to so many sites."""
        super().__init__()
        self._number = workers
        self._sites = sites
        self._kernels = kernels
        self._cluster: LocalCluster | None = None

    def open(self) -> None:
        """Compile the kernels once, then start the workers, which only load them."""
        compile_kernels(self._sites, self._kernels)
        dask.config.set(CONFIGURATION)
        quiet()
        try:
            self._start()
        except (OSError, TimeoutError, RuntimeError) as error:
            self.close()
            raise PoolUnavailable(f"local workers cannot be started: {error}") from error

    def _start(self) -> None:
        self._cluster = LocalCluster(
            n_workers=self._number,
            threads_per_worker=1,
            processes=True,
            host="127.0.0.1",
            dashboard_address="127.0.0.1:0",  # None would take a fixed port for Dask's own page
            scheduler_kwargs={"dashboard": False},
            worker_dashboard_address=None,
            silence_logs=logging.CRITICAL,
        )
        self._connect(self._cluster)
        self.client.register_plugin(Lifeline(os.getpid()))
        self.client.register_plugin(KernelLoader(self._sites, self._kernels))

    def close(self) -> None:
        """End the worker processes."""
        self._disconnect()
        cluster, self._cluster = self._cluster, None
        if cluster is not None:
            with contextlib.suppress(OSError, TimeoutError, RuntimeError):
                cluster.close(timeout=5)


@dataclass(frozen=True)
class Tls:
    """Files that a tls:// scheduler asks for."""

    ca: Path
    certificate: Path
    key: Path


class ExternalPool(_DaskPool):
    """Workers of a scheduler somebody else runs."""

    def __init__(self, address: str, tls: Tls | None = None) -> None:
        super().__init__()
        self._address = address
        self._tls = tls

    def open(self) -> None:
        """Connect. Raises PoolUnavailable if the scheduler does not answer."""
        dask.config.set(CONFIGURATION)
        quiet()
        try:
            self._connect(self._address, self._security())
        except (OSError, TimeoutError) as error:
            self._disconnect()
            raise PoolUnavailable(f"the scheduler at {self._address} does not answer: {error}") from error

    def close(self) -> None:
        """Disconnect."""
        self._disconnect()

    def _security(self) -> Security | None:
        if self._tls is None:
            return None
        return Security(
            tls_ca_file=str(self._tls.ca),
            tls_client_cert=str(self._tls.certificate),
            tls_client_key=str(self._tls.key),
            require_encryption=True,
        )


def compile_kernels(sites: int, kernels: Sequence[str]) -> None:
    """Compile what the cache lacks, in processes of their own, before any worker needs it."""
    try:
        compile_ahead(sites, kernels)
    except RuntimeError as error:
        raise PoolUnavailable(str(error)) from error


def quiet() -> None:
    """Dask reports each lost connection at length; the dispatcher reports what matters."""
    for name in ("distributed", "distributed.nanny", "distributed.scheduler", "distributed.core"):
        logging.getLogger(name).setLevel(logging.CRITICAL)
