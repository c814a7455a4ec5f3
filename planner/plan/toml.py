"""Limits as a TOML file, in the words of this program.

    goal = "margin"            # margin, sales or units
    max_changes = 8            # items changed in a cluster, all clusters together
    listing_cost = 5.0         # money a week per listing
    delisting_cost = 2.0       # money a week per delisting

    [[cluster]]
    name = "Large"
    space = 480.0              # cm in every store of the cluster; the stores' own space still binds
    min_items = 40
    max_items = 60

    [[lock]]
    item = "004711"            # codes are texts
    kind = "keep"              # keep, never or as today
    cluster = "Large"          # left out: every cluster
    reason = "own range promise"
    until = "2026-12-31"

Every key may be left out, except a cluster's name and a lock's item and kind.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from datetime import date
from pathlib import Path

from planner.base.errors import CallError
from planner.base.target_file import replacing
from planner.base.text import _
from planner.plan.limits import GOALS, ClusterLimit, ItemLock, Limits

LOCK_KINDS = ("keep", "never", "as today")
_TOP = ("goal", "max_changes", "listing_cost", "delisting_cost", "cluster", "lock")
_CLUSTER = ("name", "space", "min_items", "max_items")
_LOCK = ("item", "kind", "cluster", "reason", "until")
_MOST_BYTES = 10 * 2**20
_MOST_MONEY = 1e15


class _Section:
    """One table of the file, with its place for messages."""

    def __init__(self, values: object, place: str, known: tuple[str, ...]) -> None:
        self.place = place
        if not isinstance(values, Mapping):
            raise self.error(_("expected a table of keys and values"))
        self.values = values
        for key in values:
            if key not in known:
                raise CallError(
                    _("unknown key '{key}'.").format(key=key),
                    place=place,
                    remedy=_("The keys here are: {names}.").format(names=", ".join(known)),
                )

    def error(self, problem: str, remedy: str = "") -> CallError:
        return CallError(problem if problem.endswith(".") else problem + ".", place=self.place, remedy=remedy)

    def text(self, key: str, needed: bool = False) -> str:
        value = self.values.get(key, "")
        if isinstance(value, date):
            return value.isoformat()
        if not isinstance(value, str):
            raise self.error(
                _("{key} = {value!r} is not a text").format(key=key, value=value),
                _('Put it in quotes, as in {key} = "{value}".').format(key=key, value=value),
            )
        if needed and not value:
            raise self.error(_("{key} is missing").format(key=key))
        return value

    def one_of(self, key: str, allowed: tuple[str, ...], default: str = "") -> str:
        value = self.text(key) or default
        if value not in allowed:
            raise self.error(
                _("{key} = '{value}' is not known").format(key=key, value=value),
                _("Use one of: {names}.").format(names=", ".join(allowed)),
            )
        return value

    def amount(self, key: str) -> float | None:
        value = self.values.get(key)
        if value is None:
            return None
        good = isinstance(value, int | float) and not isinstance(value, bool)
        if not good or not 0 <= value <= _MOST_MONEY:
            raise self.error(_("{key} = {value!r} is not a number of 0 or more").format(key=key, value=value))
        return float(value)

    def whole(self, key: str) -> int | None:
        value = self.values.get(key)
        if value is None:
            return None
        if not isinstance(value, int) or isinstance(value, bool) or value < 0:
            raise self.error(
                _("{key} = {value!r} is not a whole number of 0 or more").format(key=key, value=value)
            )
        return value

    def tables(self, key: str, known: tuple[str, ...]) -> list[_Section]:
        value = self.values.get(key, [])
        if not isinstance(value, list):
            raise self.error(_("{key} is not a list of tables; write [[{key}]]").format(key=key))
        return [
            _Section(one, f"{self.place} [[{key}]] {position}", known)
            for position, one in enumerate(value, start=1)
        ]


def _cluster(section: _Section) -> ClusterLimit:
    least, most = section.whole("min_items"), section.whole("max_items")
    if least is not None and most is not None and least > most:
        raise section.error(_("min_items {least} is above max_items {most}").format(least=least, most=most))
    # A chain without clusters has one without a name.
    if "name" not in section.values:
        raise section.error(_("name is missing"))
    return ClusterLimit(section.text("name"), section.amount("space"), least, most)


def _lock(section: _Section) -> ItemLock:
    until = section.text("until")
    if until:
        try:
            date.fromisoformat(until)
        except ValueError:
            raise section.error(
                _("until = '{value}' is not a date").format(value=until), _("Write it as 2026-12-31.")
            ) from None
    return ItemLock(
        section.text("item", needed=True),
        section.one_of("kind", LOCK_KINDS),
        section.text("cluster"),
        section.text("reason"),
        until,
    )


def limits_of_text(text: str, place: str = "") -> Limits:
    """The limits written in ``text``.  Raises CallError with the place of what is wrong.

    Codes are not compared with a catalogue here.
    """
    try:
        values = tomllib.loads(text)
    except (tomllib.TOMLDecodeError, RecursionError) as error:
        raise CallError(
            _("this is not TOML: {reason}.").format(reason=error),
            place=place,
            remedy=_('Write lines such as goal = "margin" or max_changes = 8.'),
        ) from error
    top = _Section(values, place, _TOP)
    clusters = tuple(_cluster(section) for section in top.tables("cluster", _CLUSTER))
    names = [limit.cluster for limit in clusters]
    twice = sorted({name for name in names if names.count(name) > 1})
    if twice:
        raise top.error(_("cluster '{name}' stands there twice").format(name=twice[0]))
    return Limits(
        goal=top.one_of("goal", GOALS, "margin"),
        max_changes=top.whole("max_changes"),
        clusters=clusters,
        locks=tuple(_lock(section) for section in top.tables("lock", _LOCK)),
        listing_cost=top.amount("listing_cost") or 0.0,
        delisting_cost=top.amount("delisting_cost") or 0.0,
    )


def read_limits(path: Path) -> Limits:
    """The limits in a file (UTF-8).  Raises CallError when it is missing, no text, or wrong."""
    try:
        size = path.stat().st_size
        if size > _MOST_BYTES:
            raise CallError(
                _("the file has {size} bytes; limits are at most {most}.").format(
                    size=size, most=_MOST_BYTES
                ),
                place=str(path),
                remedy=_("Give a TOML file with limits."),
            )
        text = path.read_text(encoding="utf-8-sig")
    except OSError as error:
        raise CallError(
            _("the limits cannot be read ({reason}).").format(reason=error.strerror or error),
            place=str(path),
            remedy=_("Check the name of the file."),
        ) from error
    except UnicodeDecodeError as error:
        raise CallError(
            _("the limits are not text in UTF-8."), place=str(path), remedy=_("Save the file as UTF-8.")
        ) from error
    return limits_of_text(text, str(path))


def _quoted(text: str) -> str:
    """A TOML basic string."""
    short = {"\\": "\\\\", '"': '\\"', "\n": "\\n", "\t": "\\t", "\r": "\\r"}
    marks = []
    for mark in text:
        hidden = ord(mark) < 32 or ord(mark) == 127
        marks.append(short.get(mark, f"\\u{ord(mark):04X}" if hidden else mark))
    return '"' + "".join(marks) + '"'


def text_of_limits(limits: Limits) -> str:
    """The limits as TOML; ``limits_of_text`` gives the same record back."""
    lines = [f"goal = {_quoted(limits.goal)}"]
    if limits.max_changes is not None:
        lines.append(f"max_changes = {limits.max_changes}")
    lines.append(f"listing_cost = {float(limits.listing_cost)!r}")
    lines.append(f"delisting_cost = {float(limits.delisting_cost)!r}")
    for limit in limits.clusters:
        lines += ["", "[[cluster]]", f"name = {_quoted(limit.cluster)}"]
        if limit.space is not None:
            lines.append(f"space = {float(limit.space)!r}")
        for key, value in (("min_items", limit.min_items), ("max_items", limit.max_items)):
            if value is not None:
                lines.append(f"{key} = {value}")
    for lock in limits.locks:
        lines += ["", "[[lock]]", f"item = {_quoted(lock.item)}", f"kind = {_quoted(lock.kind)}"]
        for key, text in (("cluster", lock.cluster), ("reason", lock.reason), ("until", lock.until)):
            if text:
                lines.append(f"{key} = {_quoted(text)}")
    return "\n".join(lines) + "\n"


def write_limits(path: Path, limits: Limits) -> None:
    """Write the limits as a TOML file.  Raises CallError when the target cannot be written."""
    with replacing(path, (".toml",)) as part:
        part.write_text(text_of_limits(limits), encoding="utf-8")
