"""Records to text and back: dataclasses of an allow-list, field by field; no code, no pickle.

Text is JSON.  Plain values stand for themselves, an array of JSON is a tuple; everything else is
an object with one "$" key:

    {"$f": "nan"}                      a float that JSON cannot write
    {"$l": [...]}  {"$d": [[k, v]]}    list, dictionary
    {"$n": "1.20"} {"$t": "2026-01-05"} {"$p": "a/b"}    Decimal, date, path
    {"$a": key, "dtype": .., "shape": ..}  {"$df": key, "columns": .., "rows": ..}    blobs
    {"$r": "Item", "f": {field: value}}    one record
    {"$rs": "Item", "n": 70, "f": {field: [value, ...]}}    a tuple of records of one class
"""

from __future__ import annotations

import dataclasses
import math
import types
import typing
from collections.abc import Callable
from datetime import date, datetime
from decimal import Decimal, InvalidOperation
from pathlib import Path

import numpy as np
import pandas as pd

from planner.catalogue.items import Catalogue, Item, Store
from planner.demand.fitted import FittedModel, Parameter, SegmentFinding
from planner.demand.store_demand import StoreDemand
from planner.plan.limits import ClusterLimit, ItemLock, Limits
from planner.plan.plans import NamedPlan, PlanRung, SolverOutcome
from planner.planfile.blobs import Blob, array_blob, frame_blob, read_array, read_frame
from planner.planfile.damage import Damage, FileLimits
from planner.sales.panel import BaseWeek, MarketPanel
from planner.sales.report import Check, ListingEvent, LoadedData, LoadReport
from planner.sales.request import LoadRequest

RECORDS: dict[str, type] = {
    kind.__name__: kind
    for kind in (
        BaseWeek, Catalogue, Check, ClusterLimit, FittedModel, Item, ItemLock, Limits, ListingEvent,
        LoadedData, LoadReport, LoadRequest, MarketPanel, NamedPlan, Parameter, PlanRung, SegmentFinding,
        SolverOutcome, Store, StoreDemand,
    )
}  # fmt: skip

Json = object


Test = Callable[[object], bool]


def _whole_number(value: object) -> bool:
    return isinstance(value, int) and not isinstance(value, bool)


def _amount(value: object) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)


def _day(value: object) -> bool:
    return isinstance(value, date) and not isinstance(value, datetime)


def _numbers(value: object) -> bool:
    return isinstance(value, np.ndarray) and value.dtype.kind in "biuf"


def type_test(hint: object) -> Test:
    """A test whether a value is of the type that a field declares."""
    simple: dict[object, Test] = {int: _whole_number, float: _amount, date: _day}
    if isinstance(hint, type) and hint in simple:
        return simple[hint]
    if hint is None or hint is type(None):
        return lambda value: value is None
    origin, arguments = typing.get_origin(hint), typing.get_args(hint)
    if origin is np.ndarray:
        return _numbers
    if origin in (types.UnionType, typing.Union):
        either = tuple(map(type_test, arguments))
        return lambda value: any(test(value) for test in either)
    if origin is tuple and len(arguments) == 2 and arguments[1] is Ellipsis:
        each = type_test(arguments[0])
        return lambda value: isinstance(value, tuple) and all(map(each, value))
    if origin is tuple:
        tests = tuple(map(type_test, arguments))
        return lambda value: (
            isinstance(value, tuple)
            and len(value) == len(tests)
            and all(test(one) for test, one in zip(tests, value, strict=True))
        )
    if isinstance(hint, type):
        return lambda value: isinstance(value, hint)
    raise TypeError(f"fields of type {hint} are not kept in a plan file")


def _fields(kind: type) -> tuple[tuple[str, Test, bool], ...]:
    """(name, test of the type, has a default) of every field that the constructor takes."""
    hints = typing.get_type_hints(kind)
    found = []
    for field in dataclasses.fields(kind):
        if field.init:
            given = field.default is not dataclasses.MISSING
            given = given or field.default_factory is not dataclasses.MISSING
            found.append((field.name, type_test(hints[field.name]), given))
    return tuple(found)


# Of every record that a plan file holds.
_FIELDS = {kind: _fields(kind) for kind in RECORDS.values()}


# -- writing -----------------------------------------------------------------------------------


class Writer:
    """Turns values into JSON and collects the blobs they need."""

    def __init__(self) -> None:
        self.blobs: dict[str, Blob] = {}

    def write(self, value: object) -> Json:
        """JSON of one value.  Raises TypeError for what a plan file does not keep."""
        if type(value) in _AS_THEY_ARE:
            return value
        if isinstance(value, np.generic):
            value = value.item()
        if value is None or isinstance(value, bool | int | str):
            return str(value) if isinstance(value, str) else value
        if isinstance(value, float):
            return float(value) if math.isfinite(value) else {"$f": str(float(value))}
        if isinstance(value, tuple):
            return self._tuple(value)
        if isinstance(value, list):
            return {"$l": [self.write(one) for one in value]}
        if isinstance(value, dict):
            return {"$d": [[self.write(key), self.write(one)] for key, one in value.items()]}
        if isinstance(value, Decimal):
            return {"$n": str(value)}
        if isinstance(value, date) and not isinstance(value, datetime):
            return {"$t": value.isoformat()}
        if isinstance(value, Path):
            return {"$p": str(value)}
        if isinstance(value, np.ndarray):
            blob, description = array_blob(value)
            return {"$a": self._keep(blob), **description}
        if isinstance(value, pd.DataFrame):
            blob, description = frame_blob(value)
            return {"$df": self._keep(blob), **description}
        if RECORDS.get(type(value).__name__) is type(value):
            return {"$r": type(value).__name__, "f": self._record(value)}
        raise TypeError(f"a value of {type(value).__name__} is not kept in a plan file")

    def _keep(self, blob: Blob) -> str:
        self.blobs[blob.key] = blob
        return blob.key

    def _record(self, value: object) -> dict[str, Json]:
        written = {}
        for name, fits, _given in _FIELDS[type(value)]:
            one = getattr(value, name)
            plain = one.item() if isinstance(one, np.generic) else one
            if not fits(plain):
                raise TypeError(f"{type(value).__name__}.{name} holds a value of another kind: {one!r:.80}")
            written[name] = self.write(plain)
        return written

    def _tuple(self, values: tuple[object, ...]) -> Json:
        kinds = {type(value) for value in values}
        if len(values) > 1 and len(kinds) == 1 and RECORDS.get(type(values[0]).__name__) in kinds:
            written = [self._record(value) for value in values]
            columns = {name: [row[name] for row in written] for name in written[0]}
            return {"$rs": type(values[0]).__name__, "n": len(values), "f": columns}
        return [self.write(value) for value in values]


_AS_THEY_ARE = frozenset({type(None), bool, int, str})


# -- reading -----------------------------------------------------------------------------------


class Reader:
    """Turns JSON back into values; ``fetch`` gives a blob's bytes."""

    def __init__(self, fetch: Callable[[str], bytes], limits: FileLimits) -> None:
        self._fetch, self._limits = fetch, limits
        self._left = limits.decoded_bytes

    def read(self, node: Json, depth: int = 0) -> object:
        """The value of one JSON node.  Raises Damage."""
        if depth > self._limits.depth:
            raise Damage(f"nested deeper than {self._limits.depth}")
        if node is None or isinstance(node, bool | int | float | str):
            return node
        if isinstance(node, list):
            return tuple(self.read(one, depth + 1) for one in node)
        if isinstance(node, dict):
            for mark, reader in _READERS.items():
                if mark in node:
                    return reader(self, node, depth + 1)
        raise Damage("a value of unknown form")

    def _float(self, node: dict[str, Json], _depth: int) -> object:
        if node["$f"] not in ("nan", "inf", "-inf"):
            raise Damage("a number of unknown form")
        return float(str(node["$f"]))

    def _list(self, node: dict[str, Json], depth: int) -> object:
        return [self.read(one, depth) for one in _listed(node["$l"])]

    def _dict(self, node: dict[str, Json], depth: int) -> object:
        found: dict[object, object] = {}
        for pair in _listed(node["$d"]):
            key, value = _listed(pair, 2)
            name = self.read(key, depth)
            try:
                found[name] = self.read(value, depth)
            except TypeError as error:
                raise Damage("a dictionary with an impossible key") from error
        return found

    def _decimal(self, node: dict[str, Json], _depth: int) -> object:
        text = node["$n"]
        try:
            if not isinstance(text, str) or len(text) > 1000:
                raise Damage("an amount of unknown form")
            return Decimal(text)
        except InvalidOperation as error:
            raise Damage("an amount of unknown form") from error

    def _date(self, node: dict[str, Json], _depth: int) -> object:
        try:
            return date.fromisoformat(str(node["$t"]))
        except ValueError as error:
            raise Damage("a date of unknown form") from error

    def _path(self, node: dict[str, Json], _depth: int) -> object:
        return Path(str(node["$p"]))

    def _array(self, node: dict[str, Json], _depth: int) -> object:
        shape = tuple(_whole(length) for length in _listed(node.get("shape")))
        if len(shape) > 8:
            raise Damage("an array of too many axes")
        array = read_array(self._fetch(str(node["$a"])), str(node.get("dtype")), shape, self._limits)
        self._count(array.nbytes)
        return array

    def _frame(self, node: dict[str, Json], _depth: int) -> object:
        columns = [
            (str(name), str(kind)) for name, kind in (_listed(c, 2) for c in _listed(node.get("columns")))
        ]
        frame = read_frame(self._fetch(str(node["$df"])), columns, _whole(node.get("rows")), self._limits)
        self._count(int(frame.memory_usage(index=False).sum()))
        return frame

    def _count(self, size: int) -> None:
        self._left -= size
        if self._left < 0:
            raise Damage(f"more than {self._limits.decoded_bytes} bytes of tables")

    def _one(self, node: dict[str, Json], depth: int) -> object:
        kind, written = _kind(node["$r"]), node.get("f")
        if not isinstance(written, dict):
            raise Damage("a record without fields")
        return self._build(kind, {name: self.read(one, depth) for name, one in written.items()})

    def _many(self, node: dict[str, Json], depth: int) -> object:
        kind, written, n = _kind(node["$rs"]), node.get("f"), _whole(node.get("n"))
        if not isinstance(written, dict) or not written:
            raise Damage("records without fields")
        columns = {name: [self.read(one, depth) for one in _listed(c, n)] for name, c in written.items()}
        return tuple(self._build(kind, {name: c[k] for name, c in columns.items()}) for k in range(n))

    def _build(self, kind: type, values: dict[str, object]) -> object:
        """A record; fields that this version does not know are dropped, missing ones take their default."""
        given = {}
        for name, fits, has_default in _FIELDS[kind]:
            if name in values:
                if not fits(values[name]):
                    raise Damage(f"{kind.__name__}.{name} holds a value of another kind")
                given[name] = values[name]
            elif not has_default:
                raise Damage(f"{kind.__name__}.{name} is missing")
        return kind(**given)


_READERS: dict[str, Callable[[Reader, dict[str, Json], int], object]] = {
    "$f": Reader._float,
    "$l": Reader._list,
    "$d": Reader._dict,
    "$n": Reader._decimal,
    "$t": Reader._date,
    "$p": Reader._path,
    "$a": Reader._array,
    "$df": Reader._frame,
    "$r": Reader._one,
    "$rs": Reader._many,
}


def _listed(node: Json, length: int | None = None) -> list[Json]:
    if not isinstance(node, list) or (length is not None and len(node) != length):
        raise Damage("a list of unknown form")
    return node


def _whole(node: Json) -> int:
    if not isinstance(node, int) or isinstance(node, bool) or not 0 <= node < 2**40:
        raise Damage("a count of unknown form")
    return node


def _kind(name: Json) -> type:
    if not isinstance(name, str) or name not in RECORDS:
        raise Damage(f"a record of unknown kind {name!r}")
    return RECORDS[name]
