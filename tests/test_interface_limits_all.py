"""What each of the limits beyond the first takes, and what is said of what it does not take."""

import pickle

import hourarc as ha
import numpy as np
import pytest
from hourarc.errors import InvalidArgument, UnknownName, WrongType

SITE = ha.Site(-70.4, -24.6, 2635.0)
SPAN = ("2026-03-10T16:41:36", "2026-03-11T16:41:36")
STARS = ha.Catalog([130.0, 160.0, 190.0], [-20.0, -30.0, -40.0])

EVERY = {
    "altitude_min_deg": 20.0,
    "altitude_max_deg": 88.0,
    "airmass_max": 2.5,
    "declination_min_deg": -80.0,
    "declination_max_deg": 60.0,
    "hour_angle_min_h": -5.0,
    "hour_angle_max_h": 5.0,
    "azimuth_sectors_deg": [[300.0, 60.0], [60.5, 299.0]],
    "azimuth_rate_max_deg_s": 1.0,
    "cable_range_deg": [-270.0, 450.0],
    "sun_altitude_max_deg": "nautical",
    "sun_separation_min_deg": 40.0,
    "moon_separation_min_deg": 10.0,
    "moon_avoidance_separation_deg": 50.0,
    "moon_avoidance_width_d": 5.0,
    "moon_relaxed_below_deg": -1.0,
    "moon_altitude_max_deg": 80.0,
    "moon_illumination_max": 0.95,
    "sky_brightness_min_mag_arcsec2": 17.0,
    "allowed_intervals": [
        ["2026-03-10T23:00", "2026-03-11T03:00"],
        ["2026-03-11T04:00Z", "2026-03-11T12:00"],
    ],
    "phase_epoch_jd": 2455197.5,
    "phase_period_d": 0.31,
    "phase_half_width_d": 0.1,
    "window_min_s": 60.0,
}


def test_all_at_once():
    # The two angles of the Moon by its phase exclude one another; everything else stands together.
    assert set(EVERY) | {"moon_avoidance_dark_deg", "moon_avoidance_bright_deg"} == set(ha.LIMITS) - {
        "airmass_model",
        "skyline",
        "phase_scale",
    }
    limits = ha.Limits(**EVERY)
    found = ha.windows(SITE, STARS, *SPAN, limits)
    assert len(found.start) > 2 and (found.status == 0).all()
    assert pickle.loads(pickle.dumps(limits)) == limits == ha.Limits(**limits.to_dict())
    text = repr(limits)
    assert "phase_epoch_jd=2455197.5" in text and "cable_range_deg=[[-270.0, 450.0]]" in text
    for key in EVERY:
        assert key in limits and key in text


def test_columns_of_every_limit_are_the_scalars_of_their_rows():
    rng = np.random.default_rng(31)
    columns = {}
    for key, value in EVERY.items():
        limit = ha.LIMITS[key]
        if limit.by_target:
            number = limit.words.get(value, value) if isinstance(value, str) else value
            columns[key] = np.full(3, number) + rng.uniform(-0.01, 0.01, 3)
    limits = ha.Limits(**{**EVERY, **columns})
    together = ha.windows(SITE, STARS, *SPAN, limits)
    assert len(together.start) > 2
    for row in range(3):
        assert ha.windows(SITE, STARS[row], *SPAN, limits.at(row)).of(0) == together.of(row)
        assert limits.at(row)["phase_period_d"] == columns["phase_period_d"][row]


@pytest.mark.parametrize(
    ("limits", "said"),
    [
        (
            {"declination_min_deg": 10, "declination_max_deg": -10},
            "declination_min_deg=10 above declination_max",
        ),
        (
            {"moon_avoidance_width_d": 5},
            "moon_avoidance_width_d: given without moon_avoidance_separation_deg",
        ),
        ({"phase_period_d": 2}, "phase_period_d: given without phase_epoch_jd and phase_half_width_d"),
        (
            {
                "moon_avoidance_width_d": 5,
                "moon_avoidance_separation_deg": 60,
                "moon_avoidance_dark_deg": 5,
                "moon_avoidance_bright_deg": 60,
            },
            "moon_avoidance_separation_deg and moon_avoidance_dark_deg: given both, allowed either",
        ),
        (
            {"phase_epoch_jd": 2455197.5, "phase_period_d": 2.0, "phase_half_width_d": 1.0},
            "phase_half_width_d: given 1, allowed below half of phase_period_d, 1 d",
        ),
        # A Modified Julian Date, or the short form of tables.
        (
            {"phase_epoch_jd": 55197.0, "phase_period_d": 2.0, "phase_half_width_d": 0.1},
            r"phase_epoch_jd: given 55197, allowed 2300001 to 2600000 d",
        ),
        ({"moon_relaxed_below_deg": 0.0}, "moon_relaxed_below_deg: given without an angle to the Moon"),
        ({"azimuth_sectors_deg": [[10, 10]]}, r"azimuth_sectors_deg: given \[10, 10\], allowed pairs"),
        ({"azimuth_sectors_deg": [[10, 400]]}, r"given \[10, 400\], allowed .* from 0 to 360 deg"),
        ({"azimuth_sectors_deg": [1, 2, 3]}, r"azimuth_sectors_deg: given an array of shape \(3,\)"),
        ({"azimuth_sectors_deg": []}, r"azimuth_sectors_deg: given an array of shape \(0,\)"),
        ({"cable_range_deg": [270, -270]}, r"cable_range_deg: given \[270, -270\], .* low below high"),
        ({"cable_range_deg": [[0, 1], [2, 3]]}, r"cable_range_deg: given an array of shape \(2, 2\)"),
        (
            {"allowed_intervals": [["2026-03-11", "2026-03-10"]]},
            "allowed_intervals: given 2026-03-11T.* to 2026-03-10T.* each a start before its stop",
        ),
        ({"allowed_intervals": [["2026-03-11", "2026-03-10", "2026"]]}, "allowed_intervals: given .* pairs"),
        ({"allowed_intervals": [["2026-03-11", "yesterday"]]}, "allowed_intervals: given 'yesterday'"),
        ({"allowed_intervals": [["2026-03-11", "NaT"]]}, "allowed_intervals: given .* to NaT"),
        ({"phase_scale": "bjd"}, "phase_scale: given 'bjd', .* nearest is 'bjd_tdb'"),
        ({"moon_avoidence_width_d": 3}, "nearest is 'moon_avoidance_width_d'"),
        ({"sky_brightness": 3}, "nearest is 'sky_brightness_min_mag_arcsec2'"),
        ({"azimuth_rate_max": 3}, "nearest is 'azimuth_rate_max_deg_s'"),
    ],
)
def test_what_cannot_be(limits, said):
    with pytest.raises(InvalidArgument, match=said):
        ha.Limits(**limits)


@pytest.mark.parametrize(
    ("limits", "said"),
    [
        ({"skyline": 1}, r"skyline: given 1 \(int\), allowed True or False"),
        ({"skyline": "yes"}, "skyline: given 'yes'"),
        ({"allowed_intervals": "2026-03-11"}, "allowed_intervals: given '2026-03-11'"),
        ({"azimuth_sectors_deg": "north"}, "azimuth_sectors_deg: given 'north'"),
        ({"moon_separation_min_deg": 3, "moon_relaxed_below_deg": [0, 1]}, "moon_relaxed_below_deg: given"),
        ({"phase_scale": 3}, "phase_scale: given 3"),
    ],
)
def test_values_of_another_kind(limits, said):
    with pytest.raises(WrongType, match=said):
        ha.Limits(**limits)
    with pytest.raises(InvalidArgument, match="skyline: given None, allowed True or False$"):
        ha.Limits(skyline=None)


def test_contradictions_in_columns_are_bad_rows():
    limits = ha.Limits(
        phase_epoch_jd=2455197.5,
        phase_period_d=[1.0, 2.0, 1.0],
        phase_half_width_d=[0.2, 1.5, 0.2],
        declination_min_deg=[-90.0, -90.0, 10.0],
        declination_max_deg=0.0,
    )
    found = ha.windows(SITE, STARS, *SPAN, limits)
    assert found.status_words.tolist() == ["ok", "limit_out_of_range", "limit_out_of_range"]


def test_the_skyline_is_a_limit_where_there_is_one():
    walled = ha.Site(-70.4, -24.6, 2635.0, skyline=[[0.0, 5.0], [90.0, 70.0], [180.0, 5.0], [270.0, 5.0]])
    free = ha.windows(SITE, STARS, *SPAN)
    behind = ha.windows(walled, STARS, *SPAN)
    assert "skyline" in behind.start_reason_words and behind.hours.sum() < free.hours.sum() - 2.0
    without = ha.windows(walled, STARS, *SPAN, ha.Limits(skyline=False))
    assert without.start.tolist() == free.start.tolist()
    # On a site without a skyline it is no contradiction to ask for it.
    assert ha.windows(SITE, STARS, *SPAN, ha.Limits(skyline=True)).start.tolist() == free.start.tolist()


def test_intervals_in_every_form():
    times = np.array([["2026-03-11T01:00", "2026-03-11T02:00"]], dtype="datetime64[m]")
    forms = [times, times.tolist(), [["2026-03-11T01:00", "2026-03-11T03:00+01:00"]]]
    astropy_time = pytest.importorskip("astropy.time")
    forms.append(astropy_time.Time(times, scale="utc"))
    assert len({repr(ha.Limits(allowed_intervals=form)) for form in forms}) == 1
    found = ha.windows(SITE, STARS[0], *SPAN, ha.Limits(allowed_intervals=times)).of(0)
    assert [(w.start, w.stop) for w in found] == [(times[0, 0], times[0, 1])]
    assert found[0].start_reason == found[0].stop_reason == "allowed_intervals"


def test_a_catalogue_place_that_may_be_off_widens_the_errors():
    sure = ha.windows(SITE, STARS, *SPAN)
    off = ha.windows(SITE, STARS, *SPAN, position_error_mas=[0.0, 15_041.07, 15_041.07])
    assert off.start.tolist() == sure.start.tolist()
    by_altitude = off.stop_reason_words == "altitude_min"
    added = (off.stop_error_s - sure.stop_error_s)[by_altitude]
    # 15.04″ of position take at least a second to turn through.
    assert by_altitude.sum() >= 2 and (added[off.target[by_altitude] > 0] > 1.0).all()
    assert (sure.start_error_s < 0.01).all() and (sure.stop_error_s > 0.0).all()
    for wrong in (-1.0, np.nan, [1.0, 2.0], [1.0, -2.0, 3.0]):
        with pytest.raises(InvalidArgument, match="windows: position_error_mas"):
            ha.windows(SITE, STARS, *SPAN, position_error_mas=wrong)


def test_low_edges_scatter_and_grazings_may_not_happen():
    low = ha.Limits(altitude_min_deg=1.0)
    found = ha.windows(SITE, STARS, *SPAN, low)
    edges = found.stop_reason_words == "altitude_min"
    assert edges.any() and (found.stop_scatter_s[edges] > 20.0).all()
    assert not found.stop_scatter_s[~edges].any() and not found.may_not_happen.any()
    # A star that culminates 2″ above the limit of 10°, where refraction scatters by more.
    declination = np.linspace(55.2, 55.6, 20001)
    stars = ha.Catalog(np.full(20001, 160.0), declination)
    best = ha.place(SITE, stars, ha.windows(SITE, STARS[1], *SPAN).best_time[0]).altitude_deg
    grazing = stars[int(np.argmin(np.abs(best - 10.0005)))]
    (window,) = ha.windows(SITE, grazing, *SPAN, ha.Limits(altitude_min_deg=10.0)).of(0)
    assert window.may_not_happen and window.start_error_s >= 0.0


def test_a_wrong_name_of_a_limit_in_at():
    with pytest.raises(UnknownName, match="Limits: key"):
        ha.Limits()["moon_avoidance"]
