"""Zones of one setting: where crews want one number a district rather than one a site."""

from __future__ import annotations

from geoskew.fieldwork.zones.partition import NO_DISTRICT, NO_ZONE, Partition, partition

__all__ = ["NO_DISTRICT", "NO_ZONE", "Partition", "partition"]
