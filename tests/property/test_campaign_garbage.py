"""Whatever stands in a file, reading it ends in a campaign or in an InputError."""

import math

import pytest
from hypothesis import HealthCheck, example, given, settings
from hypothesis import strategies as st

from planner.base.errors import InputError
from planner.base.quantities import in_unit
from planner.campaign import describe, read_campaign
from planner.campaign.angles import declination, right_ascension
from planner.campaign.yaml_nodes import parse, plain

PARTS = {
    "campaign": {"first_night": "2027-03-01", "last_night": "2028-10-31", "seed": "1"},
    "site": {"name": "Ridge", "latitude": "-30 deg", "longitude": "-70 deg"},
    "telescopes": [{"name": "C19", "aperture": "1.9 m", "slew": "1 min"}],
    "streams": {"line": {"cadence": ["3 d"], "exposure": "20 min"}},
    "limits": {"airmass": "2", "twilight": "civil"},
    "targets": [
        {"name": "A", "ra": "10 deg", "dec": "10 deg", "redshift": "0.1", "notes": "none",
         "magnitude": {"band": "g", "value": "16"}}
    ],
}  # fmt: skip

scalars = st.one_of(
    st.none(), st.booleans(), st.integers(), st.floats(), st.text(max_size=20),
    st.sampled_from(["20 min", "1.9 m", "12:30:45", "1e44", "NO", "0123", "30 %", "2027-03-01"]),
)  # fmt: skip
values = st.recursive(
    scalars,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=5), inner),
    max_leaves=6,
)
quick = settings(
    max_examples=150, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture]
)


def places(tree, path=()):
    """Return the paths of everything in a tree of dicts and lists."""
    inside = tree.items() if isinstance(tree, dict) else enumerate(tree)
    found = [path] if path else []
    for key, value in inside:
        deeper = isinstance(value, dict | list)
        found += places(value, (*path, key)) if deeper else [(*path, key)]
    return found


def replaced(tree, path, value):
    if not path:
        return value
    copy = dict(tree) if isinstance(tree, dict) else list(tree)
    copy[path[0]] = replaced(copy[path[0]], path[1:], value)
    return copy


def read(folder, content, name="plan.yaml"):
    file = folder / name
    file.write_bytes(content)
    problems = []
    try:
        said = describe(read_campaign(file))
    except InputError as error:
        problems, said = error.problems, str(error)
    assert said
    assert all("\n" not in str(p) and "; expected ; " not in str(p) for p in problems)


@quick
@given(content=st.binary(max_size=300))
def test_random_bytes(tmp_path, content):
    read(tmp_path, content)


@quick
@given(content=st.text(alphabet="ab:- \n\t[]{}&*!|>'\"#%@,?0159.~<", max_size=80))
@example(content="&a : *a")
@example(content="? |\n")
@example(content="{? : }")
@example(content="- - - &x\n  - *x")
def test_random_yaml(tmp_path, content):
    read(tmp_path, content.encode())


@quick
@given(path=st.sampled_from(places(PARTS)), value=values)
def test_any_value_at_any_place(tmp_path, path, value):
    import json

    read(tmp_path, json.dumps(replaced(PARTS, path, value)).encode())


@quick
@given(text=st.text(alphabet='name,radecredshift;"\n\t [deg]#0.5-', max_size=120))
def test_random_tables(tmp_path, text):
    (tmp_path / "list.csv").write_text(text)
    read(tmp_path, b"targets: list.csv\n")


@quick
@given(tail=st.text(max_size=60), name=st.sampled_from(["list.ecsv", "list.xml"]))
def test_random_tails_of_tables(tmp_path, tail, name):
    head = "# %ECSV 1.0\n# ---\n" if name == "list.ecsv" else "<VOTABLE>"
    (tmp_path / name).write_text(head + tail, encoding="utf-8", errors="replace")
    read(tmp_path, f"targets: {name}\n".encode())


@quick
@given(text=st.text(max_size=30) | st.from_regex(r"[0-9]{1,3} [a-zA-Z^*/()%0-9.-]{1,12}"))
def test_quantities_give_a_number_or_a_sentence(text):
    for read_text in (lambda t: in_unit(t, "s", "a time"), right_ascension, declination):
        refusal = ""
        try:
            value = read_text(text)
        except ValueError as error:
            refusal = str(error)
        assert "; expected " in refusal if refusal else math.isfinite(value)


@quick
@given(name=st.text(min_size=1, max_size=20).filter(lambda t: t.isprintable() and t.strip()))
def test_quoted_text_survives(name):
    import json

    assert plain(parse(json.dumps({"a": [name]}, ensure_ascii=False), "f")) == {"a": [name]}


@quick
@given(
    degrees=st.integers(0, 89), minutes=st.integers(0, 59), seconds=st.integers(0, 59),
    sign=st.sampled_from(["-", "+", ""]), mark=st.sampled_from([":", " "]),
)  # fmt: skip
def test_sexagesimal_reads_back(degrees, minutes, seconds, sign, mark):
    text = f"{sign}{degrees:02d}{mark}{minutes:02d}{mark}{seconds:02d}"
    size = degrees + minutes / 60 + seconds / 3600
    assert declination(text) == pytest.approx(-size if sign == "-" else size, abs=1e-12)
