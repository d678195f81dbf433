"""`linkwright agree --scheduler`: the report of a run on a cluster is that of the same run here, to the byte."""

from __future__ import annotations

import itertools
import math
import multiprocessing
import os
import pickle
import signal
import socket
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
from command_line import ARMS, PLOTTER, call, names_in, without_progress
from distributed import LocalCluster

from build_checks import agree_cluster
from build_checks.agree import Findings, Settings, agree, find, units, weighed
from build_checks.agree_cluster import Job, agree_on_cluster, shard_count
from build_checks.compile import NoCompilerError
from build_checks.report import Check, CheckResult, Failure, Worst, join_all
from codegen.armfile import read_arm
from codegen.emit.files import Source
from codegen.errors import CallError, CheckFailedError, Fault
from codegen.model import Arm
from codegen.options import Options
from codegen.pipeline import generate

FEW = ["--samples", "300"]
OPTIONS = Options()


@contextmanager
def a_cluster(
    folder: Path, workers: int, threads: int = 1, processes: bool = False, **more: object
) -> Iterator[LocalCluster]:
    """Workers of this machine; in threads of this process they see what a test sets."""
    with LocalCluster(
        n_workers=workers,
        threads_per_worker=threads,
        processes=processes,
        host="127.0.0.1",
        protocol="tcp://",
        dashboard_address="127.0.0.1:0",  # any free port: clusters of other tests may stand beside
        local_directory=str(folder),
        **more,
    ) as cluster:
        yield cluster


@pytest.fixture(scope="module")
def processes(tmp_path_factory: pytest.TempPathFactory) -> Iterator[LocalCluster]:
    """Two processes of two threads each, and nothing left of them."""
    with a_cluster(tmp_path_factory.mktemp("processes"), 2, 2, processes=True) as cluster:
        yield cluster
    assert multiprocessing.active_children() == []


@pytest.fixture
def threads(tmp_path: Path) -> Iterator[LocalCluster]:
    with a_cluster(tmp_path / "threads", 1, 2) as cluster:
        yield cluster


def change_the_c(monkeypatch: pytest.MonkeyPatch, old: str, new: str) -> None:
    """From here on the generated C holds `new` in the place of `old`."""

    def changed(arm: Arm, options: Options, source: Source | None = None) -> dict[str, str]:
        files = generate(arm, options, source)
        assert files["arm_kin.c"].count(old) == 1
        return files | {"arm_kin.c": files["arm_kin.c"].replace(old, new)}

    monkeypatch.setattr("codegen.pipeline.generate", changed)


def job(samples: int = 300, version: str = agree_cluster.VERSION) -> Job:
    arm = read_arm(PLOTTER).arm
    return Job(arm, generate(arm, OPTIONS), OPTIONS, Settings(samples), version)


def silent(done: int, total: int) -> None:
    """Tells nobody."""


# --- the report ---


@pytest.mark.parametrize("shards_per_thread", [1, 3])
@pytest.mark.parametrize("arm", ["slide_plotter", "tray_scara"])
def test_the_report_is_that_of_the_same_run_here(
    processes: LocalCluster, monkeypatch: pytest.MonkeyPatch, arm: str, shards_per_thread: int
) -> None:
    """To the byte, whatever the number of shards. 9000 samples: three units each of motion and of random poses."""
    monkeypatch.setattr(agree_cluster, "_SHARDS_PER_THREAD", shards_per_thread)
    run = ["agree", ARMS / f"{arm}.toml", "--samples", "9000", "--seed", "3", "--json"]
    here, there = call(*run), call(*run, "--scheduler", processes.scheduler_address)
    assert (there.status, without_progress(there.err)) == (0, "")
    assert there.out == here.out


def test_a_disagreement_is_found_and_shown_as_here(processes: LocalCluster, monkeypatch: pytest.MonkeyPatch) -> None:
    change_the_c(monkeypatch, "pose->p[0] = ", "pose->p[0] = -")
    here, there = call("agree", PLOTTER, *FEW), call("agree", PLOTTER, *FEW, "--scheduler", processes.scheduler_address)
    assert there.status == here.status == 1
    assert "joint values: " in there.out
    assert there.out == here.out


def test_c_with_another_interface_is_reported_as_here(processes: LocalCluster, monkeypatch: pytest.MonkeyPatch) -> None:
    changed = job()
    header = changed.files["arm_kin.h"]
    assert header.count("#define ARM_JOINTS   2") == 1
    changed.files["arm_kin.h"] = header.replace("#define ARM_JOINTS   2", "#define ARM_JOINTS   3")
    there = agree_on_cluster(processes.scheduler_address, changed, silent)
    assert there == agree(changed.arm, changed.files, OPTIONS, changed.settings)
    assert not there.agreed


def test_progress_counts_the_shards(threads: LocalCluster) -> None:
    seen: list[tuple[int, int]] = []
    agree_on_cluster(threads.scheduler_address, job(), lambda done, total: seen.append((done, total)))
    assert seen == [(done, 8) for done in range(9)]  # two threads, four shards each


def test_the_work_is_cut_into_shards_that_all_have_some_and_none_too_much() -> None:
    few, many = Settings(300), Settings(10_000_000)
    assert shard_count(few, 1) == 4
    assert shard_count(few, 1000) == len(units(few))
    assert 50 < len(units(many)) / shard_count(many, 1) <= 64


def test_a_numeric_inverse_is_weighed_over_the_whole_run() -> None:
    """1 of 60 solutions that is lacking decides nothing, 2 of 120 are more than the 1 % that may lack."""
    arm = job()
    part = find(arm.arm, arm.files, OPTIONS, Settings(10, processes=1))
    part = Findings(part.run, part.interface, (CheckResult(Check.KNOWN, cases=60, lacking=1),))
    assert weighed(part).agreed
    whole = weighed(part.together(part))
    assert (whole.result(Check.KNOWN).failed, whole.result(Check.INTERFACE).cases) == (2, 1)


CASES = [
    CheckResult(Check.KNOWN, 1, position=Worst(1.0, (0.5, 2.0)), failure=Failure("late", {"row": 2})),
    CheckResult(Check.KNOWN, 2, 1, position=Worst(1.0, (0.5, 1.0)), failure=Failure("early", {"row": 1})),
    CheckResult(Check.KNOWN, 4, angle=Worst(math.nan, (0.0,)), failure=Failure("early", {"row": 2})),
    CheckResult(Check.KNOWN, 8, position=Worst(0.5, (9.0, 9.0)), angle=Worst(math.inf, (-0.0,))),
    CheckResult(Check.KNOWN, 16, angle=Worst(7.0, (0.0,)), lacking=3),
]


def test_results_join_to_the_same_in_any_order() -> None:
    """Equal errors, errors that are no numbers, several failures: what stands does not depend on which came first."""
    joined = {repr(join_all(order)) for order in itertools.permutations(CASES)}
    assert len(joined) == 1
    (whole,) = join_all(CASES)
    assert (whole.cases, whole.failed, whole.lacking) == (31, 1, 3)
    assert whole.position == Worst(1.0, (0.5, 2.0))
    assert whole.failure == Failure("early", {"row": 1})


# --- errors ---


def test_no_scheduler_at_the_address(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(agree_cluster, "CONNECT_SECONDS", 1)
    with socket.socket() as taken:  # bound and not listening: nobody else gets the port
        taken.bind(("127.0.0.1", 0))
        address = f"tcp://127.0.0.1:{taken.getsockname()[1]}"
        done = call("agree", PLOTTER, *FEW, "--scheduler", address)
    assert (done.status, done.out) == (2, "")
    assert f"error: --scheduler: cannot reach {address}: " in done.err
    assert "hint: tried for 1 s; is it running" in done.err


@pytest.mark.parametrize("address", ["", "host", "tcp://127.0.0.1", "post://127.0.0.1:8786", "::"])
def test_an_address_that_is_none(address: str) -> None:
    done = call("agree", PLOTTER, *FEW, f"--scheduler={address}")
    assert (done.status, done.out) == (2, "")
    assert f"error: --scheduler: cannot reach {address}: ValueError: " in done.err
    assert len(done.err.splitlines()) == 2


def test_a_scheduler_without_workers(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(agree_cluster, "CONNECT_SECONDS", 1)
    with a_cluster(tmp_path, 0) as cluster:
        done = call("agree", PLOTTER, *FEW, "--scheduler", cluster.scheduler_address)
    assert (done.status, done.out) == (2, "")
    assert f"error: --scheduler: {cluster.scheduler_address} has no worker\n" in done.err


def test_a_worker_of_another_version_is_named(threads: LocalCluster, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("codegen.VERSION", "0.0.7")  # what the worker says; agree_cluster holds its own
    (worker,) = threads.scheduler_info["workers"]
    done = call("agree", PLOTTER, *FEW, "--scheduler", threads.scheduler_address)
    assert (done.status, done.out) == (2, "")
    assert f"error: worker {worker}: has linkwright 0.0.7, here it is {agree_cluster.VERSION}\n" in done.err


def test_a_worker_of_another_version_that_comes_late_is_named(threads: LocalCluster) -> None:
    (worker,) = threads.scheduler_info["workers"]
    with pytest.raises(CallError, match=rf"^worker {worker}: has linkwright .*, the run is of 0\.0\.7$"):
        agree_on_cluster(threads.scheduler_address, job(version="0.0.7"), silent)


def test_a_worker_without_linkwright_is_named(tmp_path: Path) -> None:
    """A worker whose Python finds no linkwright, beside a scheduler that needs none."""
    program = "import sys; sys.modules['codegen'] = sys.modules['build_checks'] = None\n"
    program += "from distributed.cli.dask_worker import main; main()"
    with a_cluster(tmp_path, 0) as cluster:
        options = ["--no-nanny", "--no-dashboard", "--nthreads", "1", "--local-directory", str(tmp_path)]
        command = [sys.executable, "-c", program, cluster.scheduler_address, *options]
        worker = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        try:
            done = call("agree", PLOTTER, *FEW, "--scheduler", cluster.scheduler_address)
            (address,) = cluster.scheduler_info["workers"]
        finally:
            worker.terminate()
            worker.wait()
    assert (done.status, done.out) == (2, "")
    assert f"error: worker {address}: cannot import linkwright: ModuleNotFoundError: " in done.err
    assert f"hint: install linkwright {agree_cluster.VERSION} there" in done.err


def test_a_worker_without_a_compiler_is_named(threads: LocalCluster, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("CC", "no-such-compiler")
    (worker,) = threads.scheduler_info["workers"]
    done = call("agree", PLOTTER, *FEW, "--scheduler", threads.scheduler_address)
    assert (done.status, done.out) == (2, "")
    assert f"error: worker {worker}: C compiler: none of no-such-compiler found\n" in done.err


def test_c_that_does_not_compile_is_one_error_of_a_worker(
    threads: LocalCluster, monkeypatch: pytest.MonkeyPatch
) -> None:
    change_the_c(monkeypatch, "pose->p[0] = ", "pose->p[0] == ;")
    (worker,) = threads.scheduler_info["workers"]
    done = call("agree", PLOTTER, *FEW, "--scheduler", threads.scheduler_address)
    assert (done.status, done.out) == (1, "")
    assert f"error: worker {worker}: " in done.err
    assert ": does not compile" in done.err
    assert "Traceback" not in done.err


def test_c_that_ends_its_worker_is_a_failed_check(tmp_path: Path) -> None:
    killing = job()
    killing.files["arm_kin.c"] = killing.files["arm_kin.c"].replace(
        "pose->p[0] = ", "*(volatile int *)0 = 0; pose->p[0] = "
    )
    with (
        a_cluster(tmp_path, 1, processes=True, scheduler_kwargs={"allowed_failures": 0}) as cluster,
        pytest.raises(CheckFailedError, match="ended the worker that called it"),
    ):
        agree_on_cluster(cluster.scheduler_address, killing, silent)


def test_a_run_ends_when_no_worker_is_left(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(agree_cluster, "ALONE_SECONDS", 1)
    with a_cluster(tmp_path, 1) as cluster, pytest.raises(CallError, match="no worker for 1 s: all ended"):
        agree_on_cluster(cluster.scheduler_address, job(200_000), once(lambda: cluster.scale(0)))


def test_a_run_ends_with_its_scheduler(tmp_path: Path, caplog: pytest.LogCaptureFixture) -> None:
    """What the client would log about it is left out: the error says it."""
    with (
        a_cluster(tmp_path, 1) as cluster,
        pytest.raises(CallError, match="the scheduler ended, or cancelled the work"),
    ):
        agree_on_cluster(cluster.scheduler_address, job(200_000), once(cluster.close))
    assert [record for record in caplog.records if record.name == "distributed.client"] == []


def once(act: Callable[[], object]) -> Callable[[int, int], None]:
    """A progress that acts when the first shard is done."""

    def progress(done: int, total: int) -> None:
        if done == 1:
            act()

    return progress


@pytest.mark.parametrize("other", [["--shard", "1/1"], ["--shard", "1/2"], ["--merge"]])
def test_one_way_to_cut_a_run_at_a_time(other: list[str]) -> None:
    done = call("agree", PLOTTER, *other, "--scheduler", "tcp://127.0.0.1:1")
    assert (done.status, done.out) == (2, "")
    assert f"error: --scheduler: cannot be used with {other[0]}\n" in done.err


def test_without_the_package_the_error_says_how_to_install_it(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "distributed", None)
    done = call("agree", PLOTTER, *FEW, "--scheduler", "tcp://127.0.0.1:1")
    assert (done.status, done.out) == (2, "")
    assert done.err == (
        "error: --scheduler: a cluster needs the package distributed, which is not installed\n"
        '  hint: install it with: pip install "linkwright[cluster]"\n'
    )


def test_an_error_comes_whole_from_another_process() -> None:
    error = NoCompilerError(Fault("here", "nothing found", "look elsewhere"), Fault("there", "nor there"))
    again = pickle.loads(pickle.dumps(error))
    assert (type(again), again.faults, str(again)) == (NoCompilerError, error.faults, str(error))


# --- long runs ---


def test_an_interrupt_cancels_what_is_not_done(processes: LocalCluster, tmp_path: Path) -> None:
    """130 is 128 + SIGINT, as shells count (POSIX.1-2017, Shell and Utilities, 2.8.2)."""
    report = ["--report", str(tmp_path / "report.json")]
    run = ["agree", str(PLOTTER), "--samples", "20000000", *report, "--scheduler", processes.scheduler_address]
    begun = subprocess.Popen(
        [sys.executable, "-m", "codegen.main", *run],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        env=os.environ | {"PYTHONUNBUFFERED": "1"},
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.default_int_handler),  # some parents ignore it
    )
    assert begun.stderr is not None
    deadline = time.monotonic() + 60
    while begun.poll() is None and time.monotonic() < deadline and not begun.stderr.readline().startswith("checking"):
        pass
    begun.send_signal(signal.SIGINT)
    _, err = begun.communicate(timeout=60)
    assert begun.returncode == 130
    assert "Traceback" not in err
    assert names_in(tmp_path) == []
    while processes.scheduler.tasks and time.monotonic() < deadline:  # a shard that has begun is finished
        time.sleep(0.05)
    assert not processes.scheduler.tasks
