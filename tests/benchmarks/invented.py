"""Invented campaigns of any number of varied targets, for benchmarks."""

from pathlib import Path

import numpy as np

HEAD = """\
campaign: {{name: Invented survey, first_night: 2027-03-01, last_night: 2029-02-28, seed: 77}}
site:
  name: Corran Ridge
  latitude: -30.4 deg
  longitude: -70.9 deg
  elevation: 2300 m
  time_zone: America/Santiago
  weather: {{clear: 72 %, bad_spell: 2.5 nights}}
telescopes:
  - {{name: C19, site: Corran Ridge, aperture: 1.9 m}}
  - {{name: C05, site: Corran Ridge, aperture: 0.5 m}}
streams:
  continuum:
    telescope: C05
    cadence: {imaging}
    exposure: 6 min
    signal_to_noise: {{value: 120, band: V, magnitude: 16.0, exposure: 5 min, airmass: 1.2}}
    floor: 1 %
  line:
    telescope: C19
    cadence: {spectra}
    exposure: 25 min
    spectrograph: {{throughput: 22 %, dispersion: 1.3 Angstrom, resolution: 5 Angstrom,
                   slit: 2 arcsec, angle: parallactic, pixel: 0.4 arcsec, read_noise: 4}}
    calibration: star in slit
    floor: 2 %
season_lengths: {lengths}
seasons: {seasons}
success: {{goal: 80 %, within: 30 %, error_below: 30 %, r_max_above: 0.5}}
simulation: {{trials: {trials}, resamples: {resamples}}}
targets:
"""


def campaign_text(
    targets: int,
    *,
    trials: int = 100,
    resamples: int = 40,
    imaging: str = "2 nights",
    spectra: str = "[2 nights, 5 nights, 10 nights]",
    lengths: str = "[90 d, 160 d]",
    seasons: str = "[1, 2]",
) -> str:
    """Return a campaign file of so many targets; target n is the same in every campaign."""
    lines = [
        HEAD.format(
            imaging=imaging,
            spectra=spectra,
            lengths=lengths,
            seasons=seasons,
            trials=trials,
            resamples=resamples,
        )
    ]
    for n in range(targets):
        rng = np.random.default_rng([2027, n])
        redshift = 10 ** rng.uniform(-2.0, -0.3)
        magnitude = np.clip(15.6 + 1.6 * np.log10(redshift / 0.05) + rng.normal(0, 0.7), 13.5, 19.5)
        host = np.clip(0.5 - 0.4 * np.log10(redshift / 0.01), 0.05, 0.6)
        lines.append(
            f"  - {{name: Invented {n:04d}, ra: {rng.uniform(0, 360):.4f} deg, "
            f"dec: {np.degrees(np.arcsin(rng.uniform(-0.97, 0.42))):.4f} deg, "
            f"redshift: {redshift:.4f}, magnitude: {{band: V, value: {magnitude:.2f}}}, "
            f"host_fraction: {host:.2f}, ebv: {rng.uniform(0.01, 0.12):.3f}, "
            f"line_width: {rng.uniform(1800, 6000):.0f} km/s}}\n"
        )
    return "".join(lines)


def write_campaign(path: Path, targets: int, **choices: object) -> Path:
    """Write such a campaign file and return its path."""
    path.write_text(campaign_text(targets, **choices), encoding="utf-8")  # type: ignore[arg-type]
    return path
