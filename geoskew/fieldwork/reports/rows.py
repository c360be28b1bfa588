"""One report from the field: a row as it was read, its text and the key that tells it from all others."""

from __future__ import annotations

import csv
import datetime as dt
import hashlib
import io
import json
from dataclasses import dataclass, field
from typing import Final, Literal

Moment = Literal["before", "after"]

COLUMNS: Final = (
    "site",
    "date",
    "setting_scale",
    "setting_inclinometer",
    "quality_before",
    "quality_after",
    "note",
)
# Columns that a file may have besides: which satellite carried the traffic, and which carrier was read.
OPTIONAL: Final = ("moment", "carrier")
NUMBERS: Final = ("setting_scale", "setting_inclinometer", "quality_before", "quality_after")


@dataclass(frozen=True, slots=True)
class Report:
    """What a crew, or a monitor, says of one site on one day.

    Attributes
    ----------
    site : str
        Identifier.
    date : str
        ISO 8601: a day, or a day and a time with or without an offset from UTC.
    setting_scale : float or None
        What the feed's scale showed when the crew left, degrees.
    setting_inclinometer : float or None
        The setting when the crew left, degrees, positive clockwise looking towards the satellite.
    quality_before, quality_after : float or None
        Es/N0 before and after the crew's work, dB.
    note : str
        Anything else.
    moment : str
        ``before`` or ``after`` the changeover where the row says so, else empty.
    carrier : str
        Name of the carrier that was read; empty: the scenario's first one.
    """

    site: str
    date: str
    setting_scale: float | None = None
    setting_inclinometer: float | None = None
    quality_before: float | None = None
    quality_after: float | None = None
    note: str = ""
    moment: str = ""
    carrier: str = ""
    key: str = field(init=False, compare=False, default="")

    def __post_init__(self) -> None:
        object.__setattr__(self, "key", _key(self))

    @property
    def day(self) -> dt.date:
        """The calendar day, as the crew wrote it."""
        return dt.date.fromisoformat(self.date[:10])

    @property
    def time(self) -> dt.datetime | None:
        """Day and time where the row has a time, else None."""
        return dt.datetime.fromisoformat(self.date) if len(self.date) > 10 else None

    @property
    def is_visit(self) -> bool:
        """Whether somebody was at the dish: a setting, or a signal read before the work."""
        return any(
            value is not None
            for value in (self.setting_scale, self.setting_inclinometer, self.quality_before)
        )

    def values(self) -> tuple[str | float | None, ...]:
        """Values in the order of `COLUMNS` and `OPTIONAL`."""
        return tuple(getattr(self, name) for name in (*COLUMNS, *OPTIONAL))

    def text(self) -> str:
        """The row as comma separated text."""
        stream = io.StringIO()
        csv.writer(stream, lineterminator="").writerow("" if one is None else one for one in self.values())
        return stream.getvalue()


def _key(report: Report) -> str:
    """A digest of the content: the same row in another file or spelling has the same."""
    return hashlib.sha256(json.dumps(report.values(), ensure_ascii=False).encode()).hexdigest()
