"""Work in the field: visits, reports that come back, zones of one setting."""
