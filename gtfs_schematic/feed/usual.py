"""Telling typical dates from rare ones by how many trips they have."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

_RARE = 0.25
_VERY_RARE = 0.05
_FEW, _MANY = 3, 10
_NEARLY = 0.98
_POOR = 0.5


@dataclass(frozen=True, slots=True)
class Usual:
    """The typical date of some."""

    date: dt.date
    trips: int
    told: str
    """How many of the dates are like it, such as "9 have about as many", to follow their number."""


def usual_of(totals: Mapping[dt.date, int]) -> Usual:
    """Give the typical date among some, of which there is one at least, by their trips.

    Notes
    -----
    The number of trips is wanted that is as high as possible and yet usual, which it is if nearly
    (98 %) as many or more run on a quarter of the dates with at least half as many, on a twentieth
    of all dates (or ten), and on three (half of them, if there are fewer than six). The earliest
    date with that number is taken. So neither a holiday nor an event nor a period of thin service
    is typical, but term time is; nor are late trips on Fridays, one weekday of five, but those on
    Fridays and Saturdays, two nights of seven. The shares are our own choice.
    """
    usual = _usual_number(list(totals.values()))
    alike = sum(_NEARLY * usual <= total <= usual / _NEARLY for total in totals.values())
    more = sum(total > usual / _NEARLY for total in totals.values())
    told = f"{'all' if alike == len(totals) else f'{alike:,}'} have about as many"
    if more:
        told += f"; {more:,} with more trips {'is' if more == 1 else 'are'} not typical"
    return Usual(min(date for date, total in totals.items() if total == usual), usual, told)


def _usual_number(totals: Sequence[int]) -> int:
    """Give the highest number of trips that is not rare."""
    few = min(_FEW, len(totals) / 2)
    for total in sorted(set(totals), reverse=True):
        alike = sum(other >= _NEARLY * total for other in totals)
        similar = sum(other >= _POOR * total for other in totals)
        if alike >= max(_RARE * similar, min(_VERY_RARE * len(totals), _MANY), few):
            return total
    return max(totals)
