"""Load a slow library when it is first used, so that commands that need it not start at once."""

from __future__ import annotations

import importlib.util
import sys
from types import ModuleType


def lazily(name: str) -> ModuleType:
    """Give a module that is executed when something of it is first asked for.

    Parameters
    ----------
    name
        Its full name; the packages above it are loaded at once.

    Raises
    ------
    ModuleNotFoundError
        If there is none.
    """
    if name in sys.modules:
        return sys.modules[name]
    spec = importlib.util.find_spec(name)
    if spec is None or spec.loader is None:
        raise ModuleNotFoundError(f"No module named {name!r}", name=name)
    loader = importlib.util.LazyLoader(spec.loader)
    spec.loader = loader
    module = importlib.util.module_from_spec(spec)
    sys.modules[name] = module
    loader.exec_module(module)
    return module
