"""When trips leave: periods of the day with a headway, for weekdays and for weekends."""

from __future__ import annotations

from dataclasses import dataclass

WEEKDAY, WEEKEND = "WK", "WE"


@dataclass(frozen=True, slots=True)
class Period:
    """Departures every `headway` minutes from `start` up to, not including, `end`.

    Minutes are counted from the start of the service day and go on past 24 h (1440).
    """

    service: str
    start: int
    end: int
    headway: int

    def departures(self) -> range:
        """Give the departures, in minutes."""
        return range(self.start, self.end, self.headway)


Plan = tuple[Period, ...]


def _clock(text: str) -> int:
    hours, minutes = text.split(":")
    return int(hours) * 60 + int(minutes)


def _periods(service: str, *parts: tuple[str, str, int]) -> Plan:
    return tuple(Period(service, _clock(a), _clock(b), headway) for a, b, headway in parts)


def later(plan: Plan, minutes: int) -> Plan:
    """Give the plan with every period moved by some minutes."""
    return tuple(
        Period(part.service, part.start + minutes, part.end + minutes, part.headway)
        for part in plan
    )


_PEAK = _periods(WEEKDAY, ("06:20", "09:20", 10), ("15:20", "18:40", 10))
PEAK: Plan = _PEAK
OFF_PEAK: Plan = (
    *_periods(WEEKDAY, ("05:00", "06:20", 20), ("09:20", "15:20", 10), ("18:40", "24:00", 15)),
    *_periods(WEEKEND, ("05:30", "24:00", 20)),
)
METRO: Plan = (
    *_periods(WEEKDAY, ("05:00", "06:20", 20), ("06:20", "09:20", 8), ("09:20", "15:20", 10)),
    *_periods(WEEKDAY, ("15:20", "18:40", 8), ("18:40", "24:00", 15)),
    *_periods(WEEKEND, ("05:30", "24:00", 20)),
)
RING: Plan = (
    *_periods(WEEKDAY, ("05:10", "06:30", 15), ("06:30", "09:30", 7), ("09:30", "15:30", 10)),
    *_periods(WEEKDAY, ("15:30", "18:30", 7), ("18:30", "24:10", 12)),
    *_periods(WEEKEND, ("05:40", "24:10", 15)),
)
TWO_BRANCHES: Plan = (
    *_periods(WEEKDAY, ("05:00", "06:30", 20), ("06:30", "09:30", 10), ("09:30", "15:30", 12)),
    *_periods(WEEKDAY, ("15:30", "18:30", 10), ("18:30", "24:00", 20)),
    *_periods(WEEKEND, ("05:30", "24:00", 20)),
)
TRAM: Plan = (
    *_periods(WEEKDAY, ("05:10", "06:40", 20), ("06:40", "18:40", 12), ("18:40", "24:00", 20)),
    *_periods(WEEKEND, ("06:00", "24:00", 20)),
)
BUS: Plan = (
    *_periods(WEEKDAY, ("05:30", "20:00", 15), ("20:00", "23:00", 30)),
    *_periods(WEEKEND, ("07:00", "22:00", 30)),
)
BUS_WEEKDAY_ONLY: Plan = _periods(WEEKDAY, ("05:45", "19:30", 15))
RAIL: Plan = (
    *_periods(WEEKDAY, ("04:50", "23:20", 30)),
    *_periods(WEEKEND, ("05:50", "22:50", 60)),
)
EXPRESS: Plan = (
    *_periods(WEEKDAY, ("06:05", "21:00", 60)),
    *_periods(WEEKEND, ("08:05", "20:30", 120)),
)
FERRY: Plan = (
    *_periods(WEEKDAY, ("06:30", "20:30", 40)),
    *_periods(WEEKEND, ("08:30", "20:30", 60)),
)
NIGHT: Plan = (
    *_periods(WEEKDAY, ("24:20", "28:30", 40)),
    *_periods(WEEKEND, ("24:20", "29:00", 30)),
)
