"""Reports from the field: read, kept in a history, and reconciled with the plan."""

from __future__ import annotations

from geoskew.fieldwork.reports.evidence import Accuracy, Meter, Slot, slots_of
from geoskew.fieldwork.reports.history import History
from geoskew.fieldwork.reports.hypotheses import AIM_LOSSES_DB, STATES
from geoskew.fieldwork.reports.reading import Read, read_reports
from geoskew.fieldwork.reports.reconcile import Orders, Reconciled, reconcile
from geoskew.fieldwork.reports.rounds import Facts, Gathered, Gathering
from geoskew.fieldwork.reports.rows import Report

__all__ = [
    "AIM_LOSSES_DB",
    "STATES",
    "Accuracy",
    "Facts",
    "Gathered",
    "Gathering",
    "History",
    "Meter",
    "Orders",
    "Read",
    "Reconciled",
    "Report",
    "Slot",
    "read_reports",
    "reconcile",
    "slots_of",
]
