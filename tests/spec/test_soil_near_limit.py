"""What ``near_limit`` means: the class would differ within the precision with which results are reported.

It is true where the class differs unrounded, or when one result alone is moved by half its unit: 0.5 for percentages
and limits, 2 % for Cu and Cc, half a percent along the curve for D10, D30 and D60. Constructed from this meaning; none
is a published value.
"""

from __future__ import annotations

import pandas as pd
import pytest

from geomap.soils.classification import classify, classify_samples
from geomap.tables.schema import passing_column
from tests.unit.soils.samples import samples_from

# Results of the sample; symbol; near a limit; because.
USCS = [
    ("p4=100 p200=60 ll=40 pl=20", "CL", False, "far from every limit"),
    ("p4=100 p200=50 ll=40 pl=20", "CL", True, "49.5 is coarse-grained"),
    ("p4=100 p200=51 ll=40 pl=20", "CL", False, "50.5 is still fine-grained"),
    ("p4=100 p200=49 ll=40 pl=20", "SC", True, "49.5 rounds to 50"),
    ("p4=100 p200=48 ll=40 pl=20", "SC", False, "48.5 rounds to 49"),
    ("p4=100 p200=49.6 ll=40 pl=20", "CL", True, "unrounded it is below 50"),
    ("p4=100 p200=4.4 cu=7 cc=1.5 np=1", "SW", True, "4.9 rounds to 5"),
    ("p4=100 p200=3.9 cu=7 cc=1.5 np=1", "SW", False, "4.4 rounds to 4"),
    ("p4=100 p200=12 cu=7 cc=1.5 np=1", "SW-SM", True, "12.5 is more than 12"),
    ("p4=100 p200=13 cu=7 cc=1.5 np=1", "SM", False, "12.5 rounds to 13, and is more than 12 unrounded"),
    ("p4=100 p200=12.6 cu=7 cc=1.5 np=1", "SM", True, "12.1 rounds to 12"),
    ("p4=60 p200=20 np=1", "SM", True, "59.5 makes gravel of an exact half"),
    ("p4=58 p200=20 np=1", "GM", False, "half a percent leaves more than half gravel"),
    ("p4=100 p200=80 ll=50 pl=20", "CH", True, "49.5 is below 50"),
    ("p4=100 p200=80 ll=49 pl=20", "CL", True, "49.5 rounds to 50"),
    ("p4=100 p200=80 ll=48 pl=20", "CL", False, "48.5 rounds to 49"),
    ("p4=100 p200=20 ll=50 pl=20", "SC", False, "in coarse soil the liquid limit of 50 decides nothing"),
    ("p4=100 p200=80 ll=26 pl=19", "CL-ML", True, "plastic limit 18.5: PI 7.5"),
    ("p4=100 p200=80 ll=40 pi=15", "CL", True, "PI 14.5 is below the A-line at 14.6"),
    ("p4=100 p200=80 ll=40 pi=16", "CL", False, "PI 15.5 is above it"),
    ("p4=100 p200=80 ll=40 pl=20 ll_oven=30", "CL", True, "29.5 is less than 0.75 of 40"),
    ("p4=100 p200=3 cu=6 cc=2", "SW", True, "Cu less 2 % fails"),
    ("p4=100 p200=3 cu=5.9 cc=2", "SP", True, "Cu plus 2 % passes"),
    ("p4=100 p200=3 cu=6.2 cc=2", "SW", False, "Cu less 2 % still passes"),
    ("p4=100 p200=3 cu=4.0 cc=2", "SP", False, "Cu 4 is a limit of gravel"),
    ("p4=40 p200=3 cu=4.0 cc=2", "GW", True, "Cu less 2 % fails"),
    ("p4=100 p200=3 cu=7 cc=2.95", "SW", True, "Cc plus 2 % fails"),
    ("p4=100 p200=4 cu=7 cc=2", "SW", True, "4.5 rounds to 5, and without limits the class is lost"),
]

# Results of the sample; group; near a limit; because.
AASHTO = [
    ("p10=80 p40=60 p200=30 ll=30 pl=22", "A-2-4", False, "far from every limit"),
    ("p10=80 p40=60 p200=35 ll=30 pl=22", "A-2-4", True, "35.5 rounds to 36"),
    ("p10=80 p40=60 p200=36 ll=30 pl=22", "A-4", False, "35.5 rounds to 36, and is more than 35 unrounded"),
    ("p10=50 p40=25 p200=10 np=1", "A-1-a", True, "50.5 rounds to 51"),
    ("p10=80 p40=50 p200=20 np=1", "A-1-b", True, "50.5 rounds to 51"),
    ("p10=80 p40=70 p200=10 np=1", "A-3", True, "10.5 rounds to 11"),
    ("p10=80 p40=60 p200=30 ll=40 pl=32", "A-2-4", True, "40.5 rounds to 41"),
    ("p200=60 ll=40 pl=30", "A-4", True, "liquid limit 40.5 rounds to 41"),
    ("p200=60 ll=50 pl=30", "A-7-5", True, "plastic limit 29.5: PI 20.5 is more than LL - 30"),
    ("p200=60 ll=50 pl=33", "A-7-5", False, "plastic limit 32.5 leaves PI less than LL - 30"),
    ("p200=60.4 ll=34 pl=20", "A-6", False, "index 6.05, and 6.13 from unrounded results"),
    ("p200=60.4 ll=37 pl=23", "A-6", True, "index 6.43, but 6.52 from unrounded results"),
    ("p200=60 ll=34 pl=19", "A-6", True, "index 6.5 exactly before rounding"),
]


def records(cells: str) -> pd.DataFrame:
    """Return the sample as a record: Cu and Cc as given, no curve."""
    return samples_from([dict(cell.split("=") for cell in cells.split())])


@pytest.mark.parametrize(("cells", "symbol", "near", "why"), USCS, ids=[f"{row[0]}: {row[3]}" for row in USCS])
def test_uscs_near_limit(cells: str, symbol: str, near: bool, why: str) -> None:
    row = classify(records(cells), ["astm_d2487"]).iloc[0]
    assert (row["uscs_symbol"], bool(row["uscs_symbol_near_limit"])) == (symbol, near), why


@pytest.mark.parametrize(("cells", "group", "near", "why"), AASHTO, ids=[f"{row[0]}: {row[3]}" for row in AASHTO])
def test_aashto_near_limit(cells: str, group: str, near: bool, why: str) -> None:
    row = classify(records(cells), ["aashto_m145"]).iloc[0]
    assert (row["aashto_group"], bool(row["aashto_group_near_limit"])) == (group, near), why


def test_without_a_class_from_tests_there_is_no_near_limit() -> None:
    found = classify_samples(samples_from([{"p4": 100, "p200": 60}, {"visual": "CL"}, {"visual": "PT"}]))
    assert found["uscs_symbol_near_limit"].isna().all()
    assert found["aashto_group_near_limit"].isna().all()


def test_d_sizes_move_along_the_curve() -> None:
    # D10 is 0.1191 mm and Cu 6.15; at 10.5 % the curve stands at 0.1226 mm, and Cu would be 5.97.
    curve = {2.0: 100.0, 0.7322: 60.0, 0.35: 30.0, 0.15: 14.0, 0.075: 2.0}
    by_curve = pd.DataFrame([{passing_column(size): pct for size, pct in curve.items()}])
    reported = by_curve.assign(cu=6.15, cc=1.4)
    found = classify_samples(pd.concat([by_curve, reported], ignore_index=True), ["astm_d2487"])
    assert found["uscs_symbol"].tolist() == ["SW", "SW"]
    assert found["uscs_symbol_near_limit"].tolist() == [True, False]
