"""How far drift has grown over editions, so that a series of small patches does not wander off."""

from __future__ import annotations

from collections.abc import Sequence

from pydantic import BaseModel, ConfigDict, Field

from gtfs_schematic.edition.model import Edition, EditionDrift

_LISTED = 12
"""How many editions are remembered: the first, and the latest."""


class RevisionSettings(BaseModel):
    """What may change from one edition to the next."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    relax: float = Field(default=0.0, ge=0.0, le=1.0)
    """0 moves only what must move, 1 lets all links get even again; directions stay."""
    most_drift_growth: float = Field(default=0.0, ge=0.0)
    """By how much the drift may have grown since all was last laid out anew, as a share of what it
    was then; 0: no limit."""


def drifts_after(
    before: Edition, was: EditionDrift, now: EditionDrift, *, anew: bool
) -> tuple[EditionDrift, ...]:
    """Give the drift of an edition after that of those before, since all was laid out anew.

    Parameters
    ----------
    before
        The edition that is revised.
    was, now
        Its drift, and that of the new one.
    anew
        Whether the new one was laid out anew: then it is the first.
    """
    if anew:
        return (now,)
    # What was "this edition" has a hash by now, and another one is.
    earlier = (*before.drifts[:-1], was)
    if len(earlier) >= _LISTED:
        earlier = (earlier[0], *earlier[2 - _LISTED :])
    return (*earlier, now)


def growth_of(drifts: Sequence[EditionDrift]) -> float:
    """Share by which drift has grown since the first edition; negative where it has shrunk."""
    if len(drifts) < 2 or drifts[0].residual <= 0.0:
        return 0.0
    return drifts[-1].residual / drifts[0].residual - 1.0


def told(drifts: Sequence[EditionDrift]) -> str:
    """Say in a sentence how drift has grown; "" for a first edition."""
    if len(drifts) < 2:
        return ""
    growth = growth_of(drifts)
    since = drifts[0].service_date or "the first edition"
    return f"Drift: {drifts[-1].residual:.3f}, {growth:+.1%} since the edition of {since}"


def advice(drifts: Sequence[EditionDrift], settings: RevisionSettings) -> str:
    """Say that the limit is exceeded, and what to do; "" if it is not."""
    most = settings.most_drift_growth
    growth = growth_of(drifts)
    if not most or growth <= most:
        return ""
    return (
        f"Over {len(drifts)} editions the drift from the ground has grown by {growth:.1%}, more "
        f"than revision.most_drift_growth = {most:g} allows. Draw this feed anew, or revise with a "
        "larger revision.relax, or raise the limit."
    )
