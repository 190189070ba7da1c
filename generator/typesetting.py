"""Print templates and plain data → PDF, tagged for accessibility; QR codes.

Only this module knows the typesetter and the QR library. No font of the machine is used, only
those that come with the typesetter, and no date but the one given: equal input gives equal bytes.
"""

from __future__ import annotations

import datetime
import io
import json
import warnings
from collections.abc import Mapping
from pathlib import Path
from typing import Any

TEMPLATES = Path(__file__).parent / "templates" / "print"


def typeset(template: str, data: Mapping[str, Any], date: datetime.date) -> bytes:
    """The PDF that ``template`` makes of ``data``, with ``date`` as its day of creation.

    The PDF conforms to PDF/UA-1 (ISO 14289-1); the typesetter refuses what does not. Its warnings
    are passed on as ``UserWarning``. Raises ``RuntimeError`` when it refuses.
    """
    import typst

    midnight = datetime.datetime.combine(date, datetime.time(), datetime.UTC)
    pdf, remarks = typst.compile_with_warnings(
        TEMPLATES / f"{template}.typ",
        root=TEMPLATES,
        ignore_system_fonts=True,
        # °C stays on the line of its number
        sys_inputs={"data": json.dumps(data, ensure_ascii=False).replace(" °C", "\u00a0°C")},
        pdf_standards=["ua-1"],
        timestamp=midnight,
    )
    for remark in remarks:
        warnings.warn(str(remark), stacklevel=2)
    return pdf


def qr_code(text: str) -> str:
    """A QR code (ISO/IEC 18004, error correction level M) as SVG with the quiet zone it needs."""
    import segno

    drawn = io.BytesIO()
    code = segno.make(text, error="m", micro=False)
    code.save(drawn, kind="svg", xmldecl=False, svgclass=None, lineclass=None, border=4)
    return drawn.getvalue().decode("utf-8")
