"""Target lists in every format: the same targets, and one clear message for each fault."""

import io
import sys

import numpy as np
import pytest
from astropy.io import votable
from astropy.table import MaskedColumn, QTable, Table
from astropy.units import Quantity

from planner.base.errors import InputError
from planner.campaign import read_campaign

HEAD = """\
campaign: {{first_night: 2027-03-01, last_night: 2028-10-31}}
site: {{name: Corran Ridge, latitude: -30.4 deg, longitude: -70.9 deg}}
telescopes: [{{name: C19, aperture: 1.9 m}}]
targets: {0}
"""
YAML = """\
- name: Corran 1
  ra: 187.6875 deg
  dec: -5.25 deg
  redshift: 0.05
  magnitude: {band: g, value: 16.2}
  line: Hbeta
  host_fraction: 0.4
  line_width: 4000 km/s
  mass: 3e7 Msun
  variability: {amplitude: 0.12, timescale: 80 d}
  lag_rest: 20 d
- name: "0123"
  ra: 79.125 deg
  dec: 41.5 deg
  redshift: 0.31
  log_luminosity_5100: 44.1
  notes: far, faint
"""
CSV = """\
# made by hand
name,ra [deg],dec [deg],redshift,magnitude_band,magnitude_value,log_luminosity_5100,line,\
host_fraction,line_width [km/s],mass [Msun],variability_amplitude,variability_timescale [d],\
lag_rest [d],notes
Corran 1,187.6875,-5.25,0.05,g,16.2,,Hbeta,0.4,4000,3e7,0.12,80,20,

0123,79.125,41.5,0.31,,,44.1,,,,,,,,"far, faint"
"""
UNITS = {"ra": "deg", "dec": "deg", "line_width": "km/s", "mass": "Msun",
         "variability_timescale": "d", "lag_rest": "d"}  # fmt: skip
SHORT = "name,ra,dec,redshift,log_luminosity_5100\nA,12:30:45,-05:23:28,0.05,44\n"


def table(masked=True):
    """Return the list as an astropy table with units and missing cells."""
    rows = {
        "name": ["Corran 1", "0123"], "ra": [187.6875, 79.125], "dec": [-5.25, 41.5],
        "redshift": [0.05, 0.31], "magnitude_band": ["g", None],
        "magnitude_value": [16.2, None], "log_luminosity_5100": [None, 44.1],
        "line": ["Hbeta", None], "host_fraction": [0.4, None], "line_width": [4000.0, None],
        "mass": [3e7, None], "variability_amplitude": [0.12, None],
        "variability_timescale": [80.0, None], "lag_rest": [20.0, None],
        "notes": [None, "far, faint"],
    }  # fmt: skip
    made = Table()
    for name, cells in rows.items():
        fill = "" if any(isinstance(c, str) for c in cells) else (-99.0 if masked else np.nan)
        column = [fill if c is None else c for c in cells]
        mask = [c is None and masked for c in cells]
        made[name] = MaskedColumn(column, mask=mask, unit=UNITS.get(name))
    return made


def votable_bytes(made, **options):
    buffer = io.BytesIO()
    votable.writeto(votable.from_table(made), buffer, **options)
    return buffer.getvalue()


def ecsv_bytes(made):
    buffer = io.StringIO()
    made.write(buffer, format="ascii.ecsv")
    return buffer.getvalue().encode()


def read(folder, name, content):
    (folder / name).write_bytes(content if isinstance(content, bytes) else content.encode())
    (folder / "plan.yaml").write_text(HEAD.format(name))
    return read_campaign(folder / "plan.yaml")


def problems_of(folder, name, content):
    with pytest.raises(InputError) as caught:
        read(folder, name, content)
    return caught.value.problems


@pytest.fixture
def expected(tmp_path):
    inline = "\n" + "".join(f"  {line}\n" for line in YAML.splitlines())
    (tmp_path / "inline.yaml").write_text(HEAD.format(inline))
    targets = read_campaign(tmp_path / "inline.yaml").campaign.targets
    assert [t.name for t in targets] == ["Corran 1", "0123"]
    assert targets[1].magnitude is None
    return targets


FORMATS = {
    "list.yaml": lambda: YAML,
    "keyed.yml": lambda: "targets:\n" + YAML,
    "list.csv": lambda: CSV,
    "bom.csv": lambda: "\ufeff" + CSV.replace("\n", "\r\n"),
    "semicolons.csv": lambda: (
        CSV.replace("far, faint", "far@ faint").replace(",", ";").replace("@", ",")
    ),
    "tabs.csv": lambda: (
        CSV.replace("far, faint", "far@ faint").replace(",", "\t").replace("@", ",")
    ),
    "list.ecsv": lambda: ecsv_bytes(table()),
    "quantities.ecsv": lambda: ecsv_bytes(QTable(table())),
    "misnamed.csv": lambda: ecsv_bytes(table()),
    "list.xml": lambda: votable_bytes(table()),
    "nan.vot": lambda: votable_bytes(table(masked=False)),
    "binary.votable": lambda: votable_bytes(table(), tabledata_format="binary2"),
}


@pytest.mark.parametrize("name", FORMATS)
def test_all_formats_give_the_same_targets(tmp_path, expected, name):
    reading = read(tmp_path, name, FORMATS[name]())
    assert reading.campaign.targets == expected
    assert reading.files == (tmp_path / "plan.yaml", tmp_path / name)


def test_paths_start_at_the_campaign_file(tmp_path, expected, monkeypatch):
    (tmp_path / "lists").mkdir()
    (tmp_path / "lists" / "one.csv").write_text(CSV)
    (tmp_path / "configs").mkdir()
    plan = tmp_path / "configs" / "plan.yaml"
    plan.write_text(HEAD.format("../lists/one.csv"))
    monkeypatch.chdir(tmp_path / "lists")
    assert read_campaign(plan).campaign.targets == expected


def test_catalogue_names_are_understood_and_noted(tmp_path):
    text = "Object,RAJ2000,DEJ2000,z,mag,band\nA,187.5,-5.25,0.05,16.2,g\n"
    reading = read(tmp_path, "list.csv", text)
    (one,) = reading.campaign.targets
    assert (one.name, one.ra_deg, one.dec_deg, one.redshift) == ("A", 187.5, -5.25, 0.05)
    notes = "\n".join(reading.notes)
    for said in (
        "column Object is read as name",
        "column RAJ2000 is read as ra",
        "column z is read as redshift",
        "column mag is read as magnitude_value",
        "ra without a unit is read as degrees",
        "dec without a unit is read as degrees",
    ):
        assert said in notes


def test_other_units_are_converted(tmp_path):
    made = table()
    made["line_width"] = MaskedColumn([4e6, 0], mask=[False, True], unit="m/s")
    made["ra"] = (187.6875 / 15, 79.125 / 15)
    made["ra"].unit = "hourangle"
    one, two = read(tmp_path, "list.ecsv", ecsv_bytes(made)).campaign.targets
    assert one.line_width_km_s == pytest.approx(4000.0)
    assert (one.ra_deg, two.ra_deg) == (pytest.approx(187.6875), pytest.approx(79.125))


def test_single_precision_reads_as_written(tmp_path):
    made = table()
    made["redshift"] = made["redshift"].astype(np.float32)
    one, _ = read(tmp_path, "list.xml", votable_bytes(made)).campaign.targets
    assert one.redshift == 0.05


def test_sexagesimal_columns(tmp_path):
    (one,) = read(tmp_path, "list.csv", SHORT).campaign.targets
    assert one.ra_deg == pytest.approx(187.6875)
    quantity = Quantity([1.0], "km/s")  # a unit on another column does not matter
    made = Table({"name": ["A"], "ra": ["12:30:45"], "dec": ["-05:23:28"], "redshift": [0.05],
                  "log_luminosity_5100": [44.0], "line_width": quantity * 3000})  # fmt: skip
    (two,) = read(tmp_path, "list.ecsv", ecsv_bytes(made)).campaign.targets
    assert (two.ra_deg, two.dec_deg) == (one.ra_deg, one.dec_deg)


BAD = {
    "wrong cell": (SHORT.replace("0.05", "-0.05"), "list.csv:2: row 1, redshift: -0.05 is out of"),
    "NaN": (SHORT.replace("0.05", "nan"), "list.csv:2: row 1, redshift: nan is not a finite"),
    "sentinel": (SHORT.replace("44", "-99"), "row 1, log_luminosity_5100: -99 is out of range"),
    "empty needed cell": (SHORT.replace("0.05", ""), "list.csv:2: row 1, redshift: missing"),
    "no brightness": (SHORT.replace(",44", ","), "list.csv:2: row 1: no brightness"),
    "unknown column": (SHORT.replace("redshift", "redshfit"),
        "unknown column `redshfit`; did you mean `redshift`?"),
    "useless column": (SHORT.replace("dec,", "dec,xq,").replace("28,", "28,1,"),
        "unknown column `xq`; expected columns among name, ra, dec"),
    "two columns for one": (SHORT.replace("dec,", "dec,z,").replace("28,", "28,0.1,"),
        "two columns for redshift: z and redshift"),
    "line break in a header": ('"a\nb",' + SHORT.replace("A,", "1,A,"),
        "unknown column `a\\nb`"),
    "short row": (SHORT + "B,12:30:45\n", "line 3 has 2 cells; expected 5 as in the header"),
    "open quote": (SHORT + '"B,1\n', "cannot be read"),
    "twice": (SHORT + SHORT.splitlines()[1], "list.csv:3: row 2, name: a second target called A"),
    "no rows": (SHORT.splitlines()[0], "an empty list"),
    "only comments": ("# nothing\n", "nothing but comments"),
    "empty": ("", "the file is empty"),
    "binary": (b"PK\x03\x04\0\0", "is a binary file"),
    "column without unit": (SHORT.replace("dec,", "dec,lag_rest,").replace("28,", "28,20,"),
        "the column lag_rest has no unit; expected a header with the unit, such as lag_rest [d]"),
    "column of the wrong kind": (
        SHORT.replace("dec,", "dec,lag_rest [km],").replace("28,", "28,20,"),
        "row 1, lag_rest: 20 km is a length"),
    "band without value": (
        SHORT.replace("dec,", "dec,magnitude_band,").replace("28,", "28,g,"),
        "row 1, magnitude_value: missing"),
}  # fmt: skip


@pytest.mark.parametrize("case", BAD)
def test_one_message_for_a_bad_list(tmp_path, case):
    content, words = BAD[case]
    problems = problems_of(tmp_path, "list.csv", content)
    assert words in "\n".join(map(str, problems))
    # A column that is not known leaves its key missing in the row: that is said as well.
    assert len(problems) == (2 if case == "unknown column" else 1)


def test_a_bad_unit_is_said_once_for_many_rows(tmp_path):
    rows = "".join(f"T{i},10 deg,10 deg,0.1,44,2000\n" for i in range(200))
    header = "name,ra,dec,redshift,log_luminosity_5100,line_width\n"
    (problem,) = problems_of(tmp_path, "list.csv", header + rows)
    assert problem.expected.endswith("line_width [km/s]")


@pytest.mark.parametrize(
    ("name", "content", "words"),
    [
        ("list.ecsv", "name,ra\nA,1\n", "is no ECSV table"),
        ("list.ecsv", "# %ECSV 1.0\n# ---\n# datatype: [\nname\n", "is no ECSV table"),
        (
            "list.ecsv",
            "# %ECSV 1.0\n# ---\n# !!python/object/apply:os.getcwd []\na\n1\n",
            "no ECSV",
        ),
        ("list.xml", "<html><body>404</body></html>", "is no VOTable"),
        ("list.xml", "<VOTABLE>", "is no VOTable"),
        ("list.xml", '<!DOCTYPE a [<!ENTITY b "c">]><VOTABLE/>', "defines XML entities"),
        ("list.vot", '<VOTABLE><STREAM href="http://localhost/x"/></VOTABLE>', "data elsewhere"),
        ("list.fits", "SIMPLE  =", "the ending '.fits' tells no format"),
        ("list.yaml", "name: A\n", "unknown key"),
        ("list.yaml", "targets: []\n", "an empty list"),
        ("list.yaml", "- {name: A, name: B}\n", "given twice, on lines 1 and 1"),
        ("list.yaml", "just words\n", "just words; expected a list of targets"),
    ],
)
def test_lists_that_are_none(tmp_path, name, content, words):
    problems = problems_of(tmp_path, name, content)
    assert words in str(problems[0])


def test_a_missing_list_is_told_at_its_line(tmp_path):
    (tmp_path / "plan.yaml").write_text(HEAD.format("nowhere.csv"))
    with pytest.raises(InputError) as caught:
        read_campaign(tmp_path / "plan.yaml")
    (problem,) = caught.value.problems
    assert problem.line == 4
    assert problem.key == "targets"
    assert "nowhere.csv: no such file" in problem.found


def test_problems_of_both_files_come_together(tmp_path):
    (tmp_path / "list.csv").write_text(SHORT.replace("0.05", "-1"))
    plan = tmp_path / "plan.yaml"
    plan.write_text(HEAD.format("list.csv").replace("1.9 m", "1.9"))
    with pytest.raises(InputError) as caught:
        read_campaign(plan)
    assert [p.file.rsplit("/", 1)[1] for p in caught.value.problems] == ["plan.yaml", "list.csv"]


def test_a_yaml_list_needs_no_table_library(tmp_path):
    """The table reader is slow to import: it is left alone unless a list needs it."""
    import subprocess

    (tmp_path / "list.csv").write_text(SHORT)
    (tmp_path / "plan.yaml").write_text(HEAD.format("list.csv"))
    code = (
        "import sys; from pathlib import Path; from planner.campaign import read_campaign;"
        "read_campaign(Path(sys.argv[1])); sys.exit('astropy.table' in sys.modules)"
    )
    command = [sys.executable, "-c", code, str(tmp_path / "plan.yaml")]
    assert subprocess.run(command, check=False).returncode == 0
