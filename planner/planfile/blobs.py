"""Arrays and frames as Parquet bytes, exactly."""

from __future__ import annotations

import hashlib
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.parquet as pq

from planner.planfile.damage import Damage, FileLimits

_KINDS = "biuf"
_FRAME_TYPES = {"str": pa.string(), "object": pa.string(), "int64": pa.int64(), "float64": pa.float64(),
                "bool": pa.bool_()}  # fmt: skip


@dataclass(frozen=True)
class Blob:
    """key: digest of the content; data: makes the Parquet bytes, only called when they are not yet stored."""

    key: str
    data: Callable[[], bytes]


def _parquet(table: pa.Table, dictionary: bool) -> bytes:
    sink = pa.BufferOutputStream()
    pq.write_table(
        table, sink, compression="zstd", use_dictionary=dictionary, write_statistics=False, store_schema=False
    )
    return bytes(sink.getvalue())


def checksum(data: bytes) -> str:
    """Digest of stored bytes."""
    return hashlib.blake2b(data, digest_size=16).hexdigest()


def _open(data: bytes, types: list[pa.DataType], rows: int, limits: FileLimits) -> pq.ParquetFile:
    """The Parquet file after looking at its footer: columns, types and sizes as expected."""
    if rows > limits.values:
        raise Damage(f"{rows} values, at most {limits.values} are allowed")
    try:
        file = pq.ParquetFile(pa.BufferReader(data))
        found = [field.type for field in file.schema_arrow]
    except (pa.ArrowException, OSError) as error:
        raise Damage(f"a table cannot be read ({error})") from error
    if found != types or file.metadata.num_rows != rows:
        raise Damage("a table has other columns or another length than its description")
    groups = (file.metadata.row_group(k) for k in range(file.metadata.num_row_groups))
    size = sum(group.total_byte_size for group in groups)
    if size > limits.decoded_bytes:
        raise Damage(f"a table of {size} bytes, at most {limits.decoded_bytes} are allowed")
    return file


# -- arrays ------------------------------------------------------------------------------------


def array_blob(array: np.ndarray) -> tuple[Blob, dict[str, object]]:
    """(blob, description) of an array of numbers or flags.  Raises TypeError for any other dtype."""
    if array.dtype.kind not in _KINDS or array.dtype.name not in _array_types():
        raise TypeError(f"arrays of {array.dtype} are not kept in a plan file")
    whole = np.ascontiguousarray(array, dtype=array.dtype.newbyteorder("=")).reshape(array.shape)
    digest = hashlib.blake2b(f"{whole.dtype.name}{whole.shape}".encode(), digest_size=16)
    digest.update(whole.reshape(-1).view(np.uint8).data)

    def data() -> bytes:
        return _parquet(pa.table({"value": pa.array(whole.reshape(-1))}), dictionary=True)

    return Blob(digest.hexdigest(), data), {"dtype": whole.dtype.name, "shape": list(whole.shape)}


def _array_types() -> dict[str, pa.DataType]:
    names = ("bool", "int8", "int16", "int32", "int64", "uint8", "uint16", "uint32", "uint64", "float32",
             "float64")  # fmt: skip
    return {name: pa.from_numpy_dtype(np.dtype(name)) for name in names}


def read_array(data: bytes, dtype: str, shape: tuple[int, ...], limits: FileLimits) -> np.ndarray:
    """The array again, bit for bit.  Raises Damage."""
    types = _array_types()
    if dtype not in types:
        raise Damage(f"an array of unknown kind {dtype!r}")
    rows = 1
    for length in shape:
        rows *= length
    file = _open(data, [types[dtype]], rows, limits)
    try:
        column = file.read(use_threads=False).column(0)
    except (pa.ArrowException, OSError) as error:
        raise Damage(f"an array cannot be read ({error})") from error
    if column.null_count:
        raise Damage("an array with empty places")
    return np.array(column.to_numpy(), dtype=dtype, copy=True).reshape(shape)


# -- frames ------------------------------------------------------------------------------------


def _frame_table(frame: pd.DataFrame) -> tuple[pa.Table, list[list[str]]]:
    if not frame.index.equals(pd.RangeIndex(len(frame))):
        raise TypeError("only frames with rows counted from 0 are kept in a plan file")
    arrays, columns = [], []
    for position, name in enumerate(frame.columns):
        series = frame.iloc[:, position]
        kind = str(series.dtype)
        if kind not in _FRAME_TYPES or not isinstance(name, str):
            raise TypeError(f"column {name!r} of {kind} is not kept in a plan file")
        texts = kind in ("str", "object")
        arrays.append(pa.array(series, type=_FRAME_TYPES[kind], from_pandas=texts))
        columns.append([name, kind])
    flat = [a.combine_chunks() if isinstance(a, pa.ChunkedArray) else a for a in arrays]
    return pa.table(flat, names=[f"c{k}" for k in range(len(flat))]), columns


def frame_blob(frame: pd.DataFrame) -> tuple[Blob, dict[str, object]]:
    """(blob, description) of a frame of texts, numbers and flags.  Raises TypeError for anything else."""
    table, columns = _frame_table(frame)
    digest = hashlib.blake2b(f"{columns}{len(frame)}".encode("utf-8", "surrogatepass"), digest_size=16)
    for column in table.columns:
        for chunk in column.chunks:
            digest.update(f"{chunk.offset} {len(chunk)}".encode())
            for buffer in chunk.buffers():
                digest.update(b"-" if buffer is None else memoryview(buffer))

    def data() -> bytes:
        # Without a dictionary a small file cannot stand for a huge number of long texts.
        return _parquet(table, dictionary=False)

    return Blob(digest.hexdigest(), data), {"columns": columns, "rows": len(frame)}


def read_frame(data: bytes, columns: list[tuple[str, str]], rows: int, limits: FileLimits) -> pd.DataFrame:
    """The frame again.  Raises Damage."""
    if not columns:
        return pd.DataFrame(index=pd.RangeIndex(rows if rows <= limits.values else 0))
    if any(kind not in _FRAME_TYPES for _name, kind in columns):
        raise Damage("a frame with a column of unknown kind")
    file = _open(data, [_FRAME_TYPES[kind] for _name, kind in columns], rows, limits)
    groups = (file.metadata.row_group(k) for k in range(file.metadata.num_row_groups))
    if any(
        "DICTIONARY" in code for g in groups for k in range(g.num_columns) for code in g.column(k).encodings
    ):
        raise Damage("a frame in a packed form this program does not write")
    try:
        table = file.read(use_threads=False)
    except (pa.ArrowException, OSError) as error:
        raise Damage(f"a frame cannot be read ({error})") from error
    series = []
    for (_name, kind), column in zip(columns, table.columns, strict=True):
        if kind not in ("str", "object") and column.null_count:
            raise Damage("a column of numbers with empty places")
        values = column.to_pylist() if kind == "object" else column.to_pandas()
        series.append(pd.Series(values, dtype=kind))
    frame = pd.concat(series, axis=1)
    frame.columns = pd.Index([name for name, _kind in columns])
    return frame
