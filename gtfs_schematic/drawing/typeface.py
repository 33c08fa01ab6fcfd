"""The diagram's typeface handed to cairo from memory, without the system's list of fonts.

FreeType opens the bytes of `labels.fonts.font_data` and cairo wraps the face. The other way, an
environment variable that points fontconfig to a folder, works only before anything in the process
has asked for a font, and changes the fonts of everything else in it. FreeType is looked up
*through* the cairo library, so that it is the very copy that cairo itself calls.
"""

from __future__ import annotations

import ctypes
from ctypes.util import find_library
from functools import lru_cache
from typing import Any

from gtfs_schematic.errors import SchematicError
from gtfs_schematic.labels import fonts

_CAIRO_FILES = ("libcairo.so.2", "libcairo.2.dylib", "libcairo-2.dll")
_MISSING = (
    "The PDF and PNG exports need the system library cairo (with FreeType), which was not found: "
    "install it (Debian and Ubuntu: apt install libcairo2) and run again."
)


@lru_cache(maxsize=1)
def cairo() -> Any:  # noqa: ANN401 - the library ships no types
    """Give the cairocffi module.

    Raises
    ------
    SchematicError
        If the system has no cairo library.
    """
    try:
        import cairocffi  # noqa: PLC0415 - importing it fails where the library is missing
    except OSError as error:
        raise SchematicError(_MISSING) from error
    return cairocffi


@lru_cache(maxsize=2 * len(fonts.FAMILIES))
def font_face(font: int, *, bold: bool) -> Any:  # noqa: ANN401 - as above
    """Give cairo's face of a font, by its index, in one weight; it lives until the program ends.

    Raises
    ------
    SchematicError
        If cairo is missing, or was built without FreeType.
    """
    library, freetype = _libraries()
    data = fonts.font_data(bold=bold, font=font)
    face = ctypes.c_void_p()
    fault = library.FT_New_Memory_Face(
        freetype, data, ctypes.c_long(len(data)), ctypes.c_long(0), ctypes.byref(face)
    )
    if fault:
        raise SchematicError(
            f"FreeType cannot read the typeface {fonts.FAMILIES[font]} (code {fault})."
        )
    wrap = library.cairo_ft_font_face_create_for_ft_face
    wrap.restype = ctypes.c_void_p
    wrap.argtypes = [ctypes.c_void_p, ctypes.c_int]
    module = cairo()
    pointer = module.ffi.cast("cairo_font_face_t *", wrap(face, 0))
    _KEPT.append(data)
    return module.FontFace._from_pointer(pointer, incref=False)  # noqa: SLF001 - the documented way


_KEPT: list[bytes] = []
"""FreeType reads from the bytes as long as the face lives, so they must not be collected."""


@lru_cache(maxsize=1)
def _libraries() -> tuple[ctypes.CDLL, ctypes.c_void_p]:
    """Give the cairo library, FreeType's functions within reach, and an open FreeType."""
    cairo()
    found = tuple(filter(None, map(find_library, ("cairo-2", "cairo", "libcairo-2"))))
    for name in found + _CAIRO_FILES:
        try:
            library = ctypes.CDLL(name)
            freetype = ctypes.c_void_p()
            fault = library.FT_Init_FreeType(ctypes.byref(freetype))
        except (OSError, AttributeError):
            continue
        if not fault and hasattr(library, "cairo_ft_font_face_create_for_ft_face"):
            return library, freetype
    raise SchematicError(_MISSING)
