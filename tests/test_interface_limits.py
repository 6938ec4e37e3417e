"""Limits: declared once, checked at once, and said in words."""

import inspect
import pickle
import warnings

import hourarc as ha
import numpy as np
import pytest
from hourarc.errors import InvalidArgument, SunLimitWarning, UnknownName, WrongType

SITE = ha.Site(-70.4, -24.6, 2635.0)
SPAN = ("2026-03-10T16:41:36", "2026-03-11T16:41:36")


def test_what_holds_when_nothing_is_said():
    limits = ha.Limits()
    assert limits.to_dict() == {
        "altitude_min_deg": 30.0,
        "airmass_model": "kasten_young_1989",
        "skyline": True,
        "sun_altitude_max_deg": -18.0,
        "sun_separation_min_deg": 30.0,
    }
    assert limits == ha.Limits(sun_altitude_max_deg="astronomical")
    assert "altitude_min_deg=30" in repr(limits)
    assert "altitude_min_deg" in limits and "airmass_max" not in limits and 3 not in limits
    assert limits["airmass_max"] is None
    assert set(limits) == set(limits.to_dict())
    assert "skyline" not in ha.Limits(skyline=False) and "skyline=False" in repr(ha.Limits(skyline=False))
    assert "phase_scale" not in limits


def test_the_signature_follows_the_declarations():
    parameters = inspect.signature(ha.Limits).parameters
    assert list(parameters) == list(ha.LIMITS)
    for key, parameter in parameters.items():
        assert parameter.default == ha.LIMITS[key].default
        assert parameter.kind is inspect.Parameter.KEYWORD_ONLY
    for limit in ha.LIMITS.values():
        assert limit.meaning and limit.allowed()
        assert limit.at_most == "" or limit.at_most in ha.LIMITS
        assert {*limit.together, *limit.apart} <= set(ha.LIMITS)
        assert limit.reason == "" or limit.reason in ha.REASON_WORDS
        # A key says its unit, unless it has none; a Julian Date is said to be one.
        endings = {"deg": "_deg", "hourangle": "_h", "s": "_s", "deg / s": "_deg_s", "": ""}
        endings |= {"mag / arcsec2": "_mag_arcsec2", "d": "_jd" if limit.key == "phase_epoch_jd" else "_d"}
        bare = limit.key == "moon_relaxed_below_deg" or limit.key.endswith(endings[limit.unit])
        assert bare, limit.key
    assert {limit.reason for limit in ha.LIMITS.values()} - {""} == set(ha.REASON_WORDS) - {
        "none",
        "span",
        "bad_row",
    }


def test_twilights_by_name():
    for word, angle in (("civil", -6.0), ("nautical", -12.0), ("astronomical", -18.0)):
        assert ha.Limits(sun_altitude_max_deg=word)["sun_altitude_max_deg"] == angle
    with pytest.raises(UnknownName, match="given 'nautic', which is unknown; the nearest is 'nautical'"):
        ha.Limits(sun_altitude_max_deg="nautic")


def test_an_unknown_key_names_the_nearest():
    with pytest.raises(UnknownName) as caught:
        ha.Limits(moon_seperation_min_deg=30.0)
    assert "Limits: keyword: given 'moon_seperation_min_deg', which is unknown" in str(caught.value)
    assert "the nearest is 'moon_separation_min_deg'" in str(caught.value)
    with pytest.raises(UnknownName, match="the nearest is 'altitude_min_deg'"):
        ha.Limits(altitude_min=30.0)
    with pytest.raises(UnknownName, match="the nearest is 'airmass_max'"):
        ha.Limits().replace(airmas_max=2)
    with pytest.raises(UnknownName):
        ha.Limits()["zzz"]


#: What must stand beside a limit to make sense.
BESIDE = {
    "moon_avoidance_separation_deg": {"moon_avoidance_width_d": 5.0},
    "moon_avoidance_width_d": {"moon_avoidance_separation_deg": 60.0},
    "moon_avoidance_dark_deg": {"moon_avoidance_bright_deg": 60.0},
    "moon_avoidance_bright_deg": {"moon_avoidance_dark_deg": 10.0},
    "moon_relaxed_below_deg": {"moon_separation_min_deg": 30.0},
    "phase_epoch_jd": {"phase_period_d": 3.0, "phase_half_width_d": 0.1},
    "phase_period_d": {"phase_epoch_jd": 2455197.5, "phase_half_width_d": 0.0},
    "phase_half_width_d": {"phase_epoch_jd": 2455197.5, "phase_period_d": 1e6},
}
NUMBERS = [key for key, limit in ha.LIMITS.items() if limit.kind == "number"]


@pytest.mark.parametrize("key", NUMBERS)
def test_each_range_is_held_at_both_ends(key):
    # By the engine too: the ends in degrees are within its own in radians.
    limit, stars = ha.LIMITS[key], ha.Catalog([10.0, 100.0], [5.0, -30.0])
    beside = BESIDE.get(key, {})
    # Half a period is as wide as windows of a phase may be.
    high = limit.high if key != "phase_half_width_d" else 4.9e5
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", SunLimitWarning)
        for value in (limit.low, high):
            if key == "phase_period_d" and value == limit.low:
                # 10,000 windows a day.
                ha.Limits(**{**beside, key: value})
                continue
            given = ha.Limits(**{"altitude_min_deg": -5.0, **beside, key: value})
            assert (ha.windows(SITE, stars, *SPAN, given).status == 0).all()
            if limit.by_target:
                ha.windows(SITE, stars, *SPAN, given.replace(**{key: [value, value]}))
        for value in (limit.low - 1e-6, limit.high + 1e-3, np.nan, np.inf):
            with pytest.raises(InvalidArgument) as caught:
                ha.Limits(**{**beside, key: value})
            assert str(caught.value).startswith(
                f"Limits: {key}: given {value:.12g}, allowed {limit.low:.9g} to"
            )


def test_values_of_another_kind():
    with pytest.raises(WrongType, match="Limits: altitude_min_deg: given '30'"):
        ha.Limits(altitude_min_deg="30")
    with pytest.raises(UnknownName, match="airmass_model: given 'pickering', .*nearest is 'pickering_2002'"):
        ha.Limits(airmass_model="pickering")
    with pytest.raises(WrongType, match="Limits: airmass_model: given 3"):
        ha.Limits(airmass_model=3)
    with pytest.raises(InvalidArgument, match="Limits: airmass_model: given None"):
        ha.Limits(airmass_model=None)
    with pytest.raises(TypeError):
        ha.Limits(30.0)


def test_limits_that_contradict_one_another():
    with pytest.raises(InvalidArgument) as caught:
        ha.Limits(altitude_min_deg=50.0, altitude_max_deg=40.0)
    assert "altitude_min_deg=50 above altitude_max_deg=40" in str(caught.value)
    # The default counts as given.
    with pytest.raises(InvalidArgument, match="altitude_min_deg=30 above altitude_max_deg=20"):
        ha.Limits(altitude_max_deg=20.0)
    with pytest.raises(InvalidArgument, match="hour_angle_min_h=2 above hour_angle_max_h=-2"):
        ha.Limits(hour_angle_min_h=2.0, hour_angle_max_h=-2.0)
    ha.Limits(altitude_min_deg=40.0, altitude_max_deg=40.0)


def test_something_must_keep_the_target_above_the_ground():
    with pytest.raises(InvalidArgument, match="altitude_min_deg: given None, without airmass_max"):
        ha.Limits(altitude_min_deg=None)
    assert "altitude_min_deg" not in ha.Limits(altitude_min_deg=None, airmass_max=2.0)


def test_lowering_the_sun_limit_is_cautioned():
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        ha.Limits()
        ha.Limits(sun_separation_min_deg=45.0)
        ha.Limits(sun_separation_min_deg=[30.0, 45.0])
    for value, shown in ((10.0, "is 10 degrees"), (None, "is off"), ([30.0, 29.0], "is 29 degrees")):
        with pytest.warns(SunLimitWarning) as caught:
            ha.Limits(sun_separation_min_deg=value)
        text = str(caught[0].message)
        assert shown in text
        assert "can blind a person and destroy an instrument" in text
        assert "never the interlock" in text and "safety rules" in text
        assert caught[0].filename == __file__


def test_columns_are_checked_for_length():
    stars = ha.Catalog([10.0, 20.0, 30.0], 0.0)
    limits = ha.Limits(altitude_min_deg=[20.0, 30.0])
    with pytest.raises(InvalidArgument) as caught:
        ha.windows(SITE, stars, *SPAN, limits)
    assert "Limits: altitude_min_deg: given 2 values, allowed one value, or one for each of 3 targets" in str(
        caught.value
    )
    with pytest.raises(InvalidArgument, match=r"shape \(1, 2\)"):
        ha.Limits(altitude_min_deg=[[20.0, 30.0]])


def test_a_column_is_the_scalars_of_its_rows():
    rng = np.random.default_rng(7)
    stars = ha.Catalog(rng.uniform(0, 360, 40), rng.uniform(-80, 30, 40))
    lowest = rng.choice([20.0, 45.0, 60.0], 40)
    by_column = ha.windows(SITE, stars, *SPAN, ha.Limits(altitude_min_deg=lowest))
    assert len(by_column.start) > 10
    for row, altitude in enumerate(lowest):
        alone = ha.windows(SITE, stars[row], *SPAN, ha.Limits(altitude_min_deg=float(altitude)))
        assert by_column.of(row) == alone.of(0)


@pytest.mark.parametrize(
    "limits",
    [
        {"altitude_min_deg": [30.0, np.nan, 30.0]},
        {"altitude_min_deg": [30.0, 120.0, 30.0]},
        {"altitude_min_deg": [30.0, 70.0, 30.0], "altitude_max_deg": 60.0},
        {"altitude_min_deg": 30.0, "altitude_max_deg": [90.0, 20.0, 90.0]},
        {"altitude_min_deg": [30.0, 70.0, 30.0], "altitude_max_deg": [90.0, 60.0, 90.0]},
    ],
)
def test_a_bad_value_in_a_column_makes_a_bad_row(limits):
    stars = ha.Catalog([130.0, 140.0, 130.0], -20.0)
    found = ha.windows(SITE, stars, *SPAN, ha.Limits(**limits))
    assert found.status_words.tolist() == ["ok", "limit_out_of_range", "ok"]
    assert found.blocked_by_words[1] == "bad_row" and found.counts[1] == 0
    assert found.of(0) == found.of(2) != []


def test_limits_are_values():
    limits = ha.Limits(altitude_min_deg=[20.0, 30.0], moon_separation_min_deg=40.0)
    again = pickle.loads(pickle.dumps(limits))
    assert again == limits and limits != ha.Limits() and limits != 3
    assert limits.replace(altitude_min_deg=25.0).to_dict()["moon_separation_min_deg"] == 40.0
    with pytest.raises(AttributeError, match=r"use \.replace\(airmass_max=\.\.\.\)"):
        limits.airmass_max = 3.0
    with pytest.raises(ValueError):
        limits["altitude_min_deg"][0] = 3.0


def test_windows_takes_limits_only():
    with pytest.raises(WrongType, match="windows: limits: given {'altitude_min_deg': 3}"):
        ha.windows(SITE, ha.Catalog(0.0, 0.0), *SPAN, {"altitude_min_deg": 3})


def test_units_of_limits():
    u = pytest.importorskip("astropy.units")
    limits = ha.Limits(altitude_min_deg=0.5 * u.rad, window_min_s=10.0 * u.min, hour_angle_max_h=30 * u.deg)
    assert limits["altitude_min_deg"] == pytest.approx(np.degrees(0.5))
    assert limits["window_min_s"] == 600.0
    with pytest.raises(InvalidArgument, match="window_min_s: given a value in deg"):
        ha.Limits(window_min_s=3.0 * u.deg)
