"""What an engineer is told where the tests do not decide a class, or decide it on an assumption.

A class stands alone, or it is blank with a reason in words (what is missing and what to do) and the classes that stay
possible, in the order of the standard. Cases are constructed from the rules; none is a published value. "-" is blank.
"""

from __future__ import annotations

import pandas as pd
import pytest

from geomap.soils.classification import classify_samples
from geomap.soils.systems import aashto_m145, astm_d2487
from tests.unit.soils.samples import samples_from

# Results of the sample; symbol; group name; basis; symbols left; words in the reason.
USCS = [
    # decided
    ("p4=100 p200=60 ll=40 pl=20", "CL", "sandy lean clay", "lab", "-", "-"),
    ("p4=100 p200=3 cu=7 cc=2", "SW", "well-graded sand", "lab", "-", "-"),
    ("p4=100 p200=20 np=1", "SM", "silty sand", "lab", "-", "-"),
    # no fines, no class, whatever else was tested
    ("p4=90 ll=40 pl=20", "-", "-", "-", "SW;SW-SC;SP;SP-SC;SC;CL", "0.075 mm (No. 200) is neither"),
    (
        "p4=60 p40=30 ll=40 pl=20",
        "-",
        "-",
        "-",
        "GC;SW;SW-SC;SP;SP-SC;SC",
        "wash and sieve over",
    ),  # gravel from 21 % on
    # limits
    ("p4=100 p200=60", "-", "-", "-", "CL;CL-ML;ML;CH;MH", "limits are missing: test them, or report NP"),
    ("p4=100 p200=60 ll=40", "-", "-", "-", "CL;ML", "plastic limit and plasticity index are missing"),
    ("p4=100 p200=60 pi=30", "-", "-", "-", "CL;CH;MH", "the liquid limit is missing"),
    ("p4=100 p200=20", "-", "-", "-", "SM;SC;SC-SM", "limits are missing: test them, or report NP"),
    ("p4=100 p200=20 pi=3", "SM", "silty sand", "lab", "-", "-"),  # silt on either side of liquid limit 50
    ("p4=100 p200=60 ll=20 pi=30", "-", "-", "-", "-", "more than the liquid limit: check the lab sheet"),
    # 5 to 12 % fines
    (
        "p4=100 p200=8 cu=7 cc=2",
        "-",
        "-",
        "-",
        "SW-SM;SW-SC",
        "or give a visual group that calls the fines",
    ),
    (
        "p4=100 p200=8 cu=7 cc=2 visual=SM",
        "SW-SM",
        "well-graded sand with silt",
        "lab, fines by eye",
        "-",
        "fines taken as",
    ),
    ("p4=100 p200=8 cu=7 cc=2 visual=SW", "-", "-", "-", "SW-SM;SW-SC", "no limits"),
    ("p4=100 p200=20 visual=SM", "-", "-", "-", "SM;SC;SC-SM", "limits are missing"),
    # gravel or sand; sand against gravel in the name
    ("p200=20 ll=40 pl=20", "-", "-", "-", "GC;SC", "4.75 mm (No. 4) is missing, so gravel or sand is open"),
    ("p200=20 p10=80 ll=40 pl=20", "SC", "-", "lab", "-", "no group name: it needs percent passing 4.75 mm"),
    ("p200=3 cu=5 cc=2", "-", "-", "-", "GW;SP", "so gravel or sand is open"),  # Cu 5 is enough for gravel only
    ("p200=90 ll=40 pl=20", "CL", "lean clay", "lab", "-", "-"),
    ("p200=80 ll=40 pl=20", "CL", "-", "lab", "-", "no group name: it needs percent passing 4.75 mm"),
    # organics
    ("p4=100 p200=90 ll=60 pl=30 ll_oven=40", "OH", "organic clay", "lab", "-", "-"),
    ("p4=100 p200=90 ll=60 ll_oven=40", "OH", "-", "lab", "-", "organic clay or organic silt depends on"),
    ("p4=100 p200=90 np=1 ll_oven=20", "ML", "silt", "lab", "-", "taken as inorganic"),
    # assumptions
    ("p4=100 p200=90 ll=55 np=1", "MH", "elastic silt", "lab", "-", "non-plastic with a liquid limit"),
    ("p4=100 p200=90 ll=30 pl=30", "ML", "silt", "lab", "-", "index of 0 is taken as non-plastic"),
    ("p4=100 p200=90 ll=40 pl=20 pi=15", "CL", "lean clay", "lab", "-", "taken as liquid less plastic limit"),
    # by eye
    ("visual=CH", "CH", "-", "visual", "-", "the symbol is the visual group"),
    ("visual=CL/CH", "-", "-", "-", "-", "not one symbol of ASTM D2487"),
    ("visual=PT", "PT", "peat", "visual", "-", "highly organic"),
    ("p4=100 p200=90 ll=60 pl=30 visual=PT", "PT", "peat", "visual", "-", "highly organic"),
    ("p4=100 p200=60 ll=40 visual=CL", "-", "-", "-", "CL;ML", "plastic limit and plasticity index are missing"),
    ("", "-", "-", "-", "-", "no usable laboratory tests and no visual group"),
]

# Results of the sample; group; index; groups left; words in the reason.
AASHTO = [
    ("p10=50 p40=30 p200=15 ll=20 pl=14", "A-1-a", "0", "-", "-"),
    ("p200=60 ll=40 pl=30", "A-4", "5", "-", "-"),  # silt-clay needs no coarser sieve
    ("p200=20 ll=40 pl=20", "A-2-6", "1", "-", "-"),  # with PI 20 neither A-1 nor A-3 is possible
    ("p200=20 ll=20 pl=15", "-", "0", "A-1-b;A-2-4", "0.425 mm (No. 40) is missing"),
    ("p200=10 p40=45 np=1", "A-1-b", "0", "-", "-"),  # No. 40 at 45 rules A-1-a and A-3 out
    ("p200=10 p40=25 np=1", "-", "0", "A-1-a;A-1-b", "2 mm (No. 10) is missing"),
    ("p200=10 np=1", "-", "0", "A-1-a;A-1-b;A-3", "0.425 mm (No. 40) is missing"),
    ("p10=90 p40=70 p200=30", "-", "-", "A-2-4;A-2-5;A-2-6;A-2-7", "limits are missing"),
    ("p10=90 p40=70 p200=12", "-", "0", "A-2-4;A-2-5;A-2-6;A-2-7", "limits are missing"),  # index 0 up to 15 % fines
    ("p10=90 p40=70 p200=30 pi=30", "-", "3", "A-2-6;A-2-7", "the liquid limit is missing"),
    ("p200=60 pi=20", "-", "-", "A-6;A-7-5;A-7-6", "the liquid limit is missing"),
    ("p200=60 ll=60 np=1", "A-5", "3", "-", "non-plastic with a liquid limit"),
    ("p200=60 np=1", "A-4", "0", "-", "-"),
    ("p40=30 ll=40 pl=20", "-", "-", "A-2-6", "0.075 mm (No. 200) is neither"),
    ("visual=PT", "A-8", "-", "-", "highly organic"),
    ("visual=CH", "-", "-", "-", "no usable laboratory tests"),
    ("", "-", "-", "-", "no usable laboratory tests"),
]


def sample(cells: str) -> pd.DataFrame:
    return samples_from([dict(cell.split("=") for cell in cells.split())])


def shown(value: object) -> str:
    return "-" if pd.isna(value) else str(value)


@pytest.mark.parametrize(("cells", "symbol", "name", "basis", "left", "reason"), USCS, ids=[row[0] for row in USCS])
def test_uscs_says_what_is_missing(cells: str, symbol: str, name: str, basis: str, left: str, reason: str) -> None:
    row = classify_samples(sample(cells), ["astm_d2487"]).iloc[0]
    found = [
        shown(row[column]) for column in ("uscs_symbol", "uscs_name", "uscs_symbol_basis", "uscs_symbol_candidates")
    ]
    assert found == [symbol, name, basis, left]
    assert reason in shown(row["uscs_symbol_reason"])
    assert (reason == "-") == pd.isna(row["uscs_symbol_reason"])


@pytest.mark.parametrize(("cells", "group", "index", "left", "reason"), AASHTO, ids=[row[0] for row in AASHTO])
def test_aashto_says_what_is_missing(cells: str, group: str, index: str, left: str, reason: str) -> None:
    row = classify_samples(sample(cells), ["aashto_m145"]).iloc[0]
    found = [shown(row[column]) for column in ("aashto_group", "group_index")]
    assert found == [group, index]
    if ";" in left:
        assert row["aashto_group_candidates"] == left
    assert reason in shown(row["aashto_group_reason"])
    assert (reason == "-") == pd.isna(row["aashto_group_reason"])


def test_a_known_shape_is_not_asked_for_where_only_the_side_is_open() -> None:
    row = classify_samples(sample("p200=3 cu=5 cc=2"), ["astm_d2487"]).iloc[0]
    assert "Cu and Cc" not in row["uscs_symbol_reason"]


def test_candidates_stand_in_the_order_of_the_standard() -> None:
    for system in (astm_d2487, aashto_m145):
        table = classify_samples(sample("p4=90"), [system.NAME])
        left = table[f"{system.COLUMN}_candidates"].iloc[0].split(";")
        assert left == sorted(left, key=system.SYMBOLS.index)
