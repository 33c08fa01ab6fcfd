"""Options of `adjust` become what an adjustment says."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import TYPE_CHECKING, Any

from gtfs_schematic.errors import UsageError

if TYPE_CHECKING:
    from gtfs_schematic.edition.adjustments import Adjustments
    from gtfs_schematic.network.model import Network

ABOUT = ("station", "line", "link", "merge", "group", "split", "word")
"""What may be adjusted, by the option that names it."""
_KINDS = {"station": "stations", "line": "lines", "link": "links", "word": "abbreviations"}
_FREE = {"drop", "out", "overwrite", "as_json", "quiet"}

Given = Mapping[str, Any]
Convert = Callable[["Network", Given], Any]


def kind_of(given: Given) -> str:
    """Give the option that says what is adjusted.

    Raises
    ------
    UsageError
        If there is not just one.
    """
    kinds = [kind for kind in ABOUT if given[kind]]
    if len(kinds) != 1:
        told = " and ".join(f"--{kind}" for kind in kinds) or "none"
        raise UsageError(
            f"Say what is adjusted by one of {', '.join(f'--{k}' for k in ABOUT)}; given: {told}."
        )
    return kinds[0]


def adjusted_by(said: Adjustments, network: Network, given: Given) -> Adjustments:
    """Give the adjustments with what the options say.

    Parameters
    ----------
    said
        What holds.
    network
        Before any adjustment.
    given
        The options by name.

    Raises
    ------
    UsageError
        If options do not go together, or name what the edition does not have.
    """
    from gtfs_schematic.edition.saying import line_of, with_saying

    kind = kind_of(given)
    values = _values(kind, network, given)
    if not values and not given["drop"] and kind not in ("merge", "group"):
        raise UsageError(f"Say what --{kind} is to be: see --help.")
    texts: Sequence[str] = [given[kind]] if isinstance(given[kind], str) else given[kind]
    if kind == "word":
        ids = list(texts)
    elif kind in ("line", "group"):
        ids = [line_of(network, text) for text in texts]
    else:
        ids = [_station(said, network, text) for text in texts]
    return with_saying(said, (_KINDS.get(kind, kind), ids), values, given["drop"])


def is_about(text: str, kind: str, given: Given) -> bool:
    """Whether a sentence about what applies to nothing is about what the options say."""
    ids: Sequence[str] = [given[kind]] if isinstance(given[kind], str) else given[kind]
    head = f"{_KINDS[kind]}." if kind in _KINDS else kind
    return text.startswith(head) and (kind == "link" or any(key in text for key in ids))


def _station(said: Adjustments, network: Network, text: str) -> str:
    """Give a station's id, or that of a part that a person split off."""
    from gtfs_schematic.edition.saying import station_of

    parts = {part.id for split in said.split for part in split.parts}
    return text if text in parts else station_of(network, text)


def _values(kind: str, network: Network, given: Given) -> dict[str, Any]:
    """Give what the options say of the thing; refuse options that do not suit it."""
    values = {}
    used = {kind, *_FREE} | ({"right", "below"} if given["beside"] else set())
    for option, (kinds, word, convert) in _SAID.items():
        if kind not in kinds:
            continue
        used.add(option)
        if given[option] not in (None, (), False):
            values[word] = convert(network, given)
    for option, value in given.items():
        if value not in (None, (), False) and option not in used:
            raise UsageError(f"--{option.replace('_', '-')} does not go with --{kind}.")
    return values


def _as_is(option: str) -> Convert:
    return lambda _, given: given[option]


def _pin(_: Network, given: Given) -> list[float]:
    try:
        x, y = (float(part) for part in given["pin"].split(","))
    except ValueError as error:
        raise UsageError(
            f"--pin {given['pin']}: give two numbers of millimetres, such as 120,80."
        ) from error
    return [x, y]


def _beside(network: Network, given: Given) -> dict[str, Any]:
    from gtfs_schematic.edition.saying import station_of

    offset = {"dx_mm": given["right"], "dy_mm": given["below"]}
    known = {key: value for key, value in offset.items() if value is not None}
    if not known:
        raise UsageError("--beside: say how far with --right, --below or both, in millimetres.")
    return {"station": station_of(network, given["beside"])} | known


def _lines(option: str) -> Convert:
    def convert(network: Network, given: Given) -> list[str]:
        from gtfs_schematic.edition.saying import line_of

        texts = given[option].split(",") if isinstance(given[option], str) else given[option]
        return [line_of(network, text) for text in texts]

    return convert


def _parts(_: Network, given: Given) -> list[dict[str, Any]]:
    parts = []
    for text in given["part"]:
        stops, _, name = text.partition("=")
        part: dict[str, Any] = {"stops": [stop for stop in stops.split(",") if stop]}
        parts.append(part | ({"name": name} if name else {}))
    return parts


_SAID: Mapping[str, tuple[tuple[str, ...], str, Convert]] = {
    "name": (("station", "line", "merge", "group"), "name", _as_is("name")),
    "note": (("station", "line", "link"), "note", _as_is("note")),
    "hide": (("station", "line"), "hide", _as_is("hide")),
    "color": (("line", "group"), "color", _as_is("color")),
    "text_color": (("line", "group"), "text_color", _as_is("text_color")),
    "short_name": (("station",), "short_name", _as_is("short_name")),
    "rows": (("station",), "label_rows", lambda _, given: given["rows"].split("/")),
    "label_side": (("station",), "label_side", _as_is("label_side")),
    "label_angle": (("station",), "label_angle", lambda _, given: int(given["label_angle"])),
    "pin": (("station",), "pin_mm", _pin),
    "beside": (("station",), "pin_from", _beside),
    "straight": (("station",), "straight", _lines("straight")),
    "direction": (("link",), "direction", _as_is("direction")),
    "order": (("link",), "order", _lines("order")),
    "part": (("split",), "parts", _parts),
    "short": (("word",), "short", _as_is("short")),
}
"""Per option the kinds that it goes with, the name of what it says, and how that is read."""
