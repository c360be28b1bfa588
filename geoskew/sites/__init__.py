"""The site list: read from a table or a vector file, checked row by row, nothing dropped silently."""

from geoskew.sites.listing import Rejected, SiteList
from geoskew.sites.meanings import NUMBERS, PLACE_COLUMNS, RESERVED, YES_NO
from geoskew.sites.read import ENDINGS, read_sites

__all__ = [
    "ENDINGS",
    "NUMBERS",
    "PLACE_COLUMNS",
    "RESERVED",
    "YES_NO",
    "Rejected",
    "SiteList",
    "read_sites",
]
