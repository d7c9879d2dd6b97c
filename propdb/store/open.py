"""Opening a store: plain ``sqlite3``, and one clear line for whatever is wrong with the file."""

from __future__ import annotations

import contextlib
import errno
import os
import sqlite3
from pathlib import Path
from types import TracebackType

from propdb.errors import IntegrityError, InvalidInput, PropdbError, StoreBusy, StoreError, StoreReadOnly

__all__ = ["APPLICATION_ID", "SCHEMA", "check_place", "default_path", "mapped", "open_store", "translate"]

#: "prdb" in the header of the file says that the SQLite file is a propdb store.
APPLICATION_ID = 0x70726462
#: Number of the newest migration in ``schema/``.
SCHEMA = 3
#: The first SQLite with STRICT tables.
SQLITE_NEEDED = (3, 37, 0)

_MAGIC = b"SQLite format 3\x00"
_TIMEOUT = 10.0


def default_path() -> Path:
    """Where the store is unless told otherwise: ``PROPDB_STORE``, else ``propdb.db`` in the user-data directory."""
    given = os.environ.get("PROPDB_STORE")
    if given:
        return Path(given)
    import platformdirs

    return Path(platformdirs.user_data_dir("propdb", appauthor=False)) / "propdb.db"


def translate(error: BaseException, path: str | os.PathLike[str]) -> PropdbError | None:
    """The propdb error for one of ``sqlite3`` or the file system; None for anything else."""
    where = f"store {os.fspath(path)}"
    if isinstance(error, UnicodeEncodeError):
        return InvalidInput("a text that is not Unicode cannot be stored", where=where)
    if isinstance(error, OSError):
        problem = error.strerror or str(error)
        if isinstance(error, PermissionError) or error.errno == errno.EROFS:
            return StoreReadOnly(f"cannot be written: {problem}", where=where, reason="read-only", hint=_HINT_WRITABLE)
        return StoreError(problem, where=where, reason="file-system")
    if not isinstance(error, sqlite3.Error):
        return None
    extended: int = getattr(error, "sqlite_errorcode", sqlite3.SQLITE_ERROR)
    code = extended & 0xFF
    text = str(error)
    if code in (sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED):
        return StoreBusy(
            "another process is writing to it", where=where, reason="busy", hint="try again when it has finished"
        )
    if code in (sqlite3.SQLITE_READONLY, sqlite3.SQLITE_PERM):
        return StoreReadOnly("cannot be written", where=where, reason="read-only", hint=_HINT_WRITABLE)
    if code == sqlite3.SQLITE_CANTOPEN:
        return _cannot_open(path, where)
    if code == sqlite3.SQLITE_FULL:
        return StoreError(
            "the disk is full", where=where, reason="full", hint="nothing was changed; make room and try again"
        )
    if code == sqlite3.SQLITE_NOTADB:
        return StoreError("not a propdb store (not an SQLite file)", where=where, reason="not-sqlite", hint=_move(path))
    if code == sqlite3.SQLITE_CORRUPT:
        return StoreError("the file is damaged or truncated", where=where, reason="damaged", hint=_restore(path))
    if code == sqlite3.SQLITE_CONSTRAINT:
        if extended == sqlite3.SQLITE_CONSTRAINT_TRIGGER:
            return IntegrityError(text, where=where, hint="record a new entry or event")
        return InvalidInput(f"refused by the store: {text}", where=where)
    if code == sqlite3.SQLITE_IOERR:
        return StoreError(f"the disk reports an error: {text}", where=where, reason="io")
    return StoreError(text, where=where, reason="sqlite")


class mapped:
    """Context in which no ``sqlite3`` exception escapes: ``with mapped(path): ...`` raises StoreError, StoreBusy ..."""

    __slots__ = ("path",)

    def __init__(self, path: str | os.PathLike[str]) -> None:
        self.path = path

    def __enter__(self) -> None:
        return None

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if error is not None and not isinstance(error, PropdbError):
            better = translate(error, self.path)
            if better is not None:
                raise better from error


_HINT_WRITABLE = "check the permissions of the file and its directory, or name another with --store"


def _rebuild(path: str | os.PathLike[str]) -> str:
    return f"`propdb store rebuild --store {os.fspath(path)}`"


def _move(path: str | os.PathLike[str]) -> str:
    return f"name a store, or move the file away and type {_rebuild(path)}"


def _restore(path: str | os.PathLike[str]) -> str:
    return f"put a backup in its place, or move the file away and type {_rebuild(path)}"


def _cannot_open(path: str | os.PathLike[str], where: str) -> StoreError:
    parent = Path(path).parent
    if not parent.exists():
        return StoreError(f"there is no directory {parent}", where=where, reason="missing")
    if not os.access(parent, os.W_OK):
        return StoreReadOnly("its directory cannot be written", where=where, reason="read-only", hint=_HINT_WRITABLE)
    return StoreError("cannot be opened", where=where, reason="file-system", hint=_HINT_WRITABLE)


def _look(path: Path, *, create: bool) -> None:
    """What can be said before SQLite sees the file."""
    where = f"store {path}"
    try:
        size = path.stat().st_size
    except (FileNotFoundError, NotADirectoryError):
        if create:
            with mapped(path):
                path.parent.mkdir(parents=True, exist_ok=True)
            return
        raise StoreError(
            "there is no such file", where=where, reason="missing", hint=f"type {_rebuild(path)}"
        ) from None
    except ValueError as error:
        raise InvalidInput(f"{str(path)!r} cannot be a path: {error}") from error
    except OSError as error:
        raise StoreError(error.strerror or str(error), where=where, reason="file-system") from error
    if path.is_dir():
        raise StoreError("is a directory", where=where, reason="file-system", hint="name the file in it")
    if size == 0:
        if not create:
            raise StoreError("the file is empty", where=where, reason="empty", hint=f"type {_rebuild(path)}")
        return
    try:
        with path.open("rb") as file:
            head = file.read(512)
    except OSError as error:
        raise StoreError(f"cannot be read: {error.strerror}", where=where, reason="unreadable") from error
    if not head.startswith(_MAGIC):
        raise StoreError("not a propdb store (not an SQLite file)", where=where, reason="not-sqlite", hint=_move(path))
    if size < 512 or _cut_short(path, head):
        raise StoreError("the file is damaged or truncated", where=where, reason="damaged", hint=_restore(path))


def check_place(path: Path) -> None:
    """Refuse a place where no store can be built before the work of building one; make its directory.

    Raises
    ------
    StoreError
        The directory cannot be made or written, or what is there is no store.
    """
    _look(path, create=True)
    if not path.exists() and not os.access(path.parent, os.W_OK):
        raise _cannot_open(path, f"store {path}")


def _cut_short(path: Path, head: bytes) -> bool:
    """Is the file shorter than its header says? SQLite does not notice when less than a page is missing.

    See "The Database Header" in the SQLite file format. While changes lie beside the file, its header may be ahead.
    """
    if head[24:28] != head[92:96]:  # the count of pages is not valid
        return False
    page = int.from_bytes(head[16:18], "big")
    whole = int.from_bytes(head[28:32], "big") * (65536 if page == 1 else page)
    for beside in ("-wal", "-journal"):
        with contextlib.suppress(OSError):
            if os.stat(f"{path}{beside}").st_size:
                return False
    return path.stat().st_size < whole


def _connect(uri: str, timeout: float) -> sqlite3.Connection:
    conn = sqlite3.connect(uri, uri=True, timeout=timeout, isolation_level=None, cached_statements=256)
    try:
        conn.execute("PRAGMA foreign_keys = ON")
        conn.execute("SELECT 1 FROM sqlite_master LIMIT 1").fetchone()  # touches the file
    except BaseException:
        conn.close()
        raise
    return conn


def _connect_read_only(path: Path, timeout: float) -> sqlite3.Connection:
    """Read-only; also a WAL store in a directory that cannot be written, where SQLite can make no shared memory."""
    uri = path.absolute().as_uri()
    try:
        return _connect(f"{uri}?mode=ro", timeout)
    except sqlite3.OperationalError as error:
        code: int = error.sqlite_errorcode & 0xFF
        if code not in (sqlite3.SQLITE_CANTOPEN, sqlite3.SQLITE_READONLY):
            raise
        wal = Path(f"{path}-wal")
        if wal.exists() and wal.stat().st_size:
            raise StoreReadOnly(
                "a writer left changes beside it, and its directory cannot be written to take them in",
                where=f"store {path}",
                reason="read-only",
                hint=f"copy it together with {wal.name} to a directory that can be written",
            ) from error
        # No one who has it open now can be writing: the shared memory would be there. Such a reader does not see
        # what is written later, and must not stay open for long.
        return _connect(f"{uri}?mode=ro&immutable=1", timeout)


def check_schema(conn: sqlite3.Connection, path: str | os.PathLike[str], *, write: bool) -> int:
    """The schema number, after refusing another program's file and a schema from the future.

    0 is an empty file, refused unless ``write``.
    """
    where = f"store {os.fspath(path)}"
    application: int = conn.execute("PRAGMA application_id").fetchone()[0]
    number: int = conn.execute("PRAGMA user_version").fetchone()[0]
    if application != APPLICATION_ID:
        empty = application == 0 and conn.execute("SELECT 1 FROM sqlite_master LIMIT 1").fetchone() is None
        if not empty:
            raise StoreError(
                "an SQLite file of another program", where=where, reason="other-application", hint="name a propdb store"
            )
        number = 0
    if number > SCHEMA:
        raise StoreError(
            f"its schema is number {number}, and this propdb knows up to {SCHEMA}",
            where=where,
            reason="newer-schema",
            hint="use a newer propdb, or another store",
        )
    if number < SCHEMA and not write:
        if number == 0:
            raise StoreError("not built yet", where=where, reason="empty", hint=f"type {_rebuild(path)}")
        raise StoreError(
            f"its schema is number {number}, and this propdb needs {SCHEMA}",
            where=where,
            reason="older-schema",
            hint=f"type {_rebuild(path)}; own data and the log are kept",
        )
    return number


def open_store(
    path: str | os.PathLike[str], *, write: bool = False, create: bool = False, timeout: float = _TIMEOUT
) -> sqlite3.Connection:
    """Open a store.

    Parameters
    ----------
    path : path
    write : bool
        Open for writing: WAL, pending migrations applied. Otherwise read-only.
    create : bool
        With ``write``: make the file (and its directory) where there is none.
    timeout : float
        How long to wait for another writer [s].

    Returns
    -------
    sqlite3.Connection
        In autocommit mode, foreign keys on.

    Raises
    ------
    StoreError
        With ``fields["reason"]``: ``missing``, ``empty``, ``not-sqlite``, ``other-application``, ``damaged``,
        ``newer-schema``, ``older-schema``, ``unreadable``, ``file-system``, ``old-sqlite``.
    StoreBusy, StoreReadOnly
    """
    file = Path(path)
    if sqlite3.sqlite_version_info < SQLITE_NEEDED:
        needed = ".".join(map(str, SQLITE_NEEDED[:2]))
        raise StoreError(f"SQLite {sqlite3.sqlite_version} is too old", hint=f"{needed} or newer", reason="old-sqlite")
    _look(file, create=write and create)
    with mapped(file):
        if not write:
            conn = _connect_read_only(file, timeout)
        else:
            conn = _connect(f"{file.absolute().as_uri()}?mode={'rwc' if create else 'rw'}", timeout)
        try:
            number = check_schema(conn, file, write=write)
            if write:
                if not os.access(file, os.W_OK):  # SQLite would open it read-only and say so at the first write
                    raise StoreReadOnly(
                        "cannot be written", where=f"store {file}", reason="read-only", hint=_HINT_WRITABLE
                    )
                from propdb.store import migrate

                migrate.use_wal(conn, timeout)
                if number < SCHEMA:
                    migrate.migrate(conn, file)
        except BaseException:
            with contextlib.suppress(sqlite3.Error):
                conn.close()
            raise
    return conn


def path_of(conn: sqlite3.Connection) -> str:
    """The file behind a connection, for messages."""
    with contextlib.suppress(sqlite3.Error):
        row = conn.execute("PRAGMA database_list").fetchone()
        if row and row[2]:
            return str(row[2])
    return ":memory:"
