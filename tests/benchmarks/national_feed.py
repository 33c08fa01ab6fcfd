"""Write a feed as large as a country's, of invented towns, for the benchmark of reading.

About 120,000 stops, 6,000 routes and 800,000 trips of 25 calls: 20 million rows in stop_times.txt,
two timetable periods with weekdays, Saturdays and Sundays, some 224,000 trips on a weekday, and
2.4 million rows in shapes.txt. Everything follows from one seed.
"""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import numpy as np
import polars as pl
from numpy.typing import NDArray

TOWNS, STOPS_OF_TOWN, ROUTES_OF_TOWN, CALLS, POINTS = 300, 200, 20, 25, 200
ROUTES = TOWNS * ROUTES_OF_TOWN
PATTERNS = 2 * ROUTES
SERVICES = ("wk-spring", "wk-summer", "sa-spring", "sa-summer", "su-spring", "su-summer")
SHARES = (0.28, 0.28, 0.14, 0.14, 0.08, 0.08)
_BATCH = 100_000

Ints = NDArray[np.int64]


def write_national_feed(folder: Path, trips: int = 800_000) -> None:
    """Write the feed's tables into a folder that is made for it."""
    folder.mkdir(parents=True)
    rng = np.random.default_rng(20260311)
    (folder / "agency.txt").write_text(
        "agency_id,agency_name,agency_url,agency_timezone\n"
        + "".join(
            f"a{n},Region {n} Transit,https://r{n}.example,Europe/Zurich\n" for n in range(12)
        ),
        "utf-8",
    )
    (folder / "calendar.txt").write_text(_calendar(), "utf-8")
    places = _write_stops(folder, rng)
    stops = _write_routes(folder, places, rng)
    _write_trips(folder, stops, trips, rng)


def _calendar() -> str:
    week = {"wk": "1,1,1,1,1,0,0", "sa": "0,0,0,0,0,1,0", "su": "0,0,0,0,0,0,1"}
    span = {"spring": "20260302,20260531", "summer": "20260601,20260830"}
    days = "monday,tuesday,wednesday,thursday,friday,saturday,sunday"
    rows = (f"{s},{week[s[:2]]},{span[s[3:]]}\n" for s in SERVICES)
    return f"service_id,{days},start_date,end_date\n" + "".join(rows)


def _stop_ids(places: Ints, side: Ints) -> pl.Series:
    town, number = np.divmod(places, STOPS_OF_TOWN)
    table = pl.DataFrame({"t": town, "n": number, "s": side})
    return table.select(pl.format("{}:{}:{}", pl.col("t") + 100, pl.col("n") + 1000, "s"))[:, 0]


def _write_stops(folder: Path, rng: np.random.Generator) -> NDArray[np.float64]:
    """Write two kerbs for every place; give the places' longitudes and latitudes."""
    town = np.arange(TOWNS * STOPS_OF_TOWN) // STOPS_OF_TOWN
    number = np.arange(TOWNS * STOPS_OF_TOWN) % STOPS_OF_TOWN
    lon = 7.0 + 0.25 * (town % 20) + 0.006 * (number % 20) + rng.uniform(-1e-3, 1e-3, len(town))
    lat = 47.0 + 0.2 * (town // 20) + 0.005 * (number // 20) + rng.uniform(-1e-3, 1e-3, len(town))
    both = np.repeat(np.arange(len(town)), 2)
    side = np.arange(len(both)) % 2
    pl.DataFrame(
        {
            "stop_id": _stop_ids(both, side),
            "stop_name": pl.DataFrame({"t": town[both], "n": number[both]}).select(
                pl.format("Town {}, Straße {}", "t", "n")
            )[:, 0],
            "stop_lat": (lat[both] + 1e-4 * side).round(6),
            "stop_lon": lon[both].round(6),
        }
    ).write_csv(folder / "stops.txt")
    return np.column_stack([lon, lat])


def _write_routes(folder: Path, places: NDArray[np.float64], rng: np.random.Generator) -> Ints:
    """Write routes and shapes; give the places at which every pattern calls, (patterns, calls)."""
    route = np.arange(ROUTES)
    town = route // ROUTES_OF_TOWN
    pl.DataFrame(
        {
            "route_id": [f"r{n}" for n in route],
            "agency_id": [f"a{n % 12}" for n in town],
            "route_short_name": [str(1 + n % ROUTES_OF_TOWN) for n in route],
            "route_long_name": ["" for _ in route],
            "route_type": np.where(route % ROUTES_OF_TOWN == 0, 0, 3),
        }
    ).write_csv(folder / "routes.txt")
    start = rng.integers(0, STOPS_OF_TOWN, ROUTES)
    stride = rng.choice([1, 3, 7, 9, 11, 13, 17, 19], ROUTES)  # no divisor of 200: no stop twice
    way = (start[:, None] + stride[:, None] * np.arange(CALLS)) % STOPS_OF_TOWN
    out = way + STOPS_OF_TOWN * town[:, None]
    patterns = np.stack([out, out[:, ::-1]], axis=1).reshape(PATTERNS, CALLS)
    t = np.linspace(0, CALLS - 1, POINTS)
    lon = np.stack([np.interp(t, np.arange(CALLS), row) for row in places[patterns, 0]])
    lat = np.stack([np.interp(t, np.arange(CALLS), row) for row in places[patterns, 1]])
    ids = pl.Series([f"shp{n}" for n in range(PATTERNS)])
    pl.DataFrame(
        {
            "shape_id": ids.gather(np.repeat(np.arange(PATTERNS), POINTS)),
            "shape_pt_lat": lat.ravel().round(6),
            "shape_pt_lon": lon.ravel().round(6),
            "shape_pt_sequence": np.tile(np.arange(POINTS), PATTERNS),
        }
    ).write_csv(folder / "shapes.txt")
    return patterns


def _write_trips(folder: Path, stops: Ints, trips: int, rng: np.random.Generator) -> None:
    pattern = np.sort(rng.integers(0, PATTERNS, trips))
    departure = rng.integers(5 * 60, 25 * 60, trips) * 60
    pace = rng.integers(60, 150, PATTERNS)
    service = rng.choice(len(SERVICES), trips, p=SHARES)
    ids = pl.DataFrame({"r": pattern // 2, "d": pattern % 2, "n": np.arange(trips)}).select(
        pl.format("{}-{}-{}", pl.col("r") + 10_000, "d", pl.col("n") + 1_000_000)
    )[:, 0]
    pl.DataFrame(
        {
            "route_id": pl.Series([f"r{n}" for n in range(ROUTES)]).gather(pattern // 2),
            "service_id": pl.Series(SERVICES).gather(service),
            "trip_id": ids,
            "trip_headsign": pl.DataFrame({"p": stops[pattern, -1]}).select(
                pl.format("Straße {}", "p")
            )[:, 0],
            "direction_id": pattern % 2,
            "shape_id": pl.Series([f"shp{n}" for n in range(PATTERNS)]).gather(pattern),
        }
    ).write_csv(folder / "trips.txt")
    with (folder / "stop_times.txt").open("wb") as file:
        for first in range(0, trips, _BATCH):
            some = slice(first, min(first + _BATCH, trips))
            table = _calls(ids[some], stops[pattern[some]], pattern[some], departure[some], pace)
            table.write_csv(file, include_header=first == 0)


def _calls(ids: pl.Series, stops: Ints, pattern: Ints, departure: Ints, pace: Ints) -> pl.DataFrame:
    count = len(ids)
    arrival = departure[:, None] + pace[pattern][:, None] * np.arange(CALLS)
    return pl.DataFrame(
        {
            "trip_id": ids.gather(np.repeat(np.arange(count), CALLS)),
            "arrival_time": _clock(arrival.ravel()),
            "departure_time": _clock(arrival.ravel() + 20),
            "stop_id": _stop_ids(stops.ravel(), np.repeat(pattern % 2, CALLS)),
            "stop_sequence": np.tile(np.arange(1, CALLS + 1), count),
            "pickup_type": np.zeros(count * CALLS, dtype=np.int64),
            "drop_off_type": np.zeros(count * CALLS, dtype=np.int64),
        }
    )


def _clock(seconds: Ints) -> pl.Series:
    """Write seconds as HH:MM:SS, past 24:00 too."""
    texts = pl.Series(list(_texts(int(seconds.max()) + 1)))
    return texts.gather(seconds)


def _texts(end: int) -> Iterator[str]:
    for s in range(end):
        yield f"{s // 3600:02d}:{s // 60 % 60:02d}:{s % 60:02d}"
