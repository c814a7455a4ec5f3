"""Foreign, newer, damaged and hostile files give a clear error and nothing else."""

from __future__ import annotations

import io
import json
import random
import sqlite3
import struct
from collections.abc import Callable
from contextlib import closing
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

from planner.base.errors import CallError, PlanFileError
from planner.planfile.blobs import checksum
from planner.planfile.damage import FileLimits
from planner.planfile.database import text_checksum
from planner.planfile.store import PlanContents, load, save
from tests.planfile.same import same
from tests.tables import records


@pytest.fixture
def plan_file(tmp_path: Path) -> Path:
    path = tmp_path / "review.rangewright"
    save(path, contents())
    return path


def contents() -> PlanContents:
    return PlanContents(
        records.loaded(), records.fitted(), records.planned(), records.limits(), (records.plan(),)
    )


def refused(path: Path, limits: FileLimits | None = None) -> PlanFileError:
    with pytest.raises(PlanFileError) as caught:
        load(path, limits)
    assert caught.value.place == str(path)
    assert caught.value.remedy
    return caught.value


def run(path: Path, *commands: str) -> None:
    with closing(sqlite3.connect(path, isolation_level=None)) as connection:
        for command in commands:
            connection.execute(command)


def rewrite(path: Path, name: str, change: Callable[[str], object]) -> None:
    """Replace one text by a changed one, with a right checksum, as an attacker would."""
    with closing(sqlite3.connect(path, isolation_level=None)) as connection:
        found = connection.execute("SELECT json FROM texts WHERE name = ?", (name,)).fetchone()
        new = change(found[0])
        text = new if isinstance(new, str) else json.dumps(new)
        row = (text, text_checksum(name, text), name)
        connection.execute("UPDATE texts SET json = ?, checksum = ? WHERE name = ?", row)


def test_files_that_are_something_else(tmp_path: Path) -> None:
    path = tmp_path / "a.rangewright"
    for data in (b"", b"PK\x03\x04" + bytes(500), b"SQLite format 3\x00", b"store,item\n1,2\n" * 50):
        path.write_bytes(data)
        assert "not a plan file" in refused(path).problem
    path.unlink()
    assert "cannot be opened" in refused(path).problem
    path.mkdir()
    assert "cannot be opened" in refused(path).problem


def test_a_foreign_file_is_never_overwritten(tmp_path: Path) -> None:
    path = tmp_path / "sales.csv"
    path.write_bytes(b"store,item\n1,2\n" * 50)
    with pytest.raises(PlanFileError, match="not a plan file"):
        save(path, contents())
    assert path.read_bytes() == b"store,item\n1,2\n" * 50
    database = tmp_path / "other.db"
    run(database, "CREATE TABLE notes (a)")
    with pytest.raises(PlanFileError, match="another program"):
        save(database, contents())
    assert "another program" in refused(database).problem


def test_an_empty_file_may_be_replaced(tmp_path: Path) -> None:
    path = tmp_path / "a.rangewright"
    path.touch()
    save(path, contents())
    assert same(load(path), contents())


def test_newer_formats_are_refused(plan_file: Path) -> None:
    run(plan_file, "PRAGMA user_version = 2")
    error = refused(plan_file)
    assert "format 2" in error.problem
    assert "newer version of the program" in error.remedy
    with pytest.raises(PlanFileError, match="format 2"):
        save(plan_file, contents())
    run(plan_file, "PRAGMA user_version = 0")
    assert "format 0" in refused(plan_file).problem


def test_every_truncation_is_noticed(plan_file: Path) -> None:
    data = plan_file.read_bytes()
    for length in (len(data) - 1, len(data) - 4096, len(data) // 2, 4096, 5000, 100, 99, 1):
        plan_file.write_bytes(data[:length])
        refused(plan_file)


def damage_and_load(path: Path, rounds: int, seed: int) -> int:
    """Spoil the file in random ways; every loading gives an error or the whole review.  Refusals."""
    data = path.read_bytes()
    rng = random.Random(seed)
    refusals = 0
    for _round in range(rounds):
        damaged = bytearray(data)
        for _hit in range(rng.choice((1, 1, 1, 20))):
            start = rng.randrange(len(damaged))
            part = damaged[start : start + rng.choice((1, 2, 8, 64, 1024))]
            damaged[start : start + len(part)] = rng.randbytes(len(part))
        cut = rng.randrange(len(damaged)) if rng.random() < 0.2 else len(damaged)
        path.write_bytes(bytes(damaged[:cut]))
        try:
            back = load(path)
        except PlanFileError:
            refusals += 1
        else:
            # Unused bytes may change; what is read may not.
            assert same(back, contents())
    return refusals


def test_damage_gives_an_error_or_the_whole_review(plan_file: Path) -> None:
    assert damage_and_load(plan_file, 250, seed=11) > 100


@pytest.mark.slow
def test_twenty_thousand_damaged_files(plan_file: Path) -> None:
    refusals = damage_and_load(plan_file, 20_000, seed=12)
    print(f"\n20,000 damaged files: {refusals} refused, the others read as saved")
    assert refusals > 10_000


@pytest.mark.parametrize(
    "command",
    [
        "CREATE TRIGGER t AFTER INSERT ON texts BEGIN SELECT 1; END",
        "CREATE VIEW v AS SELECT 1",
        "CREATE TABLE more (a)",
        "ALTER TABLE texts ADD COLUMN more",
        "DROP TABLE blobs",
    ],
)
def test_nothing_but_the_two_tables(plan_file: Path, command: str) -> None:
    run(plan_file, command)
    assert "tables are not those" in refused(plan_file).problem
    with pytest.raises(PlanFileError, match="tables are not those"):
        save(plan_file, contents())


def test_a_view_cannot_stand_in_for_a_table(plan_file: Path) -> None:
    endless = (
        "WITH RECURSIVE c(x) AS (SELECT 1 UNION ALL SELECT x + 1 FROM c) SELECT x AS name, 'a' AS json FROM c"
    )
    run(plan_file, "DROP TABLE texts", f"CREATE VIEW texts AS {endless}")
    assert "tables are not those" in refused(plan_file).problem


def test_checksums_guard_texts_and_blobs(plan_file: Path) -> None:
    run(plan_file, "UPDATE texts SET json = replace(json, 'Green', 'Brown') WHERE name = 'loaded'")
    assert "text 'loaded' is damaged" in refused(plan_file).problem
    save(plan_file, contents())
    run(plan_file, "UPDATE blobs SET data = x'00' WHERE rowid = 1")
    assert "damaged" in refused(plan_file).problem
    run(plan_file, "DELETE FROM blobs WHERE rowid = 1")
    assert "missing" in refused(plan_file).problem


def test_no_part_goes_missing_or_changes_its_name(plan_file: Path) -> None:
    run(plan_file, "UPDATE texts SET name = 'plAns' WHERE name = 'plans'")
    assert "text 'plAns' is damaged" in refused(plan_file).problem
    run(plan_file, "DELETE FROM texts WHERE name = 'plAns'")
    assert "a part is missing" in refused(plan_file).problem
    save(plan_file, contents())
    rewrite(plan_file, "program", lambda _old: {"version": "0"})
    assert "a part is missing" in refused(plan_file).problem
    # A part that an older program did not have takes its default, one of a newer is passed over.
    rewrite(plan_file, "program", lambda _old: {"parts": ["loaded", "fitted", "program"]})
    assert load(plan_file).plans == ()


HOSTILE: list[tuple[str, object, str]] = [
    ("settings", {"$r": "Popen", "f": {}}, "unknown kind 'Popen'"),
    ("settings", {"$r": "PlanContents", "f": {}}, "unknown kind"),
    ("settings", {"$x": 1}, "unknown form"),
    ("settings", [1], "settings hold"),
    ("settings", {"$d": [[1, 2]]}, "settings hold"),
    ("settings", {"$d": [[{"$l": []}, 2]]}, "impossible key"),
    ("settings", {"$d": [1]}, "a list of unknown form"),
    ("settings", {"$d": [["a", {"$f": "1e5"}]]}, "number of unknown form"),
    ("settings", {"$d": [["a", {"$n": "one"}]]}, "amount of unknown form"),
    ("settings", {"$d": [["a", {"$n": "1" * 2000}]]}, "amount of unknown form"),
    ("settings", {"$d": [["a", {"$t": "tomorrow"}]]}, "date of unknown form"),
    ("settings", {"$d": [["a", {"$rs": "Item", "n": 10**13, "f": {"code": []}}]]}, "count of unknown form"),
    ("settings", {"$d": [["a", {"$rs": "Limits", "n": 10**9, "f": {}}]]}, "records without fields"),
    ("settings", {"$d": [["a", {"$rs": "Limits", "n": 10**9, "f": {"goal": ["a"]}}]]}, "list of unknown"),
    ("settings", {"$d": [["a", {"$a": "x", "dtype": "float64", "shape": [10**6, 10**6]}]]}, "missing"),
    ("settings", {"$d": [["a", {"$a": "x", "dtype": "float64", "shape": [-1]}]]}, "count of unknown form"),
    ("settings", {"$d": [["a", {"$a": "x", "dtype": "float64", "shape": [1] * 9}]]}, "too many axes"),
    ("limits", {"$r": "Item", "f": {"code": "1"}}, "limits holds"),
    ("limits", {"$r": "Limits", "f": {"goal": 5}}, "Limits.goal holds"),
    ("limits", {"$r": "Limits", "f": {"max_changes": True}}, "Limits.max_changes holds"),
    ("limits", {"$r": "Limits", "f": {"locks": [{"$r": "Item", "f": {"code": "1"}}]}}, "Limits.locks holds"),
    ("limits", {"$r": "Limits"}, "record without fields"),
    ("plans", [{"$r": "NamedPlan", "f": {"name": "a"}}], "NamedPlan.states is missing"),
    ("plans", {"$l": []}, "plans holds"),
    ("loaded", {"$r": "Limits", "f": {}}, "loaded holds"),
    ("states", [[1, 2]], "states holds"),
]  # fmt: skip


@pytest.mark.parametrize(("name", "node", "problem"), HOSTILE)
def test_hostile_texts_build_nothing(plan_file: Path, name: str, node: object, problem: str) -> None:
    rewrite(plan_file, name, lambda _old: node)
    assert problem in refused(plan_file).problem


def test_depth_and_size_are_limited(plan_file: Path) -> None:
    rewrite(plan_file, "settings", lambda _old: "[" * 100_000 + "]" * 100_000)
    assert "sensible depth" in refused(plan_file).problem
    rewrite(plan_file, "settings", lambda _old: {"$d": [["a", _nest(60)]]})
    assert "nested deeper" in refused(plan_file).problem
    rewrite(plan_file, "settings", lambda _old: "1" * 5000)
    assert "sensible depth" in refused(plan_file).problem
    rewrite(plan_file, "settings", lambda _old: {"$d": []})
    assert same(load(plan_file), contents())
    for limits in (FileLimits(json_bytes=500), FileLimits(rows=3), FileLimits(blobs=5), FileLimits(values=10),
                   FileLimits(decoded_bytes=1000), FileLimits(blob_bytes=1000)):  # fmt: skip
        refused(plan_file, limits)


def _nest(depth: int) -> object:
    node: object = 1
    for _level in range(depth):
        node = [node]
    return node


def replace_units(path: Path, table: pa.Table, **how: object) -> None:
    """Put another Parquet table under the key of the panel's units."""
    sink = io.BytesIO()
    pq.write_table(table, sink, **how)
    data = sink.getvalue()
    with closing(sqlite3.connect(path, isolation_level=None)) as connection:
        (text,) = connection.execute("SELECT json FROM texts WHERE name = 'loaded'").fetchone()
        key = json.loads(text)["f"]["panel"]["f"]["units"]["$a"]
        connection.execute(
            "UPDATE blobs SET data = ?, checksum = ? WHERE key = ?", (data, checksum(data), key)
        )


def test_tables_must_be_what_they_are_said_to_be(plan_file: Path) -> None:
    wrong = [
        pa.table({"value": np.zeros(479)}),
        pa.table({"value": np.zeros(480, dtype=np.int64)}),
        pa.table({"value": ["text"] * 480}),
        pa.table({"value": np.zeros(480), "more": np.zeros(480)}),
        pa.table({"value": pa.array([None] * 480, pa.float64())}),
    ]
    for table in wrong:
        replace_units(plan_file, table)
        assert "table" in refused(plan_file).problem or "empty places" in refused(plan_file).problem
    replace_units(plan_file, pa.table({"value": np.zeros(480)}))
    assert load(plan_file).loaded is not None


def test_stored_schemas_and_extension_types_are_not_brought_to_life(plan_file: Path) -> None:
    """A stored Arrow schema could name a type that runs code when it is read."""
    table = pa.table({"value": np.zeros(480)})
    replace_units(plan_file, table.replace_schema_metadata({"ARROW:schema": "gASVAAAA", "pandas": "{}"}))
    assert "table cannot be read" in refused(plan_file).problem
    extension = {
        "ARROW:extension:name": "arrow.py_extension_type",
        "ARROW:extension:metadata": "cposix\nsystem\n.",
    }
    field = table.schema.field(0).with_metadata(extension)
    replace_units(plan_file, table.cast(pa.schema([field], metadata={"pandas": "{}"})))
    loaded = load(plan_file).loaded
    assert loaded is not None
    assert type(loaded.panel.units) is np.ndarray
    replace_units(plan_file, pa.table({"value": pa.array([bytes(16)] * 480, pa.uuid())}))
    assert "other columns" in refused(plan_file).problem


def test_arrays_must_fit_each_other(plan_file: Path) -> None:
    def shorter(text: str) -> object:
        node = json.loads(text)
        node["f"]["panel"]["f"]["units"]["shape"] = [480, 1]
        return node

    rewrite(plan_file, "loaded", shorter)
    assert "MarketPanel.units has 480 places on axis T" in refused(plan_file).problem


def test_positions_must_lie_on_their_axis(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "a.rangewright"
    wrong = contents()
    assert wrong.loaded is not None
    wrong.loaded.panel.store_index[0] = 6
    with pytest.raises(CallError, match="points outside its axis"):
        save(path, wrong)
    monkeypatch.setattr("planner.planfile.store.refuse_unfit", lambda _contents: None)
    save(path, wrong)
    assert "points outside its axis" in refused(path).problem


def test_header_numbers_are_where_the_format_says(plan_file: Path) -> None:
    head = plan_file.read_bytes()[:100]
    assert struct.unpack(">I", head[68:72])[0] == 0x5257706C
    assert struct.unpack(">I", head[60:64])[0] == 1


def test_a_file_being_written_by_another_program(plan_file: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("planner.planfile.database._WAIT_SECONDS", 0.1)
    with closing(sqlite3.connect(plan_file, isolation_level=None)) as connection:
        connection.execute("BEGIN EXCLUSIVE")
        with pytest.raises(CallError, match="another program is writing"):
            save(plan_file, PlanContents())
        with pytest.raises(CallError, match="another program is writing"):
            load(plan_file)
        connection.execute("ROLLBACK")
    assert same(load(plan_file), contents())
