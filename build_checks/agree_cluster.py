"""`linkwright agree --scheduler`: the shards of a run on the workers of a dask.distributed scheduler.

A task is one shard of the run, as `--shard` would do it, in one thread of a worker: it compiles the C on the worker's
machine and checks it there. What the shards count joins in any order to the same report, so the number of shards, the
machines and the order in which they finish leave no trace in it (but numpy's sines on unlike processors, which may
differ in the last digit of the reference). Nothing is installed on the cluster: every worker
needs linkwright of the same version and a C compiler. The scheduler needs neither: it unpacks tasks, so these name
linkwright's functions by texts that only the workers resolve.
"""

from __future__ import annotations

import importlib.util
import logging
import math
import operator
import pickle
import pkgutil
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, replace
from queue import Empty, Queue
from typing import TYPE_CHECKING, Any

from build_checks.agree import Findings, Progress, Settings, find, units, weighed
from build_checks.compile import find_compiler
from build_checks.report import AgreeReport
from codegen import VERSION
from codegen.errors import CallError, CheckFailedError, Fault, LinkwrightError
from codegen.model import Arm
from codegen.options import Options

if TYPE_CHECKING:
    from distributed import Client, Future

CONNECT_SECONDS = 10  # to reach the scheduler, and for a first worker to come
ALONE_SECONDS = 60  # without any worker before a run is given up: a worker that ended may be started again
_SHARDS_PER_THREAD = 4  # so that quick workers help slow ones out
_UNITS_PER_SHARD = 64  # at most: what a lost worker loses, and a worker still finishes after an interrupt
_WHERE = "--scheduler"


@dataclass(frozen=True, slots=True)
class Job:
    """All that a shard is a function of, beside its number."""

    arm: Arm
    files: dict[str, str]
    options: Options
    settings: Settings
    version: str = VERSION


def require_distributed() -> None:
    """CallError where the package that talks to the scheduler is not installed."""
    if importlib.util.find_spec("distributed") is None:
        hint = 'install it with: pip install "linkwright[cluster]"'
        raise CallError(Fault(_WHERE, "a cluster needs the package distributed, which is not installed", hint))


def agree_on_cluster(address: str, job: Job, progress: Progress) -> AgreeReport:
    """The report that `agree` gives, worked out on a cluster.

    Raises CallError where the scheduler cannot be reached or a worker is not fit for the work, and what `agree` raises,
    naming the worker. Work that is not done when this ends, by an error or an interrupt too, is cancelled.
    """
    require_distributed()
    with _connected(address) as client:
        threads = _threads_of_fit_workers(client, address)
        whole: Findings | None = None
        for found in _found(client, job, shard_count(job.settings, threads), progress):
            whole = whole.together(found) if whole else found
    assert whole is not None  # there is at least one shard
    return weighed(whole)


def shard_count(settings: Settings, threads: int) -> int:
    """A few for each thread, none of them long, none without work."""
    work = len(units(settings))
    return max(min(_SHARDS_PER_THREAD * threads, work), math.ceil(work / _UNITS_PER_SHARD))


@contextmanager
def _connected(address: str) -> Iterator[Client]:
    """A client that leaves the settings of the process and its log alone: what goes wrong is said once, by an error.

    When it closes, the scheduler drops every task that nobody else waits for.
    """
    from distributed import Client
    from distributed.comm.addressing import resolve_address

    with _quiet("distributed", "distributed.client"):
        try:
            resolve_address(address)  # a client that fails on a malformed address is not closed whole
            client = Client(address, timeout=CONNECT_SECONDS, set_as_default=False)
        except (OSError, ValueError, TypeError, RuntimeError) as error:
            hint = f"tried for {CONNECT_SECONDS} s; is it running, and is this its address, as in tcp://host:8786?"
            raise CallError(Fault(_WHERE, f"cannot reach {address}: {_line(error)}", hint)) from None
        with client:
            yield client


@contextmanager
def _quiet(*loggers: str) -> Iterator[None]:
    logs = [logging.getLogger(name) for name in loggers]
    levels = [log.level for log in logs]
    for log in logs:
        log.setLevel(logging.CRITICAL + 1)
    try:
        yield
    finally:
        for log, level in zip(logs, levels, strict=True):
            log.setLevel(level)


# --- what the cluster is like ---


def _threads_of_fit_workers(client: Client, address: str) -> int:
    """How many threads all workers have. CallError names every worker that is not fit, and why."""
    try:
        client.wait_for_workers(1, timeout=CONNECT_SECONDS)
    except TimeoutError:
        hint = f"waited {CONNECT_SECONDS} s; start some, where linkwright is installed: dask worker {address}"
        raise CallError(Fault(_WHERE, f"{address} has no worker", hint)) from None
    versions = client.run(pkgutil.resolve_name, "codegen:VERSION", on_error="return")
    faults = [fault for worker, found in sorted(versions.items()) for fault in _version_faults(worker, found)]
    if not faults:
        compilers = client.run(find_compiler, on_error="return")
        faults = [fault for worker, found in sorted(compilers.items()) for fault in _compiler_faults(worker, found)]
    if faults:
        raise CallError(*faults)
    return sum(client.nthreads().values())


def _version_faults(worker: str, found: object) -> list[Fault]:
    """`found` is a version, or the error that asking for it ended in."""
    if found == VERSION:
        return []
    hint = f"install linkwright {VERSION} there"
    if isinstance(found, Exception):
        missing = isinstance(found, (ImportError, AttributeError))
        what = "cannot import linkwright" if missing else "does not say which linkwright it has"
        return [Fault(f"worker {worker}", f"{what}: {_line(found)}", hint)]
    return [Fault(f"worker {worker}", f"has linkwright {found}, here it is {VERSION}", hint)]


def _compiler_faults(worker: str, found: object) -> list[Fault]:
    if isinstance(found, LinkwrightError):
        return [replace(fault, where=f"worker {worker}: {fault.where}") for fault in found.faults]
    return [Fault(f"worker {worker}", _line(found))] if isinstance(found, Exception) else []


# --- the work ---


def find_on_worker(shard: tuple[int, int], job: Job) -> Findings:
    """One task: a shard of the run. Its errors name the worker."""
    from distributed import get_worker

    worker = get_worker().address
    if job.version != VERSION:  # it came after the others were asked
        raise CallError(Fault(f"worker {worker}", f"has linkwright {VERSION}, the run is of {job.version}"))
    try:
        return find(job.arm, job.files, job.options, replace(job.settings, shard=shard, processes=1))
    except LinkwrightError as error:
        raise type(error)(
            *(replace(fault, where=f"worker {worker}: {fault.where}") for fault in error.faults)
        ) from None


def _found(client: Client, job: Job, shards: int, progress: Progress) -> Iterator[Findings]:
    """What each shard found, as they finish."""
    function = client.submit(pkgutil.resolve_name, f"{__name__}:{find_on_worker.__name__}", pure=False)
    sent = client.submit(pickle.loads, pickle.dumps(job), pure=False)
    numbers = [(number, shards) for number in range(1, shards + 1)]
    futures = client.map(operator.call, [function] * shards, numbers, [sent] * shards, pure=False, key="linkwright")
    finished: Queue[Future[Any]] = Queue()
    for future in futures:
        future.add_done_callback(finished.put)
    progress(0, shards)
    for done in range(1, shards + 1):
        future = _next(client, finished)
        yield _result(future)
        future.release()
        progress(done, shards)


def _next(client: Client, finished: Queue[Future[Any]]) -> Future[Any]:
    """Waits for a shard, and gives up where nobody is left who could finish one."""
    alone_since = math.inf
    while True:
        try:
            return finished.get(timeout=1)
        except Empty:
            alone_since = math.inf if _any_worker(client) else min(alone_since, time.monotonic())
            if time.monotonic() - alone_since > ALONE_SECONDS:
                hint = "run again when they are back"
                raise CallError(Fault(_WHERE, f"no worker for {ALONE_SECONDS} s: all ended", hint)) from None


def _any_worker(client: Client) -> bool:
    try:
        return bool(client.nthreads())
    except OSError:
        raise _lost() from None


def _result(future: Future[Any]) -> Findings:
    from distributed import CancelledError, KilledWorker

    if future.status == "cancelled":
        raise _lost()
    if future.status != "error":
        try:
            found: Findings = future.result()
        except (CancelledError, OSError):
            raise _lost() from None
        return found
    error = future.exception()
    if isinstance(error, KilledWorker):
        hint = "a wild pointer, or a worker with too little memory?"
        raise CheckFailedError(Fault("compiled C", "ended the worker that called it", hint))
    if isinstance(error, (ImportError, OSError)):
        raise CallError(Fault(_WHERE, f"a worker cannot do its part: {_line(error)}"))
    raise error  # the user's to mend, or a fault of linkwright, which keeps its traceback


def _lost() -> CallError:
    return CallError(Fault(_WHERE, "the scheduler ended, or cancelled the work", "run again when it is back"))


def _line(error: BaseException) -> str:
    """An error as one line."""
    text = " ".join(str(error).split())
    return f"{type(error).__name__}: {text}" if text else type(error).__name__
