"""A directory of Parquet over several processes or machines, with Dask: each task converts one file.

A thin wrapper: a task opens the store where it runs, and calls what one machine calls. Workers need the files and the
store under the same paths, and the same content in the store.
"""

from __future__ import annotations

import contextlib
import logging
import signal
from collections.abc import Iterator, Sequence
from multiprocessing import resource_tracker
from pathlib import Path
from typing import Any, NamedTuple
from uuid import uuid4

from propdb.errors import IntegrityError, PropdbError
from propdb.tables.core import Plan
from propdb.tables.extras import need
from propdb.tables.kinds import Key, Kind
from propdb.tables.progress import Progress
from propdb.tables.tally import Sample, Tally
from propdb.tables.varying import Used

__all__ = ["Counts", "convert_file", "spread"]


class Counts(NamedTuple):
    """What one file came to, without reference to the plan that counted it."""

    rows: int
    verdicts: list[tuple[str, str, int, tuple[str, int]]]  # as Tally.counts gives them
    kinds: list[tuple[Key, int]]
    settled: list[Kind]  # those of them that do not depend on T, resolved
    samples: list[Sample]
    used: list[tuple[Key, Used]]  # what kinds of rows that depend on T stand on
    read: str  # SHA-256 of the input
    written: str  # and of the output


def convert_file(plan: Plan, stamp: str, source: str, target: str, name: str) -> Counts:
    """Convert one Parquet file; what a worker runs.

    Raises
    ------
    IntegrityError
        The store of the worker is not that of the plan.
    """
    from propdb.tables.output import HashedWriter, sha256_of
    from propdb.tables.parquet import convert_parquet

    if plan.stamp != stamp:
        raise IntegrityError(
            f"the store of a worker holds {plan.stamp}, that of the run {stamp}", hint="copy one store to all machines"
        )
    tally = Tally(plan)
    place = Path(target)
    place.parent.mkdir(parents=True, exist_ok=True)
    with place.open("wb") as raw:
        out = HashedWriter(raw)
        convert_parquet(Path(source), plan, out, tally, Progress(None), share=float, file=name, overlap=False)
        out.close()
    kinds = [(plan.kinds[n].key, times) for n, times in tally.kinds.items()]
    settled = [kind for n in tally.kinds if (kind := plan.kinds[n]).varying is None]
    used = [(kind.key, kind.used()) for kind in plan.kinds if kind.varying is not None]
    hashes = sha256_of(Path(source)), out.hexdigest()
    return Counts(tally.rows, tally.counts(), kinds, settled, tally.first_samples(), used, *hashes)


_plans: dict[str, Plan] = {}


def _task(token: str, plan: Plan, stamp: str, source: str, target: str, name: str) -> Counts | PropdbError:
    """Convert with the plan that is here already, if it is: its store is open."""
    try:
        return convert_file(_plans.setdefault(token, plan), stamp, source, target, name)
    except PropdbError as error:  # as a value: Dask would retry an exception, and print it
        return error


@contextlib.contextmanager
def _client(scheduler: str | None, workers: int) -> Iterator[Any]:
    distributed = need("distributed", extra="dask", what="work on several machines")
    if scheduler is not None:
        try:
            client = distributed.Client(scheduler, timeout="10s")
        except (OSError, TimeoutError, ValueError) as error:
            why = " ".join(str(error).split())[:120]
            raise PropdbError(f"no scheduler answers: {why}", where=scheduler, hint="e.g. tcp://host:8786") from None
        with client:
            yield client
        return
    for name in ("distributed", "tornado", "asyncio"):  # what goes wrong in a task comes back as its value
        logging.getLogger(name).setLevel(logging.CRITICAL + 1)
    with contextlib.ExitStack() as stack:
        with _uninterrupted():
            try:
                cluster = distributed.LocalCluster(
                    n_workers=workers, threads_per_worker=1, processes=True, dashboard_address=":0", silence_logs=50
                )
            except (OSError, RuntimeError, TimeoutError) as error:
                raise PropdbError(
                    f"no worker could be started: {error}",
                    hint='a script that starts workers does so under: if __name__ == "__main__":',
                ) from None
            stack.callback(_close, cluster)
            client = stack.enter_context(distributed.Client(cluster))
        yield client


def _close(cluster: Any) -> None:
    with contextlib.suppress(AssertionError):  # of a worker that is closing already
        cluster.close()


@contextlib.contextmanager
def _uninterrupted() -> Iterator[None]:
    """Start processes that leave Ctrl-C to the one that waits for them, and ends them."""
    if not hasattr(signal, "pthread_sigmask"):
        yield
        return
    resource_tracker.ensure_running()  # or starting it would let the signal through again
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)


def spread(
    plan: Plan,
    files: Sequence[tuple[Path, Path, str]],
    tally: Tally,
    progress: Progress,
    *,
    scheduler: str | None,
    workers: int | None,
) -> dict[Path, str]:
    """Convert files, each (input, output, name), on a cluster; a local one of ``workers`` without a ``scheduler``.

    Returns
    -------
    dict
        The SHA-256 of every file that was read or written.

    Raises
    ------
    PropdbError
        What went wrong in a worker, or no scheduler at the address, or Dask is not installed.
    """
    stamp, token = plan.stamp, uuid4().hex
    hashes: dict[Path, str] = {}
    with _client(scheduler, workers or 2) as client:
        futures = [
            client.submit(_task, token, plan, stamp, str(a.absolute()), str(b.absolute()), name, pure=False, retries=0)
            for a, b, name in files
        ]
        for done, future in enumerate(futures, start=1):
            counts = future.result()
            if isinstance(counts, PropdbError):
                client.cancel(futures)
                raise counts
            plan.adopt(counts.settled)
            tally.merge(counts.rows, counts.verdicts, counts.kinds, counts.samples, counts.used)
            hashes[files[done - 1][0]], hashes[files[done - 1][1]] = counts.read, counts.written
            progress.step(counts.rows, done / len(files))
    return hashes
