"""Limits are read, judged, and told apart by whether more is better."""

from __future__ import annotations

from dataclasses import replace

import pytest
import small_diagrams

from gtfs_schematic.cli.drift import MEASURES
from gtfs_schematic.config import settings_from_toml
from gtfs_schematic.drift.figures import FIGURE, FIGURES
from gtfs_schematic.drift.limits import Limit, exceeded, judge, limits_of, parse_limit
from gtfs_schematic.drift.measure import measure_edition
from gtfs_schematic.drift.model import DriftSettings
from gtfs_schematic.errors import EditionError, UsageError

DIAGRAM = small_diagrams.two_ways()


@pytest.fixture(scope="module")
def report():
    return measure_edition(DIAGRAM)


@pytest.mark.parametrize(
    ("text", "limit"),
    [
        ("displacement-p95=8%", Limit("displacement-p95", 0.08)),
        ("displacement-p95=0.08", Limit("displacement-p95", 0.08)),
        ("bearing-over-90=0", Limit("bearing-over-90", 0.0)),
        ("planning-error-over-1.15=5%", Limit("planning-error-over-1.15", 0.05)),
        (" bearing-p95 = 4e1 ", Limit("bearing-p95", 40.0)),
        ("distance-correlation=-.5", Limit("distance-correlation", -0.5)),
    ],
)
def test_limits_are_read_and_written(text, limit):
    assert parse_limit(text) == limit
    assert parse_limit(str(limit)) == limit


@pytest.mark.parametrize(
    ("text", "advice"),
    [
        ("residual", "not of the form NAME=VALUE"),
        ("residual<0.1", "not of the form NAME=VALUE"),
        ("residual=abc", "'abc' is no number"),
        ("residual=nan", "'nan' is no number"),
        ("residual=1e999", "is no number"),
        ("residul=0.1", "Did you mean residual"),
        ("zzz=1", "Known: residual"),
        ("displacement-p95=8", "is a share: give it as 0% to 100%, or 0 to 1"),
        ("bearing-p95=8%", "is no share, so it has no percent"),
    ],
)
def test_wrong_limits_get_advice(text, advice):
    with pytest.raises(UsageError, match=advice):
        parse_limit(text)


@pytest.mark.parametrize("figure", FIGURES, ids=lambda figure: figure.name)
def test_a_limit_may_be_reached_but_not_passed(report, figure):
    at = figure.read(report)
    beyond = at + 1e-6 if figure.more_is_better else at - 1e-6
    assert not exceeded(report, [Limit(figure.name, at)])
    assert [r.limit.measure for r in exceeded(report, [Limit(figure.name, beyond)])] == [
        figure.name
    ]


def test_options_win_over_the_configuration(report):
    text = b"[drift.limits]\ndisplacement-p95 = '8%'\nbearing-over-90 = 0\n"
    settings = settings_from_toml(text, "mine.toml").drift
    limits = limits_of(settings, ["displacement-p95=90%", "residual=1"])
    assert [str(limit) for limit in limits] == [
        "displacement-p95=90%",
        "bearing-over-90=0%",
        "residual=1",
    ]
    assert not judge(report, limits)[0].exceeded


def test_a_wrong_limit_in_the_configuration_is_named_with_its_path():
    with pytest.raises(UsageError, match=r"drift\.limits\.residul: no such measure"):
        limits_of(DriftSettings(limits={"residul": 1}))


def test_what_was_not_measured_cannot_be_judged():
    bare = measure_edition(replace(DIAGRAM, patterns=()))
    with pytest.raises(EditionError, match="holds no timetable"):
        judge(bare, [parse_limit("planning-error-max=2")])


def test_help_lists_every_measure():
    assert tuple(MEASURES.split()) == tuple(FIGURE)
