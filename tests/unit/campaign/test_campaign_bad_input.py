"""Bad input: one clear message each, with its line; never anything but an InputError."""

import os

import pytest

from planner.base.errors import InputError
from planner.campaign import read_campaign

GOOD = """\
campaign:
  name: Corran Ridge pilot
  first_night: 2027-03-01
  last_night: 2028-10-31
  seed: 4021
targets:
  - name: Corran 1
    ra: 12:30:45.6
    dec: -05:23:28
    redshift: 0.05
    magnitude: {band: g, value: 16.2}
  - name: Corran 2
    ra: 79.05 deg
    dec: 41.2 deg
    redshift: 0.31
    log_luminosity_5100: 44.1
site:
  name: Corran Ridge
  latitude: -30.4 deg
  longitude: -70.9 deg
  elevation: 2300 m
  time_zone: America/Santiago
  weather: {clear: 70 %, bad_spell: 2.5 nights}
telescopes:
  - {name: C19, site: Corran Ridge, aperture: 1.9 m}
  - {name: C05, site: Corran Ridge, aperture: 0.5 m}
streams:
  continuum: {telescope: C05, cadence: [1 night, 2 nights]}
  line: {telescope: C19, cadence: [3 nights, 5 nights], exposure: 20 min}
limits: {airmass: 2.0, twilight: astronomical, moon_separation: 30 deg}
season_lengths: [60 d, 120 d]
seasons: [1, 2]
time: {nights: 200, hours_per_night: 6, blocked: [2027-05-01]}
success: {goal: 80 %, within: 30 %}
"""

# What is replaced, by what; the line and key of the one message; words that it holds.
CASES = {
    "typo in a key": ("cadence: [3", "cadance: [3", 29, "streams.line.cadance",
        "unknown key; did you mean `cadence`?"),
    "typo at the top": ("limits:", "limit:", 30, "limit", "did you mean `limits`?"),
    "key nobody knows": ("seed: 4021", "colour: blue", 5, "campaign.colour",
        "unknown key; expected one of name, first_night, last_night, seed"),
    "bare exposure": ("20 min", "20", 29, "streams.line.exposure",
        "20 has no unit; expected a time from 1 s to 12 h, such as 20 min"),
    "length for a time": ("20 min", "20 m", 29, "streams.line.exposure", "20 m is a length"),
    "unknown unit": ("20 min", "20 mim", 29, "streams.line.exposure", "unknown unit 'mim'"),
    "negative exposure": ("20 min", "-20 min", 29, "streams.line.exposure", "out of range"),
    "NaN exposure": ("20 min", "nan min", 29, "streams.line.exposure", "not a finite number"),
    "infinite exposure": ("20 min", "1e999 min", 29, "streams.line.exposure",
        "not a finite number"),
    "list for a value": ("20 min", "[20 min]", 29, "streams.line.exposure", "a list; expected"),
    "bare aperture": ("1.9 m}", "1.9}", 25, "telescopes[1].aperture", "1.9 has no unit"),
    "time as aperture": ("1.9 m}", "1.9 min}", 25, "telescopes[1].aperture", "is a time"),
    "no aperture": (", aperture: 1.9 m", "", 25, "telescopes[1].aperture",
        "missing; expected the mirror's diameter"),
    "bare latitude": ("-30.4 deg", "-30.4", 19, "site.latitude", "-30.4 has no unit"),
    "latitude beyond the pole": ("-30.4 deg", "-130.4 deg", 19, "site.latitude", "out of range"),
    "longitude in metres": ("-70.9 deg", "70 m", 20, "site.longitude", "is a length"),
    "bare percentage": ("goal: 80 %", "goal: 0.8", 34, "success.goal",
        "0.8 has no unit; expected a percentage"),
    "percentage above 100": ("clear: 70 %", "clear: 170 %", 23, "site.weather.clear",
        "170 % is out of range"),
    "months missing": ("clear: 70 %", "clear: {jan: 70 %}", 23, "site.weather.clear",
        "nothing for feb, mar"),
    "spell too short": ("clear: 70 %, bad_spell: 2.5", "clear: 20 %, bad_spell: 2.5", 23,
        "site.weather.bad_spell", "cannot fill the 80 % lost in jan; expected at least 4 nights"),
    "unknown zone": ("America/Santiago", "America/Santiaga", 22, "site.time_zone",
        "did you mean `America/Santiago`?"),
    "reversed dates": ("2028-10-31", "2026-10-31", 4, "campaign.last_night",
        "before first_night"),
    "endless campaign": ("2028-10-31", "2068-10-31", 4, "campaign.last_night",
        "a campaign of 42 years; expected at most 20 years"),
    "day that is not": ("2027-03-01", "2027-02-30", 3, "campaign.first_night", "is not a date"),
    "date in another order": ("2027-03-01", "01/03/2027", 3, "campaign.first_night",
        "01/03/2027 is not a date; expected the evening's date at the site"),
    "date in UTC": ("2027-03-01", "2027-03-01T20:00:00Z", 3, "campaign.first_night",
        "is not a date"),
    "no first night": ("  first_night: 2027-03-01\n", "", 1, "campaign.first_night", "missing"),
    "blocked nights reversed": ("[2027-05-01]", "[{from: 2027-05-09, to: 2027-05-01}]", 33,
        "time.blocked[1]", "`to` before `from`"),
    "half a seed": ("4021", "1.5", 5, "campaign.seed", "1.5 is not a whole number"),
    "negative seed": ("4021", "-1", 5, "campaign.seed", "out of range"),
    "RA 25 h": ("12:30:45.6", "25:30:45.6", 8, "targets[1].ra",
        "25:30:45.6 is out of range; expected a right ascension from 0 to 24 h"),
    "RA 361 deg": ("79.05 deg", "361 deg", 13, "targets[2].ra", "out of range"),
    "bare RA": ("79.05 deg", "79.05", 13, "targets[2].ra", "79.05 has no unit"),
    "RA with 75 minutes": ("12:30:45.6", "12:75:45.6", 8, "targets[1].ra",
        "minutes or seconds of 60 or more"),
    "dec beyond the pole": ("-05:23:28", "-95:23:28", 9, "targets[1].dec", "out of range"),
    "dec in hours": ("-05:23:28", "-05h23m28s", 9, "targets[1].dec", "is in hours"),
    "words as dec": ("-05:23:28", "south", 9, "targets[1].dec", "south is not a number"),
    "negative redshift": ("0.05", "-0.05", 10, "targets[1].redshift", "-0.05 is out of range"),
    "redshift zero": ("0.05", "0", 10, "targets[1].redshift", "out of range"),
    "redshift NaN": ("0.05", ".nan", 10, "targets[1].redshift", "not a finite number"),
    "redshift with unit": ("0.05", "0.05 km/s", 10, "targets[1].redshift", "not a bare number"),
    "no redshift": ("    redshift: 0.05\n", "", 7, "targets[1].redshift",
        "missing; expected a redshift such as 0.05"),
    "unknown band": ("band: g", "band: J", 11, "targets[1].magnitude.band",
        "J is not known; expected one of u, g, r, i, z, B, V, R"),
    "sentinel magnitude": ("16.2", "-99", 11, "targets[1].magnitude.value", "out of range"),
    "no brightness": ("    magnitude: {band: g, value: 16.2}\n", "", 7, "targets[1]",
        "no brightness; expected magnitude"),
    "two luminosities": ("log_luminosity_5100: 44.1",
        "log_luminosity_5100: 44.1\n    log_luminosity_3000: 44.2", 17,
        "targets[2].log_luminosity_3000", "a second luminosity"),
    "tiny luminosity": ("44.1", "4.1", 16, "targets[2].log_luminosity_5100", "out of range"),
    "all host": ("redshift: 0.05", "redshift: 0.05\n    host_fraction: 1", 11,
        "targets[1].host_fraction", "out of range"),
    "unknown line": ("redshift: 0.05", "redshift: 0.05\n    line: Hbetta", 11, "targets[1].line",
        "did you mean `Hbeta`?"),
    "bare line width": ("redshift: 0.05", "redshift: 0.05\n    line_width: 4000", 11,
        "targets[1].line_width", "4000 has no unit"),
    "bare mass": ("redshift: 0.05", "redshift: 0.05\n    mass: 3e7", 11, "targets[1].mass",
        "3e7 has no unit; expected a mass"),
    "no priority": ("redshift: 0.05", "redshift: 0.05\n    priority: 0", 11,
        "targets[1].priority", "out of range"),
    "target twice": ("Corran 2", "corran 1", 12, "targets[2].name",
        "a second target called corran 1, the first is on line 7"),
    "telescope twice": ("  - {name: C05", "  - {name: C19, aperture: 1 m}\n  - {name: C05", 26,
        "telescopes[2].name", "a second telescope called C19"),
    "unknown telescope": ("telescope: C19", "telescope: C18", 29, "streams.line.telescope",
        "unknown telescope `C18`; did you mean `C19`?"),
    "unknown site": ("C05, site: Corran Ridge", "C05, site: Coran Ridge", 26,
        "telescopes[2].site", "unknown site `Coran Ridge`; did you mean `Corran Ridge`?"),
    "cadence within a night": ("[1 night,", "[0.2 nights,", 28, "streams.continuum.cadence[1]",
        "out of range; expected a cadence from 1 to 400 nights"),
    "cadence twice": ("[1 night, 2 nights]", "[1 night, 1 d]", 28, "streams.continuum.cadence",
        "a value is given twice"),
    "no cadence": ("[1 night, 2 nights]", "[]", 28, "streams.continuum.cadence",
        "an empty list"),
    "cadence beyond the season": ("5 nights]", "70 nights]", 29, "streams.line.cadence",
        "a cadence of 70 nights in a season of 60 d"),
    "too many seasons": ("[1, 2]", "[1, 4]", 32, "seasons",
        "4 seasons of 60 d in a campaign of 611 nights"),
    "visit beyond the allotment": ("20 min", "7 h", 29, "streams.line.exposure",
        "a visit takes 7.12 h with overhead and slew, and C19 is ours for 6 h"),
    "unknown twilight": ("twilight: astronomical", "twilight: nauticle", 30, "limits.twilight",
        "did you mean `nautical`?"),
    "number for a section": ("{airmass: 2.0, twilight: astronomical, moon_separation: 30 deg}",
        "2.0", 30, "limits", "2.0; expected a section with the keys airmass, twilight"),
    "airmass below one": ("airmass: 2.0", "airmass: 0.5", 30, "limits.airmass", "out of range"),
    "key twice": ("seed: 4021", "name: Again", 5, "name",
        "the key is given twice, on lines 2 and 5"),
    "tag that would run code": ("Corran 1", "!!python/object/apply:os.system [true]", 7, "",
        "the YAML tag !!python/object/apply:os.system"),
    "tag of one's own": ("Corran 1", "!target one", 7, "", "the YAML tag !target"),
    "merge key": ("seed: 4021", "<<: {seed: 1}", 5, "<<", "expected every key written out"),
    "undefined alias": ("Corran 1", "*nobody", 7, "", "the alias *nobody that is not defined"),
    "tabs": ("  seed", "\tseed", 5, "", "expected spaces, not tabs"),
    "unclosed bracket": ("value: 16.2}", "value: 16.2", 12, "", "not valid YAML"),
    "colon in a text": ("Corran 1", "Corran: 1: 2", 7, "", "not valid YAML"),
    "two documents": ("seed: 4021", "seed: 4021\n---", 6, "", "a second document"),
    "site and sites": ("telescopes:", "sites: []\ntelescopes:", 24, "sites",
        "both `site` and `sites`"),
    "half a reference": ("exposure: 20 min", "signal_to_noise: {value: 30, band: V, magnitude: 16}",
        29, "streams.line.signal_to_noise.exposure", "missing; expected a time"),
    "negative aperture": ("aperture: 1.9 m", "aperture: -1.9 m", 25, "telescopes[1].aperture",
        "-1.9 m is out of range; expected a diameter from 5 cm to 40 m"),
    "seeing of zero": ("elevation: 2300 m", "seeing: 0 arcsec", 21, "site.seeing",
        "0 arcsec is out of range; expected a width from 0.2 to 10 arcsec"),
    "seeing in seconds": ("elevation: 2300 m", "seeing: 1 s", 21, "site.seeing", "1 s is a time"),
    "band nobody knows": ("elevation: 2300 m", "dark_sky: {W: 21}", 21, "site.dark_sky.W",
        "unknown key"),
    "throughput over one": ("exposure: 20 min", "spectrograph: {throughput: 120 %, "
        "dispersion: 1 Angstrom, resolution: 4 Angstrom, slit: 2 arcsec}", 29,
        "streams.line.spectrograph.throughput", "120 % is out of range; expected a percentage"),
    "no slit": ("exposure: 20 min", "spectrograph: {throughput: 20 %, dispersion: 1 Angstrom, "
        "resolution: 4 Angstrom}", 29, "streams.line.spectrograph",
        "neither `slit` nor `fibre`; expected the width of a slit"),
    "dispersion in arcsec": ("exposure: 20 min", "spectrograph: {throughput: 20 %, "
        "dispersion: 1 arcsec, resolution: 4 Angstrom, slit: 2 arcsec}", 29,
        "streams.line.spectrograph.dispersion", "1 arcsec is an angle"),
    "missing band": ("cadence: [1 night, 2 nights]", "camera: {throughput: 30 %, pixel: 1 arcsec}",
        28, "streams.continuum.camera.band", "missing; expected one of u, g, r"),
    "two descriptions": ("cadence: [1 night, 2 nights]", "camera: {band: V, throughput: 30 %, "
        "pixel: 1 arcsec}, signal_to_noise: {value: 9, band: V, magnitude: 16, exposure: 9 s}",
        28, "streams.continuum.camera", "both `signal_to_noise` and `camera`"),
    "wanted error of a fixed exposure": ("exposure: 20 min", "exposure: 20 min, wanted_error: 3 %",
        29, "streams.line.wanted_error", "a fixed exposure; expected `exposure: auto`"),
    "wanted error below the floor": ("exposure: 20 min", "exposure: auto, wanted_error: 2 %, "
        "floor: 3 %", 29, "streams.line.wanted_error", "2 % with a floor of 3 %"),
    "usual error below a high floor": ("exposure: 20 min", "exposure: auto, floor: 6 %", 29,
        "streams.line.wanted_error", "5 % with a floor of 6 %"),
    "wanted error below the usual floor": ("exposure: 20 min", "exposure: auto, "
        "wanted_error: 1 %", 29, "streams.line.wanted_error", "1 % with a floor of 2 %"),
    "moon nobody knows": ("exposure: 20 min", "moon: gray", 29, "streams.line.moon",
        "gray is not a number; expected any (or bright), grey, dark"),
    "telescope twice in a stream": ("exposure: 20 min", "also: [{telescope: C19}]", 29,
        "streams.line.also[1].telescope", "C19 a second time in this stream"),
    "unknown telescope joins": ("exposure: 20 min", "also: [{telescope: C91}]", 29,
        "streams.line.also[1].telescope", "unknown telescope `C91`; did you mean `C19`?"),
    "no telescope joins": ("exposure: 20 min", "also: [{exposure: 9 min}]", 29,
        "streams.line.also[1].telescope", "missing; expected the telescope that joins"),
    "images of no use": ("telescope: C05, cadence: [1 night, 2 nights]",
        "source: spectra, exposure: 1 min", 28,
        "streams.continuum.exposure", "not used, the continuum is measured in the spectra alone"),
    "all nights lost": ("aperture: 1.9 m", "aperture: 1.9 m, technical_loss: 100 %", 25,
        "telescopes[1].technical_loss", "out of range"),
    "reversed widths": ("success:", "simulation: {response_width: [150 %, 50 %]}\nsuccess:", 34,
        "simulation.response_width", "expected a least and a greatest width"),
    "line break in a name": ("Corran 2", '"Corran\\n2"', 12, "targets[2].name",
        "line breaks or control characters"),
}  # fmt: skip


def problems_of(path, **options):
    with pytest.raises(InputError) as caught:
        read_campaign(path, **options)
    assert caught.value.exit_status == 2
    assert caught.value.problems
    return caught.value.problems


@pytest.fixture
def file(tmp_path):
    return tmp_path / "campaign.yaml"


def test_the_good_file_is_good(file):
    file.write_text(GOOD)
    assert len(read_campaign(file).campaign.targets) == 2


@pytest.mark.parametrize("case", CASES)
def test_one_clear_message(file, case):
    old, new, line, key, words = CASES[case]
    assert GOOD.count(old) >= 1
    file.write_text(GOOD.replace(old, new, 1))
    (problem,) = problems_of(file)
    assert words in str(problem)
    assert (problem.file, problem.line, problem.key) == (str(file), line, key)
    assert "\n" not in str(problem)


def test_all_problems_come_at_once_in_order(file):
    wrong = ["typo in a key", "reversed dates", "RA 25 h", "bare latitude", "bare percentage"]
    text = GOOD
    for case in wrong:
        text = text.replace(*CASES[case][:2], 1)
    file.write_text(text)
    problems = problems_of(file)
    assert [p.line for p in problems] == [4, 8, 19, 29, 34]


def test_a_campaign_too_short_for_its_seasons(file):
    file.write_text(GOOD.replace("2028-10-31", "2027-06-01"))
    length, number = problems_of(file)
    assert (length.line, number.line) == (31, 32)
    assert length.found == "a season of 120 d in a campaign of 93 nights"
    assert number.found == "2 seasons of 60 d in a campaign of 93 nights"


def test_a_wrong_key_does_not_hide_that_dates_are_reversed(file):
    text = GOOD.replace("2028-10-31", "2026-10-31").replace("4021", "many")
    file.write_text(text)
    assert [p.key for p in problems_of(file)] == ["campaign.last_night", "campaign.seed"]


@pytest.mark.parametrize(
    ("section", "words"),
    [
        ("campaign", "missing; expected a section with first_night"),
        ("targets", "missing; expected a list of targets, or the path of one"),
        ("site", "missing; expected a section with name, latitude and longitude"),
        ("telescopes", "missing; expected a list such as"),
    ],
)
def test_missing_sections(file, section, words):
    import re

    file.write_text(re.sub(rf"^{section}:.*\n(?:[ -].*\n)*", "", GOOD, flags=re.MULTILINE))
    messages = [str(p) for p in problems_of(file)]
    assert any(words in message and f" {section}:" in message for message in messages)


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"", "the file is empty"),
        (b"  \n\n", "the file is empty"),
        (b"# only a comment\n", "nothing but comments"),
        (b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR", "is a binary file"),
        (b"campaign: caf\xe9\n", "is not UTF-8 text (see line 1)"),
        ("campaign: 1\n".encode("utf-16"), "is written in UTF-16"),
        (b'campaign: "\\ud800"\n', "campaign.yaml:1:"),
        (b"campaign: \x07\n", "a character that is not allowed"),
        (b"just words\n", "no sections"),
        (b"- a\n- b\n", "no sections"),
        (b"? [a, b]\n: 1\n", "a list or section as a key"),
        (b"a: &a [*a]\n", "the alias *a inside itself"),
        (b"[" * 100_000, "nested too deep"),
        (b"{a: " * 100_000, "nested too deep"),
        (b"a" * 20_000_001, "is too large (20 MB)"),
    ],
)
def test_files_that_are_no_campaign(file, content, words):
    file.write_bytes(content)
    assert words in str(problems_of(file)[0])


def test_alias_bombs_are_refused_before_they_unfold(file):
    levels = [f"a{n}: &a{n} [{', '.join([f'*a{n - 1}'] * 9)}]" for n in range(1, 12)]
    file.write_text("\n".join(["a0: &a0 [x, x, x, x, x, x, x, x, x]", *levels]))
    (problem,) = problems_of(file)
    assert problem.found == "aliases that unfold to too many values"
    chain = ["a0: &a0 [x]", *(f"a{n}: &a{n} [*a{n - 1}]" for n in range(1, 3000))]
    file.write_text("\n".join(chain))
    (problem,) = problems_of(file)
    assert problem.found == "lists or sections nested too deep"


def test_problems_stay_on_one_line_and_come_to_an_end(file):
    file.write_text(GOOD + '"two\\nlines": 1\n')
    (problem,) = problems_of(file)
    assert problem.key == r"two\nlines"
    file.write_text("x: 1\n" * 100_000)
    assert len(problems_of(file)) == 1000


def test_files_that_cannot_be_read(tmp_path, file, monkeypatch):
    assert "no such file" in str(problems_of(file)[0])
    assert "is a folder" in str(problems_of(tmp_path)[0])
    os.mkfifo(tmp_path / "pipe.yaml")
    assert "is a device or pipe" in str(problems_of(tmp_path / "pipe.yaml")[0])
    file.write_text(GOOD)

    def refuse(_):
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr("pathlib.Path.read_bytes", refuse)
    assert "no permission to read it" in str(problems_of(file)[0])


def test_a_telescope_at_one_of_several_sites_must_say_which(file):
    sites = "sites:\n- {name: A, latitude: 10 deg, longitude: 0 deg}\n"
    sites += "- {name: B, latitude: 20 deg, longitude: 5 deg}\ntelescopes"
    text = GOOD[: GOOD.index("site:\n")] + sites + GOOD[GOOD.index("telescopes") + 10 :]
    file.write_text(text.replace("C19, site: Corran Ridge", "C19").replace("Corran Ridge,", "A,"))
    (problem,) = problems_of(file)
    assert str(problem).endswith("telescopes[1].site: missing; expected one of A, B")


def test_relations_are_checked_against_the_known_ones(file):
    known = {"Hbeta": ("first", "second")}
    file.write_text(GOOD + "relations: {Hbeta: third, Hdelta: first, MgII: first}\n")
    problems = problems_of(file, relations=known)
    assert problems[0].found == "unknown relation third"
    assert problems[0].expected == "one of first, second"
    assert "unknown key" in problems[1].found
    assert problems[2].key == "relations.MgII"


def test_a_template_with_everything_commented_out_takes_the_defaults(file):
    file.write_text(
        GOOD[: GOOD.index("streams:")] + "streams:\n#  line: {}\nlimits:\n# airmass: 3\n"
    )
    assert read_campaign(file).campaign.limits.airmass == 2.0
