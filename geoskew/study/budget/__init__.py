"""The link budget of one place, line by line: every policy, clear sky and rain, all carriers.

``budget`` gives the data (what ``geoskew spot --budget --json`` prints), ``budget_as_text`` the same for
reading. The signed lines of a carrier sum to its margin, and the least margin is the layer's value.
"""

from __future__ import annotations

from geoskew.study.budget.assemble import budget
from geoskew.study.budget.text import budget_as_text

__all__ = ["budget", "budget_as_text"]
