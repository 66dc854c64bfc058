"""Radius-luminosity relations: the one place where their coefficients stand."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["RELATIONS", "Relation", "lag_rest", "relation_names"]


@dataclass(frozen=True, slots=True)
class Relation:
    """log10(lag) = log_lag_d + slope (log L - pivot) + iron_slope R_Fe, rest frame."""

    key: str
    line: str
    log_lag_d: float
    """log10 of the rest-frame lag in days at the pivot."""
    slope: float
    pivot: float
    """log10 of lambda L_lambda in erg/s at which `log_lag_d` holds."""
    wavelength_a: int
    """Rest wavelength of the luminosity: 5100, 3000 or 1350 angstrom."""
    scatter_dex: float
    """Intrinsic scatter of log10(lag)."""
    lowest: float
    """Least log10(lambda L_lambda) of the AGN it was fitted to."""
    highest: float
    source: str
    note: str
    """How the numbers were come by, and what to mind."""
    iron_slope: float = 0.0
    """Change of log10(lag) per unit of R_Fe; 0: the relation knows nothing of iron."""


# The first relation of a line is its default. "From memory" means that the number was not seen
# in the paper while this table was written.
_TABLE = (
    Relation(
        "bentz2013", "Hbeta", 1.527, 0.533, 44.0, 5100, 0.19, 41.9, 45.9,
        "Bentz et al. 2013, ApJ 767, 149, table 14, all AGN",
        "host light removed with space images; 41 AGN; luminosities on H0 = 72",
    ),
    Relation(
        "bentz2013_clean", "Hbeta", 1.554, 0.546, 44.0, 5100, 0.13, 41.9, 45.9,
        "Bentz et al. 2013, ApJ 767, 149, table 14, without two doubtful lags",
        "coefficients from memory; scatter as published",
    ),
    Relation(
        "bentz2013_extinction", "Hbeta", 1.559, 0.549, 44.0, 5100, 0.13, 41.9, 45.9,
        "Bentz et al. 2013, ApJ 767, 149, table 14, with internal extinction corrected",
        "coefficients from memory; scatter as published",
    ),
    Relation(
        "duwang2019", "Hbeta", 1.65, 0.45, 44.0, 5100, 0.196, 41.9, 46.0,
        "Du & Wang 2019, ApJ 886, 42, with the strength of Fe II",
        "coefficients from memory, range too (approximate); needs the target's iron strength",
        iron_slope=-0.35,
    ),
    Relation(
        "dallabonta2020", "Hbeta", 1.228, 0.482, 43.444, 5100, 0.213, 41.9, 46.0,
        "Dalla Bonta et al. 2020, ApJ 903, 112",
        "coefficients from memory, range too (approximate)",
    ),
    Relation(
        "cho2023", "Halpha", 1.59, 0.58, 44.0, 5100, 0.31, 41.0, 45.5,
        "Cho et al. 2023, ApJ 953, 142",
        "coefficients from memory (abstract: slope 0.59 +- 0.04), range too (approximate)",
    ),
    Relation(
        "zajacek2021", "MgII", 1.67, 0.30, 44.0, 3000, 0.30, 42.8, 46.8,
        "Zajacek et al. 2021, ApJ 912, 10",
        "coefficients from memory, range too (approximate)",
    ),
    Relation(
        "khadka2021", "MgII", 1.67, 0.29, 44.0, 3000, 0.29, 42.8, 46.8,
        "Khadka et al. 2021, MNRAS 508, 4722, 78 quasars",
        "coefficients from memory, range too (approximate)",
    ),
    Relation(
        "kaspi2021", "CIV", 0.398, 0.45, 43.0, 1350, 0.30, 40.0, 47.8,
        "Kaspi et al. 2021, ApJ 915, 129",
        "coefficients from memory, range too (approximate); the scatter is a judgement: published "
        "zero points differ by a factor of two",
    ),
    Relation(
        "lira2018", "CIV", 0.342, 0.46, 43.0, 1350, 0.30, 40.0, 47.8,
        "Lira et al. 2018, ApJ 865, 56",
        "coefficients from memory, range too (approximate); scatter as for kaspi2021",
    ),
    Relation(
        "kaspi2007", "CIV", 0.380, 0.55, 43.0, 1350, 0.30, 40.0, 47.2,
        "Kaspi et al. 2007, ApJ 659, 997",
        "coefficients from memory, range too (approximate); scatter as for kaspi2021",
    ),
)  # fmt: skip

RELATIONS: dict[str, dict[str, Relation]] = {
    line: {r.key: r for r in _TABLE if r.line == line}
    for line in ("Hbeta", "Halpha", "MgII", "CIV")
}
"""By line, then by key; the first of each line is its default."""


def relation_names() -> dict[str, tuple[str, ...]]:
    """Return the keys of each line's relations, the default first."""
    return {line: tuple(relations) for line, relations in RELATIONS.items()}


def lag_rest(relation: Relation, log_luminosity: float, iron_strength: float = 0.0) -> float:
    """Return the lag that a relation predicts.

    Parameters
    ----------
    relation : Relation
        One of `RELATIONS`.
    log_luminosity : float
        log10 of lambda L_lambda in erg/s at ``relation.wavelength_a``, host removed.
    iron_strength : float
        R_Fe, flux of Fe II 4434-4684 over broad H beta.

    Returns
    -------
    float
        Days, rest frame.
    """
    log_lag_d = (
        relation.log_lag_d
        + relation.slope * (log_luminosity - relation.pivot)
        + relation.iron_slope * iron_strength
    )
    return float(10.0**log_lag_d)
