"""The whole diagram in a few figures."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from gtfs_schematic.drift.model import DriftSettings, DriftSummary, LinkDrift, StationDrift
from gtfs_schematic.drift.neighbors import neighborhood
from gtfs_schematic.drift.pairs import (
    octant_agreement,
    order_flips,
    pair_distances,
    pearson,
    spearman,
)

Plane = NDArray[np.complex128]


def summary_of(
    stations: Sequence[StationDrift],
    links: Sequence[LinkDrift],
    ground: Plane,
    sheet: Plane,
    settings: DriftSettings,
) -> DriftSummary:
    """Sum up stations, links and pairs of stations; see `drift.words` for what each figure means.

    Parameters
    ----------
    stations, links
        What was measured of each.
    ground, sheet
        Places of the stations, y up.
    settings
        How many neighbours are near.
    """
    share = np.array([station.displacement_share for station in stations])
    known = [link for link in links if link.bearing_change_deg is not None]
    change = np.abs([link.bearing_change_deg or 0.0 for link in known])
    weight = np.array([link.true_length_m for link in known])
    ratio = np.array([link.length_ratio or 1.0 for link in known])
    whole = float(weight.sum()) or 1.0
    lengths = weight, np.array([link.drawn_length_mm for link in known])
    apart = pair_distances(ground, sheet)
    near = neighborhood(ground, sheet, settings.neighbors)
    return DriftSummary(
        displacement_median_share=float(np.median(share)),
        displacement_p95_share=float(np.percentile(share, 95.0)),
        displacement_max_share=float(share.max()),
        bearing_mean_deg=float((change * weight).sum() / whole),
        bearing_p95_deg=float(np.percentile(change, 95.0)) if known else 0.0,
        bearing_over_22_5=float(weight[change > 22.5].sum() / whole),
        bearing_over_45=float(weight[change > 45.0].sum() / whole),
        bearing_over_90=float(weight[change > 90.0].sum() / whole),
        log_length_sd=float(np.log(ratio).std()) if known else 0.0,
        order_flips=order_flips(ground, sheet),
        octant_agreement=octant_agreement(ground, sheet),
        distance_correlation=pearson(*apart),
        distance_rank_correlation=spearman(*apart),
        link_correlation=pearson(*lengths),
        link_rank_correlation=spearman(*lengths),
        neighbor_agreement=near.agreement,
        trustworthiness=near.trustworthiness,
        continuity=near.continuity,
    )
