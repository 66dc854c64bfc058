"""Good campaign files: what is written is what is meant, and every default is told."""

import json
from dataclasses import FrozenInstanceError

import pytest

from planner.campaign import Default, as_dict, describe, read_campaign
from planner.model.observatory import (
    Camera,
    KnownCase,
    LineMeasurement,
    SkyQuality,
    Spectrograph,
)

SMALLEST = """\
campaign: {first_night: 2027-03-01, last_night: 2028-10-31}
targets:
  - {name: Corran 1, ra: 12:30:45, dec: -05:23:28, redshift: 0.05, log_luminosity_5100: 43.2}
site: {name: Corran Ridge, latitude: -30.4 deg, longitude: -70.9 deg}
telescopes:
  - {name: C05, aperture: 0.5 m}
  - {name: C19, aperture: 1.9 m}
"""
FULL = """\
campaign: {name: Two ridges, first_night: 2027-03-01, last_night: 2030-10-31, seed: 4021}
targets:
  - name: Corran 1
    ra: 12:30:45
    dec: -05:23:28
    redshift: 0.05
    magnitude: {band: r, value: 16.2}
    log_luminosity_5100: 43.2
    line: H-beta
    host_fraction: 40 %
    ebv: 0.03
    line_width: 4000 km/s
    line_equivalent_width: 80 angstrom
    mass: 3e7 Msun
    variability: {amplitude: 0.12 mag, timescale: 80 d}
    lag_rest: 2 weeks
    priority: 2
    iron_strength: 0.6
    notes: bright, seen before
sites:
  - name: Corran Ridge
    latitude: -30:24:00
    longitude: 289.1 deg
    elevation: 2.3 km
    time_zone: America/Santiago
    weather:
      clear: {jan: 82 %, feb: 80 %, mar: 75 %, apr: 70 %, may: 60 %, jun: 55 %,
              jul: 55 %, aug: 60 %, sep: 65 %, oct: 70 %, nov: 75 %, dec: 80 %}
      bad_spell: 60 h
    seeing: 0.9 arcsec
    dark_sky: {V: 21.7, r: 21}
    extinction: {V: 0.2 mag}
  - {name: Low Fell, latitude: 54.5 deg, longitude: -3.1 deg}
telescopes:
  - {name: C19, site: Corran Ridge, aperture: 190 cm, slew: 90 s, acquisition: 2 min,
     obstruction: 25 %, technical_loss: 5 %,
     time: {hours: 300 h, least_hours_per_night: 1,
            blocked: [2027-05-01, {from: 2027-06-01, to: 2027-06-09}]}}
  - {name: F04, site: Low Fell, aperture: 0.4 m}
  - {name: F05, site: Low Fell, aperture: 0.5 m}
streams:
  continuum: {telescope: F05, cadence: [4 d, 2 d], exposure: 3 min, overhead: 30 s, floor: 1 %,
              source: both, exposures: 3, read_out: 20 s, standards: 5 min, moon: grey,
              signal_to_noise: {value: 90, band: r, magnitude: 15.5, exposure: 3 min,
                                airmass: 1, sky_share: 30 %, read_share: 4 %},
              also: [{telescope: F04, exposure: auto, wanted_error: 3 %, moon: 40 %, floor: 2 %,
                      camera: {band: V, throughput: 30 %, pixel: 0.7 arcsec, read_noise: 8,
                               dark: 0.1, aperture: 1.5, comparison: 13.5,
                               comparison_stars: 4}}]}
  line: {telescope: C19, cadence: 3 nights, exposure: 0.5 h, overhead: 6 min, time: {hours: 90},
         calibration: narrow lines, narrow_width: 15 Angstrom, continuum_window: 10 nm,
         spectrograph: {throughput: 18 %, dispersion: 1.2 Angstrom, resolution: 0.5 nm,
                        slit: 2 arcsec, angle: 45 deg, guide: 6000 Angstrom, pixel: 0.3 arcsec,
                        read_noise: 4, dark: 0.003}}
limits: {airmass: 1.8, twilight: Nautical, moon_separation: 45 deg}
season_lengths: [180 d, 90 d]
seasons: 3
time: {nights: 200, hours_per_night: 6.5}
success: {goal: 90 %, within: 20 %, error_below: 25 %, r_max_above: 0.6, sigma_above: 2,
          cuts: strict, in_peak_above: 60 %, false_alarm_below: 3 %, robust_to: slow trend}
simulation: {trials: 40, resamples: 60, responsivity: 1.1, response_width: [20 %, 200 %],
             method: likelihood, detrend: yes}
cosmology: {hubble: 67.7 km/s/Mpc, omega_matter: 0.31}
relations: {Hbeta: second}
"""
KNOWN = {"Hbeta": ("first", "second"), "MgII": ("only",)}


def read(tmp_path, text, **options):
    file = tmp_path / "pilot.yaml"
    file.write_text(text)
    return read_campaign(file, **options)


def target(tmp_path, **keys):
    """Read one target with the given keys, as they would stand in the file."""
    given = {"name": "A", "ra": "10 deg", "dec": "10 deg", "redshift": "0.1",
             "log_luminosity_5100": "44"} | keys  # fmt: skip
    start, _, end = SMALLEST.partition("  - {name: Corran 1")
    lines = "".join(f"    {key}: {value}\n" for key, value in given.items())
    reading = read(tmp_path, f"{start}  -\n{lines}{end.partition(chr(10))[2]}")
    return reading.campaign.targets[0]


def test_everything_given_arrives_in_the_record(tmp_path):
    campaign = read(tmp_path, FULL, relations=KNOWN).campaign
    assert (campaign.name, campaign.seed) == ("Two ridges", 4021)
    # 2027-03-01 is MJD 61465 (Julian Day 2461465.5, counted from 2000-01-01 = MJD 51544).
    assert (campaign.first_night, campaign.last_night) == (61465, 61465 + 1340)
    ridge, fell = campaign.sites
    assert ridge.latitude_deg == -30.4
    assert ridge.longitude_deg == pytest.approx(-70.9)
    assert (ridge.elevation_m, ridge.time_zone) == (2300.0, "America/Santiago")
    assert ridge.weather.clear_fraction[:3] == (0.82, 0.8, 0.75)
    assert ridge.weather.bad_spell_nights == 2.5
    assert fell.weather.clear_fraction == (0.7,) * 12
    c19, f04, _ = campaign.telescopes
    assert (c19.aperture_m, c19.slew_s, c19.site) == (1.9, 90.0, "Corran Ridge")
    assert (c19.time.hours, c19.time.nights) == (300.0, None)
    assert c19.time.blocked == ((61526, 61526), (61557, 61565))
    assert (f04.time.hours, f04.time.nights, f04.time.hours_per_night) == (None, 200, 6.5)
    assert campaign.continuum.cadence_nights == (2.0, 4.0)
    assert campaign.line.cadence_nights == (3.0,)
    assert ridge.sky == SkyQuality(0.9, (("r", 21.0), ("V", 21.7)), (("V", 0.2),))
    assert (c19.obstruction, c19.acquisition_s, c19.technical_loss) == (0.25, 120.0, 0.05)
    assert c19.time.least_hours_per_night == 1.0
    (line,) = campaign.line.feeds
    assert (line.telescope, line.exposure_s, line.overhead_s) == ("C19", 1800.0, 360.0)
    assert line.instrument == Spectrograph(
        0.18, 1.2, pytest.approx(5.0), 2.0, False, 45.0, 6000.0, 0.3, 4.0, 0.003
    )
    assert line.floor == 0.02, "what narrow lines usually leave"
    assert campaign.line.measurement == LineMeasurement(pytest.approx(100.0), 15.0)
    assert campaign.line.time.hours == 90.0
    assert campaign.continuum.in_spectra
    first, second = campaign.continuum.feeds
    assert first.instrument == KnownCase(90.0, "r", 15.5, 180.0, 1.0, 0.3, 0.04)
    assert (first.floor, first.exposures, first.read_out_s, first.standards_s) == (0.01, 3, 20, 300)
    assert (first.moon_illumination_max, second.moon_illumination_max) == (0.65, 0.4)
    assert second.instrument == Camera("V", 0.3, 0.7, 8.0, 0.1, 1.5, 13.5, 4)
    assert (second.exposure_s, second.wanted_error, second.longest_s) == (None, 0.03, 3600.0)
    assert (campaign.limits.airmass, campaign.limits.sun_altitude_deg) == (1.8, -12.0)
    assert campaign.season_lengths_d == (90.0, 180.0)
    assert campaign.seasons == (3,)
    rule, draw = campaign.success, campaign.simulation
    assert (rule.goal, rule.within, rule.error_below) == (0.9, 0.2, 0.25)
    assert (rule.r_max_above, rule.sigma_above) == (0.6, 2.0)
    assert (rule.in_peak_above, rule.false_alarm_below, rule.agree) == (0.6, 0.03, True)
    assert rule.robust_to == ("slow trend",)
    assert (draw.method, draw.detrend) == ("likelihood", True)
    assert (draw.trials, draw.resamples, draw.responsivity) == (40, 60, 1.1)
    assert draw.response_width == (0.2, 2.0)
    assert campaign.cosmology.hubble_km_s_mpc == pytest.approx(67.7)
    assert campaign.relations == (
        ("Hbeta", "second"), ("Halpha", ""), ("MgII", ""), ("CIV", ""),
    )  # fmt: skip


def test_a_target_with_everything(tmp_path):
    reading = read(tmp_path, FULL)
    (one,) = reading.campaign.targets
    assert one.ra_deg == pytest.approx(15 * (12 + 30 / 60 + 45 / 3600), abs=1e-12)
    assert one.dec_deg == pytest.approx(-(5 + 23 / 60 + 28 / 3600), abs=1e-12)
    assert (one.magnitude.band, one.magnitude.value_mag) == ("r", 16.2)
    assert one.log_luminosity == (5100, 43.2)
    assert (one.line, one.host_fraction, one.ebv_mag) == ("Hbeta", 0.4, 0.03)
    assert (one.line_width_km_s, one.line_equivalent_width_a) == (4000.0, 80.0)
    assert one.log_mass == pytest.approx(7.4771, abs=1e-4)
    assert (one.amplitude_mag, one.timescale_rest_d, one.lag_rest_d) == (0.12, 80.0, 14.0)
    assert (one.priority, one.iron_strength, one.notes) == (2.0, 0.6, "bright, seen before")
    assert any("both brightnesses are used" in note for note in reading.notes)


def test_the_smallest_file(tmp_path):
    reading = read(tmp_path, SMALLEST, relations=KNOWN)
    campaign = reading.campaign
    assert campaign.name == "pilot"
    (line,), (continuum,) = campaign.line.feeds, campaign.continuum.feeds
    assert telescopes_of(campaign) == ("C19", "C05")
    assert campaign.season_lengths_d == campaign.seasons == campaign.line.cadence_nights == ()
    # Signal-to-noise grows as the diameter: 100 on 0.5 m, and 30 x 1.9 / 2 (common practice).
    assert continuum.instrument.signal_to_noise == 100.0
    assert line.instrument.signal_to_noise == 28.5
    taken = {d.key: d for d in reading.defaults}
    assert taken["streams.line.exposure"] == Default(
        "streams.line.exposure", "20 min", "common practice, no source"
    )
    assert taken["relations.Hbeta"].value == "first"
    for key in (
        "campaign.name", "campaign.seed", "site.elevation", "site.weather.clear",
        "site.weather.bad_spell", "telescopes.C19.slew", "telescopes.C05.site", "time",
        "streams.line.telescope", "streams.line.cadence", "streams.continuum.signal_to_noise",
        "limits.airmass", "limits.twilight", "season_lengths", "seasons", "success.goal",
        "simulation.response_width", "cosmology.hubble", "targets.priority",
    ):  # fmt: skip
        assert taken[key].value
        assert taken[key].reason


def test_every_default_can_be_written_into_the_file(tmp_path):
    """The values told are in the file's own language and give the same campaign."""
    reading = read(tmp_path, SMALLEST)
    taken = {d.key: d.value for d in reading.defaults}
    sections = ("limits", "success", "simulation", "cosmology")
    text = SMALLEST.replace("2028-10-31}", f"2028-10-31, seed: {taken['campaign.seed']}}}")
    for section in sections:
        keys = {k.split(".")[1]: v for k, v in taken.items() if k.startswith(f"{section}.")}
        assert keys
        text += f"{section}:\n" + "".join(f"  {key}: {value}\n" for key, value in keys.items())
    text += f"season_lengths: {taken['season_lengths']}\nseasons: {taken['seasons']}\nstreams:\n"
    for kind in ("continuum", "line"):
        text += f"  {kind}:\n"
        for key in ("telescope", "cadence", "exposure", "overhead", "floor", "moon"):
            text += f"    {key}: {taken[f'streams.{kind}.{key}']}\n"
    again = read(tmp_path, text)
    assert again.campaign == reading.campaign
    assert not any(d.key.split(".")[0] in sections for d in again.defaults)


def test_nothing_is_called_a_default_that_was_given(tmp_path):
    keys = {d.key for d in read(tmp_path, FULL, relations=KNOWN).defaults}
    assert keys == {
        "sites.Low Fell.elevation", "sites.Low Fell.weather.clear",
        "sites.Low Fell.weather.bad_spell", "sites.Low Fell.seeing", "sites.Low Fell.dark_sky",
        "sites.Low Fell.extinction", "streams.line.floor", "streams.line.exposures",
        "streams.line.read_out", "streams.line.standards", "streams.line.moon",
        "streams.continuum.also[1].longest_exposure", "relations.MgII", "success.agree",
        "streams.line.deepen", "streams.continuum.deepen", "season_shifts",
        *(f"telescopes.{name}.{key}" for name in ("F04", "F05")
          for key in ("slew", "acquisition", "obstruction", "technical_loss")),
    }  # fmt: skip


def telescopes_of(campaign):
    return campaign.line.feeds[0].telescope, campaign.continuum.feeds[0].telescope


def test_one_telescope_takes_both_streams(tmp_path):
    text = SMALLEST.replace("  - {name: C05, aperture: 0.5 m}\n", "")
    assert telescopes_of(read(tmp_path, text).campaign) == ("C19", "C19")


def test_the_other_telescope_takes_the_other_stream(tmp_path):
    text = SMALLEST + "streams: {continuum: {telescope: C19}}\n"
    assert telescopes_of(read(tmp_path, text).campaign) == ("C05", "C19")


def test_a_continuum_from_spectra_needs_no_telescope(tmp_path):
    text = SMALLEST + "streams: {continuum: {source: spectra}, line: {cadence: [2 d, 5 d]}}\n"
    campaign = read(tmp_path, text).campaign
    assert campaign.continuum.in_spectra and not campaign.continuum.feeds  # noqa: PT018
    assert campaign.continuum.cadence_nights == campaign.line.cadence_nights == (2.0, 5.0)


def test_candidates_may_be_left_to_the_planner_in_so_many_words(tmp_path):
    text = SMALLEST + "season_lengths: auto\nseasons: auto\nstreams: {line: {cadence: auto}}\n"
    assert read(tmp_path, text).campaign == read(tmp_path, SMALLEST).campaign


def test_shifts_and_exposures_to_try(tmp_path):
    text = SMALLEST + "season_shifts: [30 d, -30 d, 0 d]\nstreams: {line: {deepen: [2, 0.5, 1]}}\n"
    found = read(tmp_path, text).campaign
    assert (found.season_shifts_d, found.line.deepen) == ((-30.0, 0.0, 30.0), (0.5, 1.0, 2.0))


@pytest.mark.parametrize(
    "name", ["NO", "0123", "1e5", "12:30", "2027-03-01", "off", "0x1F", "=", "é"]
)
def test_names_are_text_as_written(tmp_path, name):
    assert target(tmp_path, name=name).name == name


@pytest.mark.parametrize(
    ("ra", "degrees"),
    [
        ("12:30:45", 187.6875),
        ("12 30 45", 187.6875),
        ("12h30m45s", 187.6875),
        ("12h 30m 45.0s", 187.6875),
        ("'12:30:45'", 187.6875),
        ("12:30", 187.5),
        ("12.5 h", 187.5),
        ("187.6875 deg", 187.6875),
        ("187d41m15s", 187.6875),
        ("187.6875°", 187.6875),
        ("0:00:00", 0.0),
        ("23:59:59.9", 359.9995833),
    ],
)
def test_right_ascension_as_astronomers_write_it(tmp_path, ra, degrees):
    assert target(tmp_path, ra=ra).ra_deg == pytest.approx(degrees, abs=1e-7)


@pytest.mark.parametrize(
    ("dec", "degrees"),
    [
        ("-05:23:28", -5.3911111),
        ("+41:16:09", 41.2691667),
        ("41 16 09", 41.2691667),
        ("-0:30:00", -0.5),
        ("-00 30 00.0", -0.5),
        ("−05:23:28", -5.3911111),
        ("-5d23m28s", -5.3911111),
        ("-5.5 deg", -5.5),
        ("""-05°23'28" """, -5.3911111),
        ("90 deg", 90.0),
    ],
)
def test_declination_as_astronomers_write_it(tmp_path, dec, degrees):
    assert target(tmp_path, dec=dec).dec_deg == pytest.approx(degrees, abs=1e-7)


@pytest.mark.parametrize(
    "value", ["44", "44.0", "1e44", "1e44 erg/s", "1.0E+44", "1e37 W", "44 dex"]
)
def test_luminosities_as_astronomers_write_them(tmp_path, value):
    wavelength, log = target(tmp_path, log_luminosity_5100=value).log_luminosity
    assert (wavelength, log) == (5100, pytest.approx(44.0))


@pytest.mark.parametrize("value", ["0.1", "+0.1", "1e-1", "1.0E-01", ".1", "'0.1'"])
def test_numbers_as_astronomers_write_them(tmp_path, value):
    assert target(tmp_path, redshift=value).redshift == 0.1


@pytest.mark.parametrize(
    ("written", "evening"),
    [
        ("2027-03-01", 61465),
        ("2027-03-01 20:00:00", 61465),
        ("2027-03-01T20:00", 61465),
        ("2027-03-01 12:00", 61465),
        ("2027-03-02 03:30:00", 61465),
        ("2027-03-01 00:00:00", 61465),
        ("'2027-03-01'", 61465),
    ],
)
def test_a_date_with_a_time_names_its_night(tmp_path, written, evening):
    reading = read(tmp_path, SMALLEST.replace("2027-03-01", f"{written}"))
    assert reading.campaign.first_night == evening
    noted = [note for note in reading.notes if "in the evening of 2027-03-01" in note]
    assert len(noted) == (":" in written)


def test_an_alias_saves_writing(tmp_path):
    text = FULL.replace("clear: {jan", "clear: &ridge {jan")
    text = text.replace("longitude: -3.1 deg", "longitude: -3.1 deg, weather: {clear: *ridge}")
    one, two = read(tmp_path, text).campaign.sites
    assert one.weather.clear_fraction == two.weather.clear_fraction


def test_json_is_yaml(tmp_path):
    import yaml

    written = json.dumps(yaml.load(SMALLEST, yaml.BaseLoader))
    assert read(tmp_path, written).campaign == read(tmp_path, SMALLEST).campaign


def test_the_description_tells_values_and_defaults(tmp_path):
    text = describe(read(tmp_path, SMALLEST))
    for line in (
        "Campaign pilot",
        "  nights: 2027-03-01 to 2028-10-31 (611)",
        "  default: streams.line.exposure = 20 min (common practice, no source)",
        "  default: limits.airmass = 2.0 (common practice, no source)",
        "    exposure 20 min in one frame",
        "  Corran 1: 187.68750 -5.39111 deg, z 0.05, log L5100 43.2",
    ):
        assert line in text.splitlines()


def test_every_default_stands_in_the_description_once(tmp_path):
    for file in (SMALLEST, FULL):
        reading = read(tmp_path, file, relations=KNOWN)
        lines = describe(reading).splitlines()
        for default in reading.defaults:
            said = f"  default: {default.key} = {default.value} ({default.reason})"
            assert lines.count(said) == 1


def test_plain_data_is_json_with_dates(tmp_path):
    reading = read(tmp_path, FULL)
    data = json.loads(json.dumps(as_dict(reading)))
    assert data["campaign"]["first_night"] == "2027-03-01"
    assert data["campaign"]["telescopes"][0]["time"]["blocked"][1] == ["2027-06-01", "2027-06-09"]
    assert data["campaign"]["targets"][0]["magnitude"]["value_mag"] == 16.2
    assert len(data["defaults"]) == len(reading.defaults)
    assert data["files"] == [str(tmp_path / "pilot.yaml")]


def test_readings_cannot_be_changed(tmp_path):
    reading = read(tmp_path, SMALLEST)
    with pytest.raises(FrozenInstanceError):
        reading.campaign.seed = 2
