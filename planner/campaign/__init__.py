"""The campaign file and target lists: what may stand in them, and how they are read.

In: the path of a campaign file (YAML), which holds or names a list of targets (YAML, CSV, ECSV or
VOTable). Out: a `Reading`: the frozen campaign record, every default taken, notes on what was
read how, and the files. Anything wrong ends in one `InputError` with every problem found.
"""

from planner.campaign.cuts import cuts_named
from planner.campaign.describe import as_dict, describe
from planner.campaign.light_curve import LightCurve, read_light_curve
from planner.campaign.read import Reading, read_campaign
from planner.campaign.sections import Default

__all__ = [
    "Default",
    "LightCurve",
    "Reading",
    "as_dict",
    "cuts_named",
    "describe",
    "read_campaign",
    "read_light_curve",
]
