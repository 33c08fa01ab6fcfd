"""Exchange two folders in one step, where the system can."""

from __future__ import annotations

import ctypes
import os
import sys
from pathlib import Path

_HERE = -100
"""AT_FDCWD of fcntl.h on Linux: relative paths are seen from the working folder."""
_EXCHANGE = 2
"""RENAME_EXCHANGE of linux/fs.h."""


def exchanged(one: Path, other: Path) -> bool:
    """Let two paths exchange what they name, both or neither.

    Linux has a call for this since 3.15 (renameat2); other systems, and some file systems, do not.

    Returns
    -------
    bool
        Whether it was done; if not, nothing was.
    """
    if not sys.platform.startswith("linux"):
        return False
    try:
        call = ctypes.CDLL(None, use_errno=True).renameat2
    except (OSError, AttributeError):
        return False
    paths = (os.fsencode(one), os.fsencode(other))
    return bool(call(_HERE, paths[0], _HERE, paths[1], ctypes.c_uint(_EXCHANGE)) == 0)
