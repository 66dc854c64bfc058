"""Ground floor: errors, quantities, bands, time, random streams, files, workers, provenance.

In: plain values. Out: plain values. Nothing here knows sites, targets or the campaign file.
"""
