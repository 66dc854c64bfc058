import json
import re
from dataclasses import replace

import numpy as np

from planner.export import schedule_json

UTC_TEXT = re.compile(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ")


def strict(raw):
    def refuse(word):
        raise AssertionError(f"{word} is not JSON")

    return json.loads(raw, parse_constant=refuse)


def test_visits_are_those_of_the_table(month):
    found = strict(schedule_json(month.campaign, month.schedule))
    assert len(found["visits"]) == len(month.visits)
    for visit, row in zip(found["visits"], month.schedule, strict=True):
        assert UTC_TEXT.fullmatch(visit["start_utc"])
        assert UTC_TEXT.fullmatch(visit["end_utc"])
        assert (visit["start_utc"], visit["end_utc"]) == (row["start_utc"], row["end_utc"])
        assert visit["exposure_s"] == row["exposure"]
        assert visit["moon_separation_deg"] == row["moon_separation"]
        assert visit["parallactic_angle_deg"] == row["parallactic_angle"]
    assert [t["name"] for t in found["targets"]] == ["One", "Two"]
    assert found["sites"][0]["longitude_deg"] == -70.9
    assert found["telescopes"][0] == {"name": "Big", "site": "Ridge", "aperture_m": 2.0}
    assert found["campaign"]["first_night"] == "2027-03-01"
    assert "no permission" in found["about"]


def test_what_is_not_known_is_null(month):
    table = month.schedule.copy()
    table["airmass"][0], table["moon_separation"][1] = np.inf, np.nan
    targets = (replace(month.campaign.targets[0], magnitude=None), *month.campaign.targets[1:])
    found = strict(schedule_json(replace(month.campaign, targets=targets), table))
    assert found["visits"][0]["airmass"] is None
    assert found["visits"][1]["moon_separation_deg"] is None
    assert found["targets"][0]["magnitude_mag"] is None


def test_names_come_back_and_bytes_repeat(hostile):
    raw = schedule_json(hostile.campaign, hostile.schedule)
    assert raw == schedule_json(hostile.campaign, hostile.schedule)
    found = strict(raw)
    assert [v["target"] for v in found["visits"]] == [v.target for v in hostile.visits]
