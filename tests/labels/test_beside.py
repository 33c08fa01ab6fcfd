"""Names are placed beside those that stand, which stay to the hundredth of a millimetre."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from gtfs_schematic import pipeline
from gtfs_schematic.labels.beside import place_beside
from gtfs_schematic.labels.check import faults
from gtfs_schematic.labels.model import LabelledLayout, LabelSettings
from gtfs_schematic.labels.place import place_labels

QUICK = pipeline.Settings.model_validate({"layout": {"effort": "quick"}})


@pytest.fixture(scope="module")
def drawn() -> LabelledLayout:
    return pipeline.draw(Path(__file__).parents[2] / "data" / "before.zip", QUICK).labelled


def test_all_stay_where_nothing_is_touched(drawn):
    again = place_beside(drawn.bundled, drawn.settings, drawn.labels, drawn.run_badges)
    assert again == drawn


@pytest.mark.parametrize("seed", range(4))
def test_those_without_a_place_find_one_and_the_others_stay(drawn, seed):
    lost = sorted(drawn.labels)[seed::9]
    kept = {key: label for key, label in drawn.labels.items() if key not in lost}
    again = place_beside(drawn.bundled, drawn.settings, kept, drawn.run_badges)
    assert faults(again) == ()
    assert again.unplaced == ()
    changed = {key for key in kept if again.labels[key] != kept[key]}
    # Only who is in the way of a name that finds no place at all may be asked to go.
    assert len(changed) <= len(lost)


@pytest.mark.parametrize("side", ["E", "W", "N", "S", "NE", "SW"])
def test_a_wished_side_is_given_where_others_can_make_room(drawn, side):
    """At least as often as when all names are placed anew, which takes far longer."""
    met = anew = 0
    keys = sorted(drawn.labels)[::12]
    for key in keys:
        wishes = LabelSettings(sides={key: side})
        again = place_beside(drawn.bundled, wishes, drawn.labels, drawn.run_badges)
        assert faults(again) == ()
        assert again.unplaced == ()
        met += again.labels[key].side == side
        fresh = place_labels(drawn.bundled, wishes)
        anew += not fresh.unplaced and fresh.labels[key].side == side
    assert met >= max(anew, 1)


def test_what_stands_in_a_line_or_in_another_name_looks_for_a_place(drawn):
    first, second, third = sorted(drawn.labels)[:3]
    labels = dict(drawn.labels)
    away = labels[second].outline_mm[0]
    here = labels[first]
    by = (away[0] - here.outline_mm[0][0], away[1] - here.outline_mm[0][1])
    labels[first] = replace(
        here,
        outline_mm=tuple((x + by[0], y + by[1]) for x, y in here.outline_mm),
        pivot_mm=(here.pivot_mm[0] + by[0], here.pivot_mm[1] + by[1]),
        lines=tuple(replace(r, x_mm=r.x_mm + by[0], y_mm=r.y_mm + by[1]) for r in here.lines),
        badges=(),
    )
    labels[third] = replace(labels[third], lines=(replace(labels[third].lines[0], text="Else"),))
    again = place_beside(drawn.bundled, drawn.settings, labels, drawn.run_badges)
    assert faults(again) == ()
    assert again.labels[first] != labels[first]
    assert "Else" not in [row.text for row in again.labels[third].lines]
    rest = set(drawn.labels) - {first, second, third}
    assert sum(again.labels[key] != drawn.labels[key] for key in rest) <= 3
