"""Errors for the person at the keyboard: what happened, where, and what to do."""

from __future__ import annotations

from typing import ClassVar


class SchematicError(Exception):
    """Root of every error that this package raises on purpose.

    The message says what is wrong, where, and what to do about it. ``exit_code`` is what the
    command line returns: 2 wrong usage, 3 input that cannot be used, 4 a limit exceeded.
    """

    exit_code: ClassVar[int] = 3


class UsageError(SchematicError, ValueError):
    """A wrong option, setting or argument."""

    exit_code: ClassVar[int] = 2


class FeedError(SchematicError, ValueError):
    """A feed that cannot be used.

    Parameters
    ----------
    what
        What is wrong, and what to do about it, as whole sentences.
    file, row, field, value
        Where: file in the feed, row number (the header is row 1), column, offending text.
    """

    def __init__(
        self,
        what: str,
        *,
        file: str | None = None,
        row: int | None = None,
        field: str | None = None,
        value: str | None = None,
    ) -> None:
        self.what, self.file, self.row, self.field, self.value = what, file, row, field, value
        place = ", ".join(
            part
            for part in (
                file,
                f"row {row}" if row is not None else None,
                f"field {field}" if field is not None else None,
                f"value {value!r}" if value is not None else None,
            )
            if part
        )
        super().__init__(f"{place}: {what}" if place else what)


class EditionError(SchematicError, ValueError):
    """A saved edition that cannot be read or written."""


class LayoutError(SchematicError, ValueError):
    """A request that the layout cannot meet; names the stations and limits that collide."""


class LimitExceededError(SchematicError):
    """The work is done, but a limit that the user set is exceeded."""

    exit_code: ClassVar[int] = 4


class InternalFaultError(SchematicError, RuntimeError):
    """A stage's own check found its output at fault: a defect of this program, not of the feed."""

    exit_code: ClassVar[int] = 1


def must_be_sound(stage: str, faults: tuple[str, ...]) -> None:
    """Stop if a stage's own check faults its output.

    Raises
    ------
    InternalFaultError
        Names the first ten faults.
    """
    if faults:
        listed = "\n".join(f"  - {fault}" for fault in faults[:10])
        more = f"\n  … and {len(faults) - 10} more" if len(faults) > 10 else ""
        raise InternalFaultError(
            f"The check of the {stage} stage found {len(faults)} faults, so nothing was written. "
            f"This is a defect of the program: please report it with the feed.\n{listed}{more}"
        )
