"""Every test runs with sockets refused and without the user's settings; shared small campaigns."""

import os
import socket
import tempfile

import numpy as np
import pytest

os.environ.setdefault("OMP_NUM_THREADS", "1")
os.environ["XDG_CONFIG_HOME"] = tempfile.mkdtemp()
for name in ("NO_COLOR", "COLUMNS"):
    os.environ.pop(name, None)

from planner.model.campaign import Campaign, Cosmology, Simulation, SuccessRule
from planner.model.observatory import (
    Feed,
    KnownCase,
    Limits,
    LineMeasurement,
    Site,
    SkyQuality,
    Stream,
    Telescope,
    TimeAllotment,
    WeatherClimate,
)
from planner.model.sky import Season
from planner.model.target import Forecast, Magnitude, Target
from planner.model.trial import FeedNights, Prospect


class NetworkRefusedError(RuntimeError):
    """A test, or what it runs, asked for the network."""


def _no_names(*arguments, **_):
    raise NetworkRefusedError(f"look-up of {arguments}")


@pytest.fixture(autouse=True)
def no_network(monkeypatch):
    """Refuse every connection but those between local processes."""
    original = socket.socket.connect

    def refuse(self, address, *_):
        if self.family in {socket.AF_INET, socket.AF_INET6}:
            raise NetworkRefusedError(f"connection to {address}")
        return original(self, address)

    monkeypatch.setattr(socket.socket, "connect", refuse)
    monkeypatch.setattr(socket, "getaddrinfo", _no_names)


FIRST_NIGHT = 61465  # 2027-03-01


@pytest.fixture(scope="session")
def site():
    sky = SkyQuality(1.2, (("V", 21.8),), (("V", 0.15),))
    return Site("Ridge", -30.4, -70.9, 2300.0, None, WeatherClimate((0.75,) * 12, 2.5), sky)


def feed(telescope, **options):
    """One telescope's part in a stream, from a known signal-to-noise."""
    known = KnownCase(options.pop("signal_to_noise"), "V", 16.0, 300.0, 1.2, 0.2, 0.0)
    values = {
        "instrument": known, "floor": 0.01, "exposure_s": 300.0, "wanted_error": 0.0,
        "longest_s": 0.0, "exposures": 1, "read_out_s": 60.0, "overhead_s": 0.0,
        "standards_s": 0.0, "moon_illumination_max": 1.0,
    } | options  # fmt: skip
    return Feed(telescope, **values)


@pytest.fixture(scope="session")
def campaign(site):
    """Two easy targets, one telescope per stream, one season of half a year."""
    free = TimeAllotment()
    return Campaign(
        name="Small",
        first_night=FIRST_NIGHT,
        last_night=FIRST_NIGHT + 180,
        seed=7,
        targets=(
            Target("One", 175.5, -32.0, 0.02, Magnitude("V", 14.9), host_fraction=0.4),
            Target("Two", 181.0, -20.0, 0.03, Magnitude("V", 15.5), host_fraction=0.4),
        ),
        sites=(site,),
        telescopes=(
            Telescope("Big", "Ridge", 2.0, 0.3, 60.0, 60.0, 0.0, free),
            Telescope("Small", "Ridge", 0.5, 0.3, 30.0, 30.0, 0.0, free),
        ),
        continuum=Stream(
            "continuum", (1.0,), (feed("Small", signal_to_noise=120.0),), False, free, None
        ),
        line=Stream(
            "line",
            (3.0, 6.0),
            (feed("Big", signal_to_noise=30.0, floor=0.02, exposure_s=1200.0, read_out_s=300.0),),
            False,
            free,
            LineMeasurement(None, None),
        ),
        limits=Limits(2.0, -18.0, 30.0),
        season_lengths_d=(60.0, 120.0),
        seasons=(1,),
        season_shifts_d=(0.0,),
        success=SuccessRule(0.8, 0.3, 0.3, 0.5, 1.0),
        simulation=Simulation(8, 20, 0.8, (0.5, 1.5)),
        cosmology=Cosmology(),
        relations=(),
    )


@pytest.fixture(scope="session")
def forecast():
    return Forecast(
        name="One",
        line="Hbeta",
        relation="given",
        log_luminosity=43.2,
        luminosity_wavelength_a=5100,
        lag_rest_d=12.0,
        lag_obs_d=12.24,
        lag_scatter_dex=0.2,
        amplitude_mag=0.2,
        amplitude_scatter_dex=0.2,
        timescale_obs_d=150.0,
        timescale_scatter_dex=0.35,
        agn_fraction=0.6,
        log_mass=7.3,
        mass_dex=0.4,
        line_width_km_s=3000.0,
        line_equivalent_width_a=80.0,
        outside_range=False,
    )


@pytest.fixture(scope="session")
def nights():
    """Return a maker of nights on offer: every night, three hours about local midnight."""

    def make(count, *, error=0.02, visit_s=1800.0, keep=slice(None), **options):
        night = np.arange(count)[keep]
        middle = FIRST_NIGHT + night + 1.2
        values = {
            "telescope": "Big", "site": "Ridge", "in_spectra_of": None, "scale_error": 0.0,
            "exposure_s": 1200.0, "standards_s": 0.0, "most_visits": 10**6,
            "reached": True,
        } | options  # fmt: skip
        return FeedNights(
            night=night,
            window_start_mjd=middle - 1.5 / 24,
            window_end_mjd=middle + 1.5 / 24,
            best_mjd=middle + 0.1 / 24,
            airmass=np.full(night.size, 1.1),
            sky_ab_mag=np.full(night.size, 21.5),
            flux_error=np.full(night.size, error),
            signal_to_noise=np.full(night.size, 50.0),
            visit_s=visit_s,
            **values,
        )

    return make


@pytest.fixture(scope="session")
def prospect(forecast, nights):
    """One target visible on every night of half a year."""
    return Prospect(
        forecast,
        (nights(181),),
        (nights(181, error=0.01, visit_s=420.0, telescope="Small", exposure_s=300.0),),
        (Season(0, 0, 180, 181, 0),),
        "",
    )
