"""Parquet: reading and writing overlap, in a thread each; the conversion stands between them."""

from __future__ import annotations

import base64
import threading
from collections.abc import Callable, Iterator
from contextlib import suppress
from functools import partial
from pathlib import Path
from queue import Queue
from typing import TYPE_CHECKING, Any

from propdb.errors import InvalidInput
from propdb.tables.batches import added_fields, check_types, convert_arrow
from propdb.tables.buffers import arrow
from propdb.tables.extras import need
from propdb.tables.output import HashedWriter
from propdb.tables.progress import Progress
from propdb.tables.tally import Tally

if TYPE_CHECKING:
    from propdb.tables.core import Plan

__all__ = ["convert_parquet", "open_parquet", "parquet_files"]

_BATCH = 1 << 16
_AHEAD = 4
_DONE = object()


def parquet_files(directory: Path) -> list[Path]:
    """The Parquet files below a directory, sorted. Raises InvalidInput where there is none."""
    files = sorted(p for p in directory.rglob("*.parquet") if p.is_file())
    if not files:
        raise InvalidInput("the directory holds no *.parquet", where=str(directory))
    return files


def open_parquet(path: Path, *, keys: Any = None) -> Any:
    """A Parquet file with its footer read; ``keys`` are columns to read as dictionaries.

    Raises
    ------
    InvalidInput
        Not Parquet, or a file that ends early.
    """
    pa = arrow()
    pq = need("pyarrow.parquet", extra="tables", what="Parquet")
    try:
        return pq.ParquetFile(path, read_dictionary=keys, memory_map=False, pre_buffer=False, buffer_size=1 << 20)
    except (pa.ArrowInvalid, OSError) as error:
        raise unreadable(path, error) from None


def unreadable(path: Path, error: Exception) -> InvalidInput:
    """A damaged file as one line."""
    why = " ".join(str(error).split())
    why = why if len(why) <= 120 else why[:117] + "..."
    return InvalidInput(f"cannot be read as Parquet: {why}", where=str(path), hint="is the file complete?")


def _key_names(schema: Any, plan: Plan) -> list[str]:
    """Text columns that are looked up row by row; they are cheap to read as dictionaries."""
    types = arrow().types
    names = []
    for role in ("species", "datum", "phase", "form", "stream", "side"):
        column = plan.layout.get(role)
        if column is not None and types.is_string(schema.field(column.index).type):
            names.append(schema.field(column.index).name)
    return names


def convert_parquet(
    path: Path,
    plan: Plan,
    out: HashedWriter,
    tally: Tally,
    progress: Progress,
    *,
    share: Callable[[float], float],
    file: str = "",
    overlap: bool = True,
) -> None:
    """Convert one file to ``out``.

    Without ``overlap`` everything happens in the thread of the caller, which is what a worker among many wants.
    """
    pa = arrow()
    pq = need("pyarrow.parquet", extra="tables", what="Parquet")
    schema = open_parquet(path).schema_arrow
    check_types(schema, plan, where=path.name)
    given = open_parquet(path, keys=_key_names(schema, plan) or None)
    total = max(given.metadata.num_rows, 1)
    codec = given.metadata.row_group(0).column(0).compression if given.metadata.num_row_groups else "SNAPPY"
    whole = pa.schema([*schema, *added_fields(schema, plan)], metadata=schema.metadata)
    inner = pa.schema([*given.schema_arrow, *added_fields(schema, plan)], metadata=schema.metadata)
    floats = [f.name for f in whole if pa.types.is_floating(f.type)]
    dictionaries = [f.name for f in inner if not pa.types.is_floating(f.type)]
    dictionaries += [f.name for f in added_fields(schema, plan)[1:]]
    plain = set(floats) - set(dictionaries)
    writer = pq.ParquetWriter(
        out,
        inner,
        compression="NONE" if codec == "UNCOMPRESSED" else codec,
        use_dictionary=[n for n in dictionaries if n not in plain],
        store_schema=False,
        write_statistics=True,
        write_batch_size=1 << 13,
    )
    source = given.iter_batches(batch_size=_BATCH, use_threads=False)
    batches = _Ahead(source) if overlap else None
    done = 0

    def converted() -> Iterator[Any]:
        nonlocal done
        for batch in source if batches is None else batches:
            new, what = convert_arrow(batch, plan)
            tally.add(what.given, what.rows, what.verdicts, partial(_same, what.h), first=done + 1, file=file)
            done += batch.num_rows
            progress.step(batch.num_rows, share(done / total))
            yield new

    behind = _Writer(writer) if overlap else None
    try:
        for batch in converted():
            (writer.write_batch if behind is None else behind.write)(batch)
        if behind is not None:
            behind.finish()
        # what readers take for the types: those of the input, not of our dictionaries
        text = base64.b64encode(_serialized(whole))
        writer.add_key_value_metadata({"ARROW:schema": text.decode()})
        writer.close()
    except (pa.ArrowInvalid, pa.ArrowNotImplementedError) as error:
        raise unreadable(path, error) from None
    except OSError as error:
        if error.errno is None:
            raise unreadable(path, error) from None
        raise
    finally:
        if batches is not None:
            batches.close()
        if behind is not None:
            behind.stop()
        if writer.is_open:  # something went wrong: the file is thrown away
            with suppress(Exception):
                writer.close()


def _same(h: Any) -> Any:
    return h


def _serialized(schema: Any) -> bytes:
    return bytes(schema.serialize().to_pybytes())


class _Ahead:
    """An iterator that is read ahead in a thread."""

    def __init__(self, source: Iterator[Any]) -> None:
        self._queue: Queue[Any] = Queue(_AHEAD)
        self._stop = threading.Event()
        self._thread = threading.Thread(target=self._run, args=(source,), name="propdb-reader", daemon=True)
        self._thread.start()

    def _run(self, source: Iterator[Any]) -> None:
        try:
            for item in source:
                if self._stop.is_set():
                    return
                self._queue.put(item)
            self._queue.put(_DONE)
        except BaseException as error:  # noqa: BLE001  (it is raised where the items are wanted)
            self._queue.put(error)

    def __iter__(self) -> Iterator[Any]:
        while True:
            item = self._queue.get()
            if item is _DONE:
                return
            if isinstance(item, BaseException):
                raise item
            yield item

    def close(self) -> None:
        """End the thread, whatever it has not read yet."""
        self._stop.set()
        while self._thread.is_alive():
            while not self._queue.empty():
                self._queue.get_nowait()
            self._thread.join(0.01)


class _Writer:
    """A Parquet writer in a thread of its own."""

    def __init__(self, writer: Any) -> None:
        self._writer = writer
        self._queue: Queue[Any] = Queue(_AHEAD)
        self._error: BaseException | None = None
        self._thread = threading.Thread(target=self._run, name="propdb-writer", daemon=True)
        self._thread.start()

    def _run(self) -> None:
        while (batch := self._queue.get()) is not _DONE:
            if self._error is None:
                try:
                    self._writer.write_batch(batch)
                except BaseException as error:  # noqa: BLE001  (it is raised by the next call of write)
                    self._error = error

    def write(self, batch: Any) -> None:
        """Hand over a batch. Raises what went wrong with an earlier one."""
        if self._error is not None:
            raise self._error
        self._queue.put(batch)

    def finish(self) -> None:
        """Wait until everything is written."""
        self.stop()
        if self._error is not None:
            raise self._error

    def stop(self) -> None:
        if self._thread.is_alive():
            self._queue.put(_DONE)
            self._thread.join()
