"""The SQLite file behind a plan: its identity, its two tables, one transaction per save."""

from __future__ import annotations

import json
import os
import sqlite3
import struct
from collections.abc import Iterator
from contextlib import closing, contextmanager
from pathlib import Path

from planner.base.errors import CallError, PlanFileError
from planner.base.text import _
from planner.planfile.blobs import Blob, checksum
from planner.planfile.damage import Damage, FileLimits, plan_file_error

# "RWpl", written into the header so that other programs' databases are told apart.
APPLICATION_ID = 0x5257706C
# Raised when a file of the new kind could be misread by an older program.
FORMAT_VERSION = 1

_TABLES = {
    "texts": "CREATE TABLE texts (name TEXT PRIMARY KEY, json TEXT NOT NULL, checksum TEXT NOT NULL)",
    "blobs": "CREATE TABLE blobs (key TEXT PRIMARY KEY, checksum TEXT NOT NULL, data BLOB NOT NULL)",
}
_MAGIC = b"SQLite format 3\x00"
_HEADER = 100
_WAIT_SECONDS = 5.0


def text_checksum(name: str, text: str) -> str:
    """Digest of a text and of the name it stands under."""
    return checksum(f"{name}\0{text}".encode("utf-8", "surrogatepass"))


def check_identity(path: Path) -> None:
    """Raise PlanFileError unless the header is that of a plan file this version can read."""
    try:
        with path.open("rb") as file:
            head = file.read(_HEADER)
    except OSError as error:
        raise PlanFileError(
            _("the plan file cannot be opened ({reason}).").format(reason=error.strerror or error),
            place=str(path),
            remedy=_("Check the name and the rights of the file."),
        ) from error
    if len(head) < _HEADER or not head.startswith(_MAGIC):
        raise PlanFileError(
            _("this is not a plan file of this program."),
            place=str(path),
            remedy=_("Open a .rangewright file, or choose another name to save under."),
        )
    version, application = struct.unpack(">i", head[60:64])[0], struct.unpack(">i", head[68:72])[0]
    if application != APPLICATION_ID:
        raise PlanFileError(
            _("this is a database of another program."),
            place=str(path),
            remedy=_("Open a .rangewright file, or choose another name to save under."),
        )
    if version > FORMAT_VERSION:
        raise PlanFileError(
            _("the plan file has format {found}; this version of the program reads up to {ours}.").format(
                found=version, ours=FORMAT_VERSION
            ),
            place=str(path),
            remedy=_("Open it with a newer version of the program."),
        )
    if version < 1:
        raise plan_file_error(path, _("format {found} does not exist").format(found=version))


@contextmanager
def _connected(path: Path, create: bool, limits: FileLimits) -> Iterator[sqlite3.Connection]:
    """An open connection; SQLite's errors become ours."""
    # A journal left by a killed save can only be rolled back where writing is allowed.
    writable = create or (os.access(path, os.W_OK) and os.access(path.parent, os.W_OK))
    mode = "rwc" if create else "rw" if writable else "ro"
    try:
        connection = sqlite3.connect(
            f"{path.absolute().as_uri()}?mode={mode}", uri=True, timeout=_WAIT_SECONDS, isolation_level=None
        )
        with closing(connection):
            connection.setlimit(sqlite3.SQLITE_LIMIT_LENGTH, limits.blob_bytes)
            connection.execute("PRAGMA trusted_schema = OFF")
            connection.execute("PRAGMA cell_size_check = ON")
            yield connection
    except sqlite3.OperationalError as error:
        # Errors that Python's own module raises carry no name.
        name = getattr(error, "sqlite_errorname", "")
        if name.startswith(("SQLITE_BUSY", "SQLITE_LOCKED")):
            raise CallError(
                _("another program is writing the plan file."),
                place=str(path),
                remedy=_("Try again when it is done."),
            ) from error
        if name.startswith(("SQLITE_FULL", "SQLITE_READONLY", "SQLITE_CANTOPEN")):
            raise CallError(
                _("the plan file cannot be written or opened ({reason}).").format(reason=error),
                place=str(path),
                remedy=_("Check the folder's rights and free space; the file holds the last saved state."),
            ) from error
        raise plan_file_error(path, str(error)) from error
    except (sqlite3.Error, UnicodeError) as error:
        raise plan_file_error(path, str(error)) from error
    except Damage as error:
        raise plan_file_error(path, str(error)) from error


def _check_schema(connection: sqlite3.Connection) -> None:
    """Only our two tables, word for word: no views, no triggers, nothing that runs."""
    found = connection.execute(
        "SELECT type, name, sql FROM sqlite_master WHERE NOT (type = 'index' AND sql IS NULL) LIMIT 10"
    ).fetchall()
    wanted = {("table", name, sql) for name, sql in _TABLES.items()}
    if set(found) != wanted or len(found) != len(wanted):
        raise Damage("its tables are not those of a plan file")


def _plan_of_saving(connection: sqlite3.Connection, texts: dict[str, str], blobs: dict[str, Blob]) -> None:
    """Bring both tables to the new contents, touching only what differs."""
    old = {key for (key,) in connection.execute("SELECT key FROM blobs")}
    # What goes first leaves its pages to what comes.
    connection.executemany("DELETE FROM blobs WHERE key = ?", [(key,) for key in sorted(old - set(blobs))])
    for key in sorted(set(blobs) - old):
        data = blobs[key].data()
        connection.execute("INSERT INTO blobs VALUES (?, ?, ?)", (key, checksum(data), data))
    before = dict(connection.execute("SELECT name, json FROM texts").fetchall())
    for name in sorted(set(before) - set(texts)):
        connection.execute("DELETE FROM texts WHERE name = ?", (name,))
    for name, text in texts.items():
        if before.get(name) != text:
            row = (name, text, text_checksum(name, text))
            connection.execute("INSERT OR REPLACE INTO texts VALUES (?, ?, ?)", row)


def write_database(
    path: Path, texts: dict[str, str], blobs: dict[str, Blob], create: bool, limits: FileLimits
) -> None:
    """Replace the contents of the file in one transaction; ``create``: the file is new.

    Killed at any moment, the file holds the old contents or the new ones (rollback journal).
    """
    with _connected(path, create, limits) as connection:
        # Removed costs must not linger in the free pages of a file that is mailed.
        connection.execute("PRAGMA secure_delete = ON")
        connection.execute("PRAGMA journal_mode = DELETE")
        connection.execute("PRAGMA synchronous = FULL")
        connection.execute("BEGIN IMMEDIATE")
        try:
            if create:
                connection.execute(f"PRAGMA application_id = {APPLICATION_ID}")
                for sql in _TABLES.values():
                    connection.execute(sql)
            else:
                _check_schema(connection)
            connection.execute(f"PRAGMA user_version = {FORMAT_VERSION}")
            _plan_of_saving(connection, texts, blobs)
            connection.execute("COMMIT")
        except BaseException:
            if connection.in_transaction:
                connection.execute("ROLLBACK")
            raise


class Fetched:
    """What was read in one transaction: texts, and blobs on demand while the file is open."""

    def __init__(self, connection: sqlite3.Connection, limits: FileLimits) -> None:
        self._connection, self._limits = connection, limits

    def texts(self) -> dict[str, object]:
        """Every text row, parsed.  Raises Damage."""
        sizes = self._connection.execute(
            "SELECT name, length(CAST(json AS BLOB)) FROM texts LIMIT ?", (self._limits.rows + 1,)
        ).fetchall()
        if any(not isinstance(name, str) or not isinstance(size, int) for name, size in sizes):
            raise Damage("a text without a name or content")
        if len(sizes) > self._limits.rows or any(size > self._limits.json_bytes for _name, size in sizes):
            raise Damage(f"more than {self._limits.rows} texts or {self._limits.json_bytes} bytes in one")
        found = {}
        for name, text, digest in self._connection.execute("SELECT name, json, checksum FROM texts"):
            if not isinstance(text, str) or text_checksum(name, text) != digest:
                raise Damage(f"text {name!r} is damaged")
            try:
                found[name] = json.loads(text)
            except (ValueError, RecursionError) as error:
                raise Damage(f"text {name!r} is not JSON of sensible depth") from error
        return found

    def blob(self, key: str) -> bytes:
        """The bytes of one blob.  Raises Damage."""
        row = self._connection.execute("SELECT checksum, data FROM blobs WHERE key = ?", (key,)).fetchone()
        if row is None:
            raise Damage(f"blob {key!r} is missing")
        if not isinstance(row[1], bytes) or checksum(row[1]) != row[0]:
            raise Damage(f"blob {key!r} is damaged")
        return row[1]


@contextmanager
def read_database(path: Path, limits: FileLimits) -> Iterator[Fetched]:
    """The open file inside one reading transaction.  Raises PlanFileError."""
    check_identity(path)
    with _connected(path, False, limits) as connection:
        connection.execute("PRAGMA query_only = ON")
        connection.execute("BEGIN")
        _check_schema(connection)
        (blobs,) = connection.execute("SELECT count(*) FROM blobs").fetchone()
        if blobs > limits.blobs:
            raise Damage(f"{blobs} blobs, at most {limits.blobs} are allowed")
        yield Fetched(connection, limits)
