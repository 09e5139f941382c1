"""How fast samples that are already in memory are classified: run by name, with ``-m benchmark -s``.

    pytest -m benchmark -s tests/benchmarks/benchmark_classification.py

Prints processor time on one thread, for 1,000,000 invented samples: samples per second; how many times longer than
reading the same columns once with NumPy (the floor); how many times faster than a plain loop over samples (the rules of
`tests/unit/soils/plain_rules.py`, run on a part and scaled). Asserts only that the answers are equal on that part.
"""

from __future__ import annotations

import resource
import time
from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest

from geomap.soils.classification import classify_samples
from geomap.soils.systems import aashto_m145, astm_d2487
from tests.unit.soils import plain_rules
from tests.unit.soils.plain_rules import Sample

SAMPLES = 1_000_000
PART = 20_000
SHORT = {
    "passing_4_75_mm_pct": "p4",
    "passing_2_mm_pct": "p10",
    "passing_0_425_mm_pct": "p40",
    "passing_0_075_mm_pct": "p200",
    "cu": "cu",
    "cc": "cc",
    "liquid_limit_pct": "ll",
    "plastic_limit_pct": "pl",
    "is_nonplastic": "nonplastic",
}

pytestmark = pytest.mark.benchmark


def invented(count: int) -> pd.DataFrame:
    """Return samples over all groups: sieves to 0.1 %, whole limits, a quarter non-plastic."""
    draw = np.random.default_rng(1)
    fines = np.round(100 * draw.beta(0.8, 1.2, count), 1)
    shares = np.sort(draw.random((count, 6)), axis=1)
    sizes = ["0_15", "0_425", "2", "4_75", "9_5", "19"]
    table = {"passing_0_075_mm_pct": fines}
    for place, size in enumerate(sizes):
        table[f"passing_{size}_mm_pct"] = np.minimum(np.round(fines + (100 - fines) * shares[:, place], 1), 100.0)
    ll = np.round(15 + 60 * draw.beta(1.5, 3, count))
    is_nonplastic = draw.random(count) < 0.25
    table["liquid_limit_pct"] = np.where(is_nonplastic, np.nan, ll)
    table["plastic_limit_pct"] = np.where(is_nonplastic, np.nan, np.round(ll * draw.uniform(0.4, 1.0, count)))
    return pd.DataFrame({**table, "is_nonplastic": is_nonplastic})


def with_reported_shape(samples: pd.DataFrame) -> pd.DataFrame:
    """Return the samples with the sieves of the systems only, and Cu and Cc as reported."""
    draw = np.random.default_rng(2)
    shape = {
        "cu": np.round(np.exp(draw.normal(2, 0.8, len(samples))) + 1, 2),
        "cc": np.round(draw.uniform(0.3, 4, len(samples)), 2),
    }
    return samples.assign(**shape)[list(SHORT)]


def seconds(work: Callable[[], Any], times: int = 3) -> tuple[float, Any]:
    """Return the least processor time of some runs, and the last answer."""
    least = np.inf
    for _ in range(times):
        start = time.process_time()
        answer = work()
        least = min(least, time.process_time() - start)
    return least, answer


def read_once(table: pd.DataFrame) -> float:
    return sum(float(np.add.reduce(table[name].to_numpy())) for name in table)


def plain_loop(part: pd.DataFrame) -> list[tuple[str, str, str, int]]:
    answers = []
    for row in part.itertuples(index=False):
        cells = {short: None if pd.isna(value) else value for short, value in zip(SHORT.values(), row, strict=True)}
        sample = Sample(**cells)
        answers.append((*plain_rules.d2487(sample), *plain_rules.m145(sample)))
    return answers


def report(what: str, count: int, time_s: float, **ratios: float) -> None:
    said = ", ".join(f"{ratio:.3g} {words.replace('_', ' ')}" for words, ratio in ratios.items())
    print(f"\n{what}: {count / time_s:,.0f} samples/s ({time_s:.3f} s for {count:,}){', ' if said else ''}{said}")


def test_a_million_samples_get_symbol_name_group_and_index() -> None:
    curves = invented(SAMPLES)
    reported = with_reported_shape(curves)
    floor, _ = seconds(lambda: read_once(reported))
    all_of_it, classes = seconds(lambda: classify_samples(reported))
    short, _ = seconds(lambda: classify_samples(reported, with_reasons=False))
    from_curves, _ = seconds(lambda: classify_samples(curves))
    part = reported.head(PART)
    loop, answers = seconds(lambda: plain_loop(part), times=1)
    loop *= SAMPLES / PART

    arrays = {name: reported[name].to_numpy() for name in reported}
    symbol_codes, _ = seconds(lambda: astm_d2487.codes(arrays))
    group_codes, _ = seconds(lambda: aashto_m145.codes(arrays))

    report("reading the columns once", SAMPLES, floor)
    ratios = {"times_the_floor": all_of_it / floor, "times_faster_than_the_plain_loop": loop / all_of_it}
    report("symbol, name, group, index, reasons, near_limit", SAMPLES, all_of_it, **ratios)
    report("the same without reasons and candidates", SAMPLES, short, times_the_floor=short / floor)
    report("the same with reasons, Cu and Cc from seven sieves", SAMPLES, from_curves)
    report("codes of ASTM D2487", SAMPLES, symbol_codes, times_the_floor=symbol_codes / floor)
    report("codes of AASHTO M 145", SAMPLES, group_codes, times_the_floor=group_codes / floor)
    report("plain loop (scaled)", SAMPLES, loop)
    print(f"greatest memory of the process: {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 2**20:.2f} GiB")

    found = classes.head(PART)
    expected = pd.DataFrame(answers, columns=["uscs_symbol", "uscs_name", "aashto_group", "group_index"])
    for name in expected:
        assert found[name].astype(object).tolist() == expected[name].tolist(), name
