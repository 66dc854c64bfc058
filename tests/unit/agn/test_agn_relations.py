import pytest

from planner.agn import LINES, RELATIONS, default_line, lag_rest, relation_names


def test_every_line_has_relations_and_hbeta_starts_with_bentz_2013():
    names = relation_names()
    assert set(names) == set(LINES)
    assert all(names.values())
    assert names["Hbeta"][0] == "bentz2013"


@pytest.mark.parametrize(
    "relation", [r for by_key in RELATIONS.values() for r in by_key.values()], ids=lambda r: r.key
)
def test_relation_is_complete_and_in_the_usual_range(relation):
    assert RELATIONS[relation.line][relation.key] is relation
    assert relation.wavelength_a in (5100, 3000, 1350)
    assert 0.1 <= relation.scatter_dex <= 0.4
    assert relation.lowest < relation.pivot < relation.highest
    assert relation.source
    assert relation.note
    # light-days to light-years over the range of calibration (common practice, no source)
    assert 0.05 < lag_rest(relation, relation.lowest) < lag_rest(relation, relation.highest) < 3000


def test_slope_is_the_change_per_decade():
    relation = RELATIONS["Hbeta"]["bentz2013"]
    assert lag_rest(relation, 45.0) / lag_rest(relation, 44.0) == pytest.approx(10**0.533)


def test_iron_shortens_the_lag_only_where_the_relation_knows_of_it():
    du_wang, bentz = (RELATIONS["Hbeta"][k] for k in ("duwang2019", "bentz2013"))
    assert lag_rest(du_wang, 44.0, 1.0) == pytest.approx(lag_rest(du_wang, 44.0) * 10**-0.35)
    assert lag_rest(bentz, 44.0, 1.0) == lag_rest(bentz, 44.0)


@pytest.mark.parametrize(
    ("redshift", "line"),
    [(0.01, "Hbeta"), (0.9, "Hbeta"), (0.91, "MgII"), (2.0, "MgII"), (2.01, "CIV"), (4.0, "CIV")],
)
def test_default_line_stays_in_the_optical(redshift, line):
    assert default_line(redshift) == line
    assert 4000 < LINES[line].wavelength_rest_a * (1 + redshift) < 9300
