"""Every figure that sums up a drift report: its name, what it means, and where it comes from."""

from __future__ import annotations

from collections.abc import Callable

from gtfs_schematic.drift.figure import Figure, Reader
from gtfs_schematic.drift.model import PLANNING_RATIOS, DriftReport, Journeys


def _journeys(read: Callable[[Journeys], float]) -> Reader:
    def reader(report: DriftReport) -> float | None:
        return None if report.journeys is None else read(report.journeys)

    return reader


def _over(ratio: float) -> Reader:
    return _journeys(lambda journeys: dict(journeys.over)[ratio])


_DISPLACEMENT = (
    Figure(
        "residual",
        "Unlikeness to a true map, north up",
        "plain",
        "What is left after the drawing was laid on the ground as well as scale and shift allow: "
        "1 − (Re Σ z̄w)² / (Σ|z|² Σ|w|²), with true places z and drawn places w about their "
        "means. 0 is true to scale, 1 is no likeness.",
        lambda report: report.north_up.residual,
    ),
    Figure(
        "residual-free",
        "Unlikeness to a true map, turned freely",
        "plain",
        "The same with rotation allowed: 1 − |Σ z̄w|² / (Σ|z|² Σ|w|²), Procrustes analysis "
        "without reflection (Gower 1975). 0 to 1.",
        lambda report: report.free.residual,
    ),
    Figure(
        "rotation",
        "Turn of the whole drawing",
        "degrees",
        "How far the freely turned fit turns the drawing against north, either way. 0° to 180°.",
        lambda report: abs(report.free.rotation_deg),
    ),
    Figure(
        "displacement-median",
        "Displacement, median station",
        "share",
        "Distance from where a true map of the same size (the north-up fit) has a station to "
        "where it is drawn, as a share of the diagonal of the network's bounding box. Half of "
        "the stations lie nearer.",
        lambda report: report.summary.displacement_median_share,
    ),
    Figure(
        "displacement-p95",
        "Displacement, 95th percentile",
        "share",
        "The same; 95 % of the stations lie nearer.",
        lambda report: report.summary.displacement_p95_share,
    ),
    Figure(
        "displacement-max",
        "Displacement, farthest station",
        "share",
        "The same for the station that moved farthest.",
        lambda report: report.summary.displacement_max_share,
    ),
    Figure(
        "displacement-max-m",
        "Displacement, farthest station",
        "metres",
        "The same in metres on the ground.",
        lambda report: max(station.displacement_m for station in report.stations),
    ),
)

_LINKS = (
    Figure(
        "bearing-mean",
        "Change of bearing, mean",
        "degrees",
        "Angle between a link as drawn and on the ground, end to end, either way; mean weighted "
        "by true length. 0° to 180°; turning any bearing to the nearest multiple of 45° costs "
        "11.25° on average.",
        lambda report: report.summary.bearing_mean_deg,
    ),
    Figure(
        "bearing-p95",
        "Change of bearing, 95th percentile",
        "degrees",
        "95 % of the links change their bearing by less.",
        lambda report: report.summary.bearing_p95_deg,
    ),
    Figure(
        "bearing-max",
        "Change of bearing, largest",
        "degrees",
        "The same for the link that turned most.",
        lambda report: max((abs(k.bearing_change_deg or 0.0) for k in report.links), default=0.0),
    ),
    Figure(
        "bearing-over-22.5",
        "Length turned by more than 22.5°",
        "share",
        "Share of the network's true length whose links turn by more: they leave their nearest "
        "direction of eight.",
        lambda report: report.summary.bearing_over_22_5,
    ),
    Figure(
        "bearing-over-45",
        "Length turned by more than 45°",
        "share",
        "The same for a whole eighth of the compass.",
        lambda report: report.summary.bearing_over_45,
    ),
    Figure(
        "bearing-over-90",
        "Length turned by more than 90°",
        "share",
        "The same for links that seem to run back. Should be none.",
        lambda report: report.summary.bearing_over_90,
    ),
    Figure(
        "length-spread",
        "Unevenness of scale",
        "plain",
        "Standard deviation of the natural logarithm of each link's drawn over true length. 0 is "
        "one scale everywhere; 0.69 is a factor of two either way.",
        lambda report: report.summary.log_length_sd,
    ),
    Figure(
        "length-correlation",
        "Drawn and true length of links, correlation",
        "plain",
        "Pearson's correlation over links, −1 to 1.",
        lambda report: report.summary.link_correlation,
        more_is_better=True,
    ),
    Figure(
        "length-rank-correlation",
        "Drawn and true length of links, rank correlation",
        "plain",
        "Spearman's correlation over links, −1 to 1: whether longer links are drawn longer.",
        lambda report: report.summary.link_rank_correlation,
        more_is_better=True,
    ),
)

_PAIRS = (
    Figure(
        "distance-correlation",
        "Drawn and true distance, correlation",
        "plain",
        "Pearson's correlation over all pairs of stations, −1 to 1. A well-known diagram has "
        "0.22 (Guo 2011).",
        lambda report: report.summary.distance_correlation,
        more_is_better=True,
    ),
    Figure(
        "distance-rank-correlation",
        "Drawn and true distance, rank correlation",
        "plain",
        "Spearman's correlation over all pairs of stations, −1 to 1.",
        lambda report: report.summary.distance_rank_correlation,
        more_is_better=True,
    ),
    Figure(
        "order-flips",
        "Pairs in turned-round order",
        "share",
        "Share of pairs of stations, per axis, of which the one east (or north) of the other is "
        "drawn on its other side (orthogonal order, Misue and others 1995). A mirror image has "
        "50 %.",
        lambda report: report.summary.order_flips,
    ),
    Figure(
        "octant-agreement",
        "Pairs seen in the right direction",
        "share",
        "Share of pairs of stations of which one lies in the same eighth of the compass from the "
        "other as drawn and on the ground. Chance gives 12.5 %.",
        lambda report: report.summary.octant_agreement,
        more_is_better=True,
    ),
    Figure(
        "neighbor-agreement",
        "Nearest stations that stay nearest",
        "share",
        "Mean share of a station's nearest on the ground (five unless set otherwise) that are "
        "among its nearest as drawn.",
        lambda report: report.summary.neighbor_agreement,
        more_is_better=True,
    ),
    Figure(
        "trustworthiness",
        "Trustworthiness of nearness",
        "plain",
        "1 if whatever is drawn near is near, less for each station that intrudes, by its rank "
        "(Venna and Kaski 2001). 0 to 1.",
        lambda report: report.summary.trustworthiness,
        more_is_better=True,
    ),
    Figure(
        "continuity",
        "Continuity of nearness",
        "plain",
        "1 if whatever is near is drawn near, less for each station that is drawn away, by its "
        "rank (Venna and Kaski 2001). 0 to 1.",
        lambda report: report.summary.continuity,
        more_is_better=True,
    ),
    Figure(
        "false-neighbors",
        "False neighbors",
        "count",
        "Pairs of stations without a link or walk between them that are drawn within a short "
        "step and lie a long way apart.",
        lambda report: len(report.false_neighbors),
    ),
    Figure(
        "hidden-walks",
        "Hidden walks",
        "count",
        "Pairs of stations within a short walk of each other that are drawn far apart.",
        lambda report: len(report.hidden_walks),
    ),
    Figure(
        "competing-routes",
        "Competing routes compared wrongly",
        "count",
        "Pairs of routes between the same stations of which the diagram makes one look longer "
        "or shorter against the other by more than a set share, 20 % unless set otherwise: "
        "enough to shift riders (Guo and others 2017).",
        lambda report: len(report.competing),
    ),
)

_PLANNING = (
    Figure(
        "planning-error-mean",
        "Planning error, mean",
        "ratio",
        "Time of the way that looks shortest on the diagram over the least time by the "
        "timetable, over all pairs of stations (theoretical planning error, Milea, Schrijvers, "
        "Buchin and Haverkort 2011). 1 is no error. By day; waits are half the headway.",
        _journeys(lambda journeys: journeys.mean),
    ),
    Figure(
        "planning-error-p95",
        "Planning error, 95th percentile",
        "ratio",
        "The same; 95 % of the pairs have less.",
        _journeys(lambda journeys: journeys.p95),
    ),
    Figure(
        "planning-error-max",
        "Planning error, largest",
        "ratio",
        "The same for the pair of stations that is misled most.",
        _journeys(lambda journeys: journeys.largest),
    ),
    *(
        Figure(
            f"planning-error-over-{ratio:g}",
            f"Journeys over {100 * (ratio - 1):.0f} % too long",
            "share",
            "Share of pairs of stations for which the way that looks shortest takes longer than "
            f"the fastest by more than {100 * (ratio - 1):.0f} %.",
            _over(ratio),
        )
        for ratio in PLANNING_RATIOS
    ),
)

FIGURES: tuple[Figure, ...] = (*_DISPLACEMENT, *_LINKS, *_PAIRS, *_PLANNING)
"""All figures, in the order in which they are told."""

FIGURE: dict[str, Figure] = {figure.name: figure for figure in FIGURES}
"""The same by name."""
