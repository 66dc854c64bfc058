"""Ground floor: errors, quantities, time, random streams, files, workers, provenance.

In: plain values. Out: plain values. Nothing here knows astronomy or the campaign file.
"""
