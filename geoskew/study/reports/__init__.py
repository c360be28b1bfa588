"""Reports from the field in a study: read, kept, reconciled, and what is left written out."""

from __future__ import annotations

from geoskew.study.reports.write import Outcome, report_on

__all__ = ["Outcome", "report_on"]
