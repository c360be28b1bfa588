"""Which satellite carried the traffic when a report was made."""

from __future__ import annotations

from datetime import UTC, datetime, time, timedelta
from typing import Final

from geoskew.fieldwork.reports.rows import Report

# Hours of mean solar time in which field work is done (common practice, no source).
_FIRST_HOUR, _LAST_HOUR = time(6), time(20)
# What a clock at the site may differ from mean solar time by.
_CLOCK: Final = timedelta(hours=2)


def moment_of(report: Report, longitude: float, changeover: datetime, overlap: timedelta) -> str:
    """``before`` or ``after``, or empty where the day alone cannot tell.

    Parameters
    ----------
    report : Report
        Its own ``moment`` goes before its date.
    longitude : float
        Of the site, degrees: a time without an offset is local.
    changeover : datetime
        Aware.
    overlap : timedelta
        How long both satellites carry the traffic from then on; readings in that time may be of either.
    """
    if report.moment:
        return report.moment
    local = timedelta(hours=longitude / 15.0)
    when = report.time
    if when is not None and when.tzinfo is not None:
        first = last = when
    elif when is not None:
        at = when.replace(tzinfo=UTC) - local
        first, last = at - _CLOCK, at + _CLOCK
    else:
        first = datetime.combine(report.day, _FIRST_HOUR, tzinfo=UTC) - local
        last = datetime.combine(report.day, _LAST_HOUR, tzinfo=UTC) - local
    if last < changeover:
        return "before"
    return "after" if first >= changeover + overlap else ""
