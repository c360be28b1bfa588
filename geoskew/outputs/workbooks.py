"""What every workbook (XLSX) of ours has: the same bytes for the same content."""

from __future__ import annotations

import re
import zipfile
from pathlib import Path
from typing import Any, Final

# The earliest time that a ZIP archive can hold stands for "no date".
_NO_TIME: Final = (1980, 1, 1, 0, 0, 0)
_CORE: Final = "docProps/core.xml"
_TIMES: Final = re.compile(r"(<dcterms:(created|modified)[^>]*>)[^<]*")


def save(book: Any, part: Path) -> None:
    """Save an openpyxl workbook without the time of writing; a work file lies beside it meanwhile."""
    raw = part.with_name("raw.xlsx")
    book.save(raw)
    with zipfile.ZipFile(raw) as source, zipfile.ZipFile(part, "w", zipfile.ZIP_DEFLATED) as target:
        for name in source.namelist():
            data = source.read(name)
            if name == _CORE:
                data = _TIMES.sub(r"\g<1>1980-01-01T00:00:00Z", data.decode("utf-8")).encode("utf-8")
            entry = zipfile.ZipInfo(name, _NO_TIME)
            entry.compress_type = zipfile.ZIP_DEFLATED
            target.writestr(entry, data)
    raw.unlink()
