"""The plan of visits: sites to crews and days first, then each crew's days on the road."""

from __future__ import annotations

from geoskew.fieldwork.visits.distances import read_distances
from geoskew.fieldwork.visits.plan import place_numbers, plan_visits
from geoskew.fieldwork.visits.sheets import Plan

__all__ = ["Plan", "place_numbers", "plan_visits", "read_distances"]
