"""Collecting what is wrong or odd in a feed while it is being read."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Sequence
from typing import NoReturn

from gtfs_schematic.errors import FeedError
from gtfs_schematic.feed.model import Finding, LeftOut, Severity

_LISTED = 20
"""Findings of one kind listed one by one; the others are only counted, so that a systematic
fault in millions of rows stays readable."""

_TOLD = 3


class Notebook:
    """Findings and things left out, gathered by everybody who reads a part of the feed.

    Parameters
    ----------
    prefix
        Put before file names and ids, "" or such as "2:", when several feeds are read as one.
    """

    def __init__(self, prefix: str = "") -> None:
        self.prefix = prefix
        self._findings: list[Finding] = []
        self._count: Counter[tuple[Severity, str, str, str | None]] = Counter()
        self._left_out: dict[tuple[str, str], str] = {}

    def find(
        self,
        severity: Severity,
        file: str,
        message: str,
        *,
        row: int | None = None,
        field: str | None = None,
        value: str | None = None,
    ) -> None:
        """Note a finding; `message` names the kind of fault, so it holds no values."""
        kind = (severity, file, message, field)
        self._count[kind] += 1
        if self._count[kind] <= _LISTED:
            self._findings.append(
                Finding(severity, self.prefix + file, message, row=row, field=field, value=value)
            )

    def find_rows(
        self, severity: Severity, file: str, message: str, rows: Sequence[int], field: str
    ) -> None:
        """Note one kind of finding in many rows, in order."""
        for row in rows[:_LISTED]:
            self.find(severity, file, message, row=row, field=field)
        self._count[severity, file, message, field] += max(0, len(rows) - _LISTED)

    def leave_out(self, kind: str, ident: str, reason: str) -> None:
        """Note that something of the feed is not shown; the first reason given stands."""
        self._left_out.setdefault((kind, self.prefix + ident), reason)

    @property
    def findings(self) -> tuple[Finding, ...]:
        """All findings, sorted by file, row, field and message."""
        more = [
            Finding(
                severity,
                self.prefix + file,
                f"{message} (so in {count} places; the first {_LISTED} are listed)",
                field=field,
            )
            for (severity, file, message, field), count in self._count.items()
            if count > _LISTED
        ]
        return tuple(sorted(self._findings + more, key=_place))

    @property
    def left_out(self) -> tuple[LeftOut, ...]:
        """All things left out, sorted by kind and id."""
        return tuple(
            LeftOut(kind, ident, reason) for (kind, ident), reason in sorted(self._left_out.items())
        )


def refuse_empty(left_out: Iterable[LeftOut], findings: Iterable[Finding], asked: str) -> NoReturn:
    """Refuse a feed of which nothing is left, with the reasons that most account for it.

    Raises
    ------
    FeedError
        In any case.
    """
    reasons = Counter((i.kind, i.reason) for i in left_out if i.kind in {"route", "trip"})
    told = [f"{n} × {kind}: {reason}" for (kind, reason), n in reasons.most_common(_TOLD)]
    errors = [f for f in findings if f.severity == "error"][:_TOLD]
    told += [f"{f.file}, row {f.row}: {f.message}" for f in errors]
    raise FeedError(f"Nothing is left to draw that {asked}. {'; '.join(told) or 'No reason'}.")


def _place(finding: Finding) -> tuple[str, int, str, str, str, str]:
    return (
        finding.file,
        finding.row or 0,
        finding.field or "",
        finding.message,
        finding.value or "",
        finding.severity,
    )
