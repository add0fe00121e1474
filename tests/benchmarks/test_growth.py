"""Growth: the fitted exponents are those of known powers, and stopped sizes stay out of them."""

from __future__ import annotations

from dataclasses import replace

import pytest

from benchmarks import report
from benchmarks.growth import FAMILIES, Family, exponent, reduced, rows
from benchmarks.measure import Measured, Series
from benchmarks.registry import Problem
from benchmarks.ways import ROADS, Run


def timed(family: Family, seconds: list[float | None]) -> list[Measured]:
    """Invented timings, a size each; None for a size that was stopped at 20 s."""
    found = []
    for one, spent in zip(family.problems(), seconds, strict=True):
        way = family.way
        series = Series(way, [], over=20.0)
        if spent is not None:
            runs = [Run(spent, "possible", sizes={"nonzeros": 7, "profiles": 1000})]
            series = Series(way, runs, [40.0], grown=[2.0])
        found.append(Measured(one, {way: series}))
    return found


@pytest.mark.parametrize("power", [0.5, 1.0, 2.0, 3.0])
def test_a_power_is_found_again(power: float) -> None:
    x = [5.0, 10.0, 20.0, 40.0]
    assert exponent(x, [3 * a**power for a in x]) == pytest.approx(power)


def test_the_fit_is_the_least_squares_line() -> None:
    # By hand: (0, 0), (1, 2), (2, 1) in powers of e have slope 1/2.
    e = 2.718281828459045
    assert exponent([1, e, e**2], [1, e**2, e]) == pytest.approx(0.5)


def test_one_size_has_no_exponent() -> None:
    assert exponent([5.0], [1.0]) is None
    assert exponent([], []) is None
    assert exponent([5.0, 5.0], [1.0, 2.0]) is None
    assert exponent([5.0, 10.0], [1.0, 0.0]) is None


def test_a_row_has_the_fit_the_last_step_and_the_theory() -> None:
    family = replace(FAMILIES[0], theory={"seconds": ("3", "because")})
    found = rows(family, timed(family, [0.1, 0.2, 0.8, 6.4]))
    assert found == [
        [
            "full-T",
            "seconds by T",
            "3×5: 0.1; 3×10: 0.2; 3×20: 0.8; 3×40: 6.4",
            "2.00",
            "3.00",
            "3",
            "because",
        ]
    ]


def test_a_stopped_size_takes_no_part_in_the_fit() -> None:
    family = replace(FAMILIES[0], theory={"seconds": ("3", "because")})
    (row,) = rows(family, timed(family, [0.1, 0.8, 6.4, None]))
    assert row[2].endswith("3×40: > 20 s")
    assert row[3:5] == ["3.00", "3.00"]


def test_along_the_parties_the_exponent_is_of_the_profiles() -> None:
    (family,) = (one for one in FAMILIES if one.name == "interim-n")
    short = replace(reduced(family, 3), theory={"seconds": ("1/2", "halves")})
    (row,) = rows(short, timed(short, [1.0, 10**0.5, 10.0]))
    assert row[1] == "seconds by T^n"
    assert row[3:5] == ["0.50", "0.50"]


def test_every_family_names_one_of_our_roads_and_known_quantities() -> None:
    problems: list[Problem] = [one for family in FAMILIES for one in family.problems()]
    assert len({one.name for one in problems}) == len(problems)
    assert {family.way for family in FAMILIES} <= set(ROADS)
    quantities = {name for family in FAMILIES for name in family.theory}
    assert quantities <= {"seconds", "bytes", "nonzeros"}


def test_the_report_has_growth_and_bytes_per_profile() -> None:
    family = reduced(FAMILIES[1], 2)
    found = timed(family, [0.1, 0.4])
    assert "| interim-T " in report.document([], [], [], [], [(family, found)])
    ours = Measured(found[0].problem, {"ours": found[0].series["interim"]})
    # 2 MiB over 1,000 profiles.
    assert "2.1e+03" in report.compared([ours])
