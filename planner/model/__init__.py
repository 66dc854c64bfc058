"""Frozen records that the rooms hand to each other: what a campaign is made of.

In: plain values in fixed units, named by suffix (``_d`` days, ``_s`` seconds, ``_deg`` degrees,
``_mjd`` UTC days, ``_mag``, ``_dex``). Out: the same, unchangeable. A lag or timescale says its
frame (``lag_rest_d``, ``lag_obs_d``). No astronomy and no file reading happens here.
"""
