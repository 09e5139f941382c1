"""Percent passing a sieve, in the spellings of lab sheets."""

from __future__ import annotations

import math

import pytest

from geomap.readers.sieves import NUMBERS_WITHOUT_UNIT, sieve_sizes, size_from_heading, size_from_inches, size_from_text
from geomap.tables.schema import passing_column, size_from_passing_column


@pytest.mark.parametrize(
    ("name", "size_mm"),
    # ASTM D2487-17, section 3: the sieves that it defines soil by
    [("3 in", 75.0), ("3/4 in", 19.0), ("No. 4", 4.75), ("No. 10", 2.0), ("No. 40", 0.425), ("No. 200", 0.075)],
)
def test_the_sieves_of_d2487_have_its_sizes(name: str, size_mm: float) -> None:
    assert sieve_sizes()[name] == size_mm


def test_sieves_are_listed_from_coarse_to_fine_and_none_twice() -> None:
    sizes = list(sieve_sizes().values())
    assert sizes == sorted(set(sizes), reverse=True)


def test_inch_names_are_within_three_percent_of_the_inch() -> None:
    # E11 rounds openings: 3 in is 75 mm, not 76.2 mm. A slip of a row would be far more than that.
    for name, size in sieve_sizes().items():
        if name.endswith(" in") and name != "12 in":
            inches = size_from_inches(name.removesuffix(" in"))
            assert inches == size
            whole, _, part = name.removesuffix(" in").rpartition("-")
            over, _, under = part.partition("/")
            exact = (float(whole or 0) + float(over) / float(under or 1)) * 25.4
            assert math.isclose(size, exact, rel_tol=0.031)


def test_sieve_numbers_fall_with_size() -> None:
    # A US number is about the count of wires to the inch, so number times opening stays within a factor of two.
    products = []
    for name, size in sieve_sizes().items():
        number = name.removeprefix("No. ")
        if name.startswith("No. ") and number.isdigit():
            products.append(int(number) * size / 25.4)
    assert len(products) > 30
    assert all(0.4 < product < 0.85 for product in products)


@pytest.mark.parametrize(
    ("heading", "size_mm"),
    [
        ("passing_4_75_mm_pct", 4.75),
        ("passing_4.75_mm_pct", 4.75),
        ("PASSING 4 75 MM PCT", 4.75),
        ("passing-0-075-mm-pct", 0.075),
        ("passing 0.075 mm", 0.075),
        ("passing 0,425 mm (%)", 0.425),
        ("passing .075 mm", 0.075),
        (".075 mm", 0.075),
        ("% passing No. 200", 0.075),
        ("% Passing #200", 0.075),
        ("passing_no_200_pct", 0.075),
        ("Passing -200", 0.075),
        ("minus 200", 0.075),
        ("-#200", 0.075),
        ("P200", 0.075),
        ("P4", 4.75),
        ("p_4.75", 4.75),
        ("P200 (%)", 0.075),
        ("No. 200", 0.075),
        ("#200", 0.075),
        ("U.S. No. 40", 0.425),
        ("Sieve No. 10", 2.0),
        ("3/4 in", 19.0),
        ('3/4"', 19.0),
        ("3/4″, % passing", 19.0),
        ("¾ inch", 19.0),
        ("1 1/2 in.", 37.5),
        ('1½"', 37.5),
        ("sieve 19 mm", 19.0),
        ("19.0mm (%)", 19.0),
        ("75 µm", 0.075),
        ("Percent finer than 0.002 mm", 0.002),
        ("% by mass finer than 63 um", 0.063),
        ("No. 200 (0.075 mm)", 0.075),
        ("75 mm (3 in)", 75.0),
    ],
)
def test_a_heading_means_percent_passing(heading: str, size_mm: float) -> None:
    assert size_from_heading(heading) == size_mm


@pytest.mark.parametrize(
    "heading",
    [
        "retained 4.75 mm",
        "% retained No. 200",
        "2-60 mm",  # a fraction between two sizes
        "0.06-2 mm",
        "P20",  # No. 20 or 20 mm
        "Passing 10",
        "P0.5",  # 0.5 mm or half an inch
        "100",
        "3/4",
        "No. 33",
        "No. 200 (0.063 mm)",  # two names that disagree
        "1/0 in",
        "passing",
        "N",
        "9999 mm",
        "",
    ],
)
def test_what_leaves_doubt_is_not_taken_for_a_sieve(heading: str) -> None:
    assert size_from_heading(heading) is None


@pytest.mark.parametrize("size_mm", sieve_sizes().values())
def test_every_canonical_passing_column_is_read_as_its_size(size_mm: float) -> None:
    assert size_from_heading(passing_column(size_mm)) == size_mm
    assert size_from_passing_column(passing_column(size_mm)) == size_mm


def test_a_p_without_unit_is_taken_for_the_sieves_of_the_two_classifications_only() -> None:
    assert {size_from_heading(f"P{number}") for number in NUMBERS_WITHOUT_UNIT} == {4.75, 2.0, 0.425, 0.075}
    assert all(size_from_heading(f"P{number}") is None for number in (8, 16, 20, 30, 50, 60, 75, 100))


def test_an_opening_beside_the_table_is_25_4_mm_to_the_inch() -> None:
    assert size_from_text("7 in") == 177.8
