"""Results on disk: rasters, contours, tables, summary, map, cards, report.

Every writer works on a part file and renames it at the end (:mod:`geoskew.outputs.files`), so that a
file under a final name is whole. Writers know layers, ramps, places and regions, but no physics, and
do not import each other; ``files`` and ``geopackage`` are what they share.
"""
