"""Paths of a PDF by the colour they are filled with, through pdfium."""

import ctypes
from collections.abc import Iterator

import pypdfium2
import pypdfium2.raw as pdfium


def filled_with(page: pypdfium2.PdfPage, colour: str) -> Iterator[pypdfium2.PdfObject]:
    """Every path of `page` filled with `colour` ("#rrggbb")."""
    wanted = tuple(int(colour[i : i + 2], 16) for i in (1, 3, 5))
    for item in page.get_objects(filter=[pdfium.FPDF_PAGEOBJ_PATH]):
        mode, stroke = ctypes.c_int(), ctypes.c_int()
        pdfium.FPDFPath_GetDrawMode(item, mode, stroke)
        red, green, blue, alpha = (ctypes.c_uint() for _ in range(4))
        pdfium.FPDFPageObj_GetFillColor(item, red, green, blue, alpha)
        if not mode.value or (red.value, green.value, blue.value) != wanted:
            continue
        yield item
