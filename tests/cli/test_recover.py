"""The command for an observer's own light curves, and the library behind it."""

import json

import numpy as np
import pytest
from astropy import units as u
from astropy.time import Time

from planner import curves
from planner.campaign.cuts import CUTS, cuts_named
from planner.cli.main import main
from planner.lightcurves import draw_pair

LAG_D = 14.0


@pytest.fixture
def files(tmp_path):
    """A good campaign of 200 days, and a line that knows nothing of it."""
    rng = np.random.default_rng(4)
    t1, t2 = (np.sort(rng.uniform(0, 200, n)) + 61000 for n in (140, 60))
    x, y = draw_pair(rng, t1, t2, 60.0, LAG_D, 12.0)
    _, stranger = draw_pair(rng, t1, t2, 60.0, LAG_D, 12.0)
    for name, t, flux, error in (
        ("continuum", t1, 5 + 0.5 * x, 0.08),
        ("line", t2, 20 + 2 * y, 0.4),
        ("stranger", t2, 20 + 2 * stranger, 0.4),
    ):
        rows = [f"{a},{b + error * rng.normal()},{error}" for a, b in zip(t, flux, strict=True)]
        (tmp_path / f"{name}.csv").write_text("\n".join(["time,flux,flux_error", *rows]))
    return tmp_path


def read(folder, name):
    return np.genfromtxt(folder / f"{name}.csv", delimiter=",", skip_header=1).T


@pytest.mark.slow
def test_every_method_finds_the_lag_and_the_figure_is_drawn(files, capsys):
    out = files / "out"
    words = ["recover", str(files / "continuum.csv"), str(files / "line.csv")]
    assert main([*words, "--out", str(out)]) == 0
    text = capsys.readouterr().out
    rows = {line.split("  ")[0]: line for line in text.splitlines()}
    assert "  yes  " in rows["correlation"]
    assert "  yes  " in rows["likelihood"]
    assert "of 400 simulations" in text
    assert (out / "recovery.png").read_bytes().startswith(b"\x89PNG")
    assert main([*words, "--json", "--cuts", "strict"]) == 0
    found = json.loads(capsys.readouterr().out)
    for method in ("correlation", "likelihood"):
        assert found[method]["lag_lo_d"] - 3 < LAG_D < found[method]["lag_hi_d"] + 3
    assert found["agree"]
    assert found["chance"] < 0.03
    assert found["likelihood"]["log_odds"] > 5


@pytest.mark.slow
def test_a_line_that_follows_nothing_is_not_claimed(files, capsys):
    words = ["recover", str(files / "continuum.csv"), str(files / "stranger.csv"), "--json"]
    assert main(words) == 0
    found = json.loads(capsys.readouterr().out)
    assert not found["correlation"]["claim"]
    assert not found["likelihood"]["claim"]
    assert found["likelihood"]["log_odds"] < 3


def test_too_few_epochs_are_said_by_every_method(files, capsys):
    (files / "two.csv").write_text("time,flux,flux_error\n61000,1,0.1\n61009,2,0.1\n")
    assert main(["recover", str(files / "continuum.csv"), str(files / "two.csv")]) == 1
    text = capsys.readouterr().out
    assert text.count("  none  ") == 3
    assert "fewer than" in text


def test_the_library_takes_times_with_units(files):
    (t1, f1, e1), (t2, f2, e2) = read(files, "continuum"), read(files, "line")
    lags = np.arange(-60.0, 90.0, 1.0)
    plain = curves.correlate(t1, f1, t2, f2, lags)
    hours = curves.correlate(
        Time(t1, format="mjd"), f1, Time(t2, format="mjd"), f2, (lags * 24) * u.hour
    )
    np.testing.assert_allclose(hours, plain, atol=1e-9)
    result = curves.resample(t1, f1, e1, t2, f2, e2, lags, resamples=50)
    assert result.lag_d == pytest.approx(LAG_D, abs=3)
    post = curves.posterior(t1, f1, e1, t2, f2, e2, -60 * u.d, 90 * u.d, 60 * u.d)
    assert post.lag_d == pytest.approx(LAG_D, abs=2)
    bound = curves.forecast(t1, e1, t2, e2, LAG_D, 0.5, 60.0, scale=4.0)
    assert bound.error_d < 0.5 * (post.lag_hi_d - post.lag_lo_d) * 1.3


def test_named_cuts_get_stricter():
    loose, usual, strict = (cuts_named(name) for name in CUTS)
    assert loose.error_below > usual.error_below > strict.error_below
    assert loose.r_max_above < usual.r_max_above < strict.r_max_above
    assert loose.sigma_above < usual.sigma_above < strict.sigma_above
    assert loose.in_peak_above < usual.in_peak_above < strict.in_peak_above
    assert loose.false_alarm_below > usual.false_alarm_below > strict.false_alarm_below
    assert [c.agree for c in (loose, usual, strict)] == [False, False, True]
