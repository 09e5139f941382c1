"""Chainage labels and chainage equations, as a surveyor would check them. Constructed from the rules."""

from __future__ import annotations

import numpy as np
import pytest

from geomap.alignment.chainage import Chainage, chainage_from_settings
from geomap.errors import UsageError

ABSENT = np.nan
# label, format, meters, words of the reason
LABELS = [
    ("12+345", "0+000", 12345.0, ""),
    ("12+345.6", "0+000", 12345.6, ""),
    ("0+000", "0+000", 0.0, ""),
    ("-0+050", "0+000", -50.0, ""),
    ("CH 3+450", "0+000", 3450.0, ""),
    ("ch. 3+450", "0+000", 3450.0, ""),
    ("Sta 3 + 450.25", "0+000", 3450.25, ""),
    ("KM 3+450", "0+000", 3450.0, ""),
    ("3+450 m", "0+000", 3450.0, ""),
    ("km 12.345", "0+000", 12345.0, ""),
    ("12.345 km", "0+000", 12345.0, ""),
    ("12345.6", "0+000", 12345.6, ""),
    ("12345.6 m", "0+000", 12345.6, ""),
    ("1000 ft", "0+000", 304.8, ""),
    ("Chainage: 450", "0+000", 450.0, ""),
    ("123+45", "0+00", 12345 * 0.3048, ""),
    ("123+45.67", "0+00", 12345.67 * 0.3048, ""),
    ("STA 123+45", "0+00", 12345 * 0.3048, ""),
    ("12345", "0+00", 12345 * 0.3048, ""),
    ("12345 ft", "0+00", 12345 * 0.3048, ""),
    ("3762.756 m", "0+00", 3762.756, ""),
    ("km 3.762756", "0+00", 3762.756, ""),
    ("123+45", "0+000", ABSENT, "2 digits after the plus sign"),
    ("12+345", "0+00", ABSENT, "3 digits after the plus sign"),
    ("12+345 ft", "0+000", ABSENT, "unit ft"),
    ("12,345", "0+000", ABSENT, "comma"),
    ("12+345,6", "0+000", ABSENT, "comma"),
    ("12+", "0+000", ABSENT, "no chainage can be read"),
    ("near the bridge", "0+000", ABSENT, "no chainage can be read"),
    ("1200 stone", "0+000", ABSENT, "no chainage can be read"),
    ("", "0+000", ABSENT, "not given"),
    (None, "0+000", ABSENT, "not given"),
]


@pytest.mark.parametrize(("label", "form", "meters", "reason"), LABELS)
def test_a_label_is_read_as_meters_or_refused_with_a_reason(label, form: str, meters: float, reason: str) -> None:
    located = chainage_from_settings(form=form).distance_from_label([label])
    np.testing.assert_allclose(located.distance_m, [meters], atol=1e-9)
    assert reason in located.reason[0]
    assert bool(located.reason[0]) == bool(reason)


# start 1+000; GAP goes from 1+200 to 1+250, OVERLAP from 1+200 back to 1+150
GAP = chainage_from_settings(1000.0, [(1200.0, 1250.0)])
OVERLAP = chainage_from_settings(1000.0, [(1200.0, 1150.0)])
# line, distance, label written there
WRITTEN = [
    (GAP, 0.0, "1+000"),
    (GAP, 199.9, "1+199.9"),
    (GAP, 200.0, "1+250"),
    (GAP, 200.1, "1+250.1"),
    (GAP, -20.0, "0+980"),
    (OVERLAP, 199.9, "1+199.9"),
    (OVERLAP, 200.0, "1+150"),
    (OVERLAP, 250.0, "1+200"),
    (OVERLAP, 251.2346, "1+201.235"),
]
# line, label, distance, second distance, words of the reason
FOUND = [
    (GAP, "1+000", 0.0, ABSENT, ""),
    (GAP, "1+200", 200.0, ABSENT, ""),
    (GAP, "1+250", 200.0, ABSENT, ""),
    (GAP, "1+250.5", 200.5, ABSENT, ""),
    (GAP, "1+225", ABSENT, ABSENT, "from 1+200 to 1+250 in one place"),
    (GAP, "0+980", -20.0, ABSENT, ""),
    (OVERLAP, "1+149", 149.0, ABSENT, ""),
    (OVERLAP, "1+150", 150.0, 200.0, "occurs 2 times: at distances 150.000 and 200.000 m"),
    (OVERLAP, "1+175", 175.0, 225.0, "occurs 2 times: at distances 175.000 and 225.000 m"),
    (OVERLAP, "1+200", 200.0, 250.0, "occurs 2 times: at distances 200.000 and 250.000 m"),
    (OVERLAP, "1+201", 251.0, ABSENT, ""),
]


@pytest.mark.parametrize(("chainage", "distance", "label"), WRITTEN)
def test_the_label_at_a_distance(chainage: Chainage, distance: float, label: str) -> None:
    assert chainage.label_from_distance([distance]).tolist() == [label]


@pytest.mark.parametrize(("chainage", "label", "first", "second", "reason"), FOUND)
def test_the_distances_of_a_label(chainage: Chainage, label: str, first: float, second: float, reason: str) -> None:
    located = chainage.distance_from_label(label)
    np.testing.assert_allclose(located.distance_m, [first], atol=1e-9)
    np.testing.assert_allclose(located.second_distance_m, [second], atol=1e-9)
    assert located.is_ambiguous.tolist() == [bool(np.isfinite(second))]
    assert reason in located.reason[0]
    assert bool(located.reason[0]) == bool(reason)


# settings, words of the message
IMPOSSIBLE = [
    ({"equations": [(0.0, 50.0)]}, "equation 1, back"),
    ({"start": 1000.0, "equations": [(900.0, 950.0)]}, "equation 1, back"),
    ({"equations": [(200.0, 300.0), (250.0, 400.0)]}, "equation 2, back: found '0+250'; allowed: more than 0+300"),
    ({"equations": [(float("nan"), 300.0)]}, "give every value"),
    ({"equations": [("two hundred", 300.0)]}, "equation 1, back: found 'two hundred'"),
    ({"start": "10+00"}, "start_chainage"),
    ({"form": "0.000"}, "0+000, 0+00"),
    ({"equations": [(900.0, 1000.0)], "length_m": 800.0}, "on the line, which is 800.000 m long"),
]


@pytest.mark.parametrize(("settings", "words"), IMPOSSIBLE)
def test_impossible_settings_are_wrong_usage(settings: dict, words: str) -> None:
    with pytest.raises(UsageError) as error:
        chainage_from_settings(**settings)
    assert words in str(error.value)
    assert "corridor.toml: alignment" in str(error.value)
