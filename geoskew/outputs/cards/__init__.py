"""Job cards for the crews: one page a site, for paper and phone, as HTML and PDF."""

from __future__ import annotations

from geoskew.outputs.cards.facts import CardFacts, CarrierLine
from geoskew.outputs.cards.write import write_cards

__all__ = ["CardFacts", "CarrierLine", "write_cards"]
