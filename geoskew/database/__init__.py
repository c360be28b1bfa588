"""A PostGIS database: its address, one transaction at a time, and its errors in one clear line each.

The address may hold a password, so no text of ours, of a library or of the server leaves this package
before the password is masked in it.
"""

from geoskew.database.address import Address, address_of
from geoskew.database.connection import transaction
from geoskew.database.names import TableName, table_name

__all__ = ["Address", "TableName", "address_of", "table_name", "transaction"]
