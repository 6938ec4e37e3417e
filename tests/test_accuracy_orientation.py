"""The packaged Earth orientation, against the same tables as astropy reads them."""

import hourarc
import numpy as np
import pytest
from bridge import TablePole
from oracle import clock
from oracle.pole import table

# What an error of each column turns the sky by at most, in microarcseconds.
WEIGHT = {"dut1_s": 15.041e6, "xp_arcsec": 1e6, "yp_arcsec": 1e6, "dx_mas": 1e3, "dy_mas": 1e3}
OURS = {"dut1_s": "ut1_minus_utc_s"}


def midnight_ns(mjd):
    return ((np.asarray(mjd) - clock.UNIX_MJD) * clock.DAY_NS).astype(np.int64)


@pytest.fixture(scope="module")
def rows():
    """The days of C04, and those of finals2000A from where C04 ends, with the values printed for them."""
    c04, finals = table("c04"), table("finals2000A")
    later = finals["mjd"] > c04["mjd"][-1]
    return {key: np.concatenate([c04[key], finals[key][later]]) for key in c04}


def test_orientation_is_the_tables_at_its_knots(figures, rows):
    ours = hourarc.earth.Orientation.packaged().at(clock.datetime(midnight_ns(rows["mjd"])))
    worst, cases = 0.0, 0
    for key, weight in WEIGHT.items():
        printed = rows[key]
        difference = np.abs(np.asarray(getattr(ours, OURS.get(key, key))) - printed) * weight
        known = np.isfinite(printed)
        bad = known & ~(difference <= 0.1)
        print(key, known.sum(), difference[known].max(), rows["mjd"][bad][:5])
        worst, cases = max(worst, difference[known].max()), cases + known.sum()
    figures.hold("orientation", worst, cases)


def test_orientation_between_the_knots_is_smooth(rows):
    # The second derivatives of a cubic spline are √3 Σ (−λ)^|k| b(i+k), b the table's second differences and
    # λ = 2 − √3; half way between two knots it is off the straight line by a sixteenth of those at both. Leap
    # seconds are taken out first.
    decay = (2.0 - np.sqrt(3.0)) ** np.abs(np.arange(-20, 21))
    middle = midnight_ns(rows["mjd"]) + clock.DAY_NS // 2
    leap = clock.tai_minus_utc_s(midnight_ns(rows["mjd"]))
    ours = hourarc.earth.Orientation.packaged().at(clock.datetime(middle))
    cases = 0
    for key in WEIGHT:
        known = np.isfinite(rows[key])
        values = (rows[key] - (leap if key == "dut1_s" else 0.0))[known]
        between = np.asarray(getattr(ours, OURS.get(key, key)))
        between = (between - (clock.tai_minus_utc_s(middle) if key == "dut1_s" else 0.0))[known]
        bend = np.convolve(np.abs(np.diff(values, 2)), decay, mode="same")
        allowed = np.sqrt(3.0) / 16.0 * (bend[:-1] + bend[1:])
        deviation = np.abs(between - 0.5 * (values + np.append(values[1:], np.nan)))[1:-2]
        inner = slice(20, -20)  # beyond the reach of the two ends
        assert np.all(deviation[inner] <= allowed[inner] * (1 + 1e-6) + 1e-12), key
        assert deviation[inner].max() > 0.0, key
        cases += len(deviation[inner])
    assert cases > 100_000


def test_orientation_does_not_jump_at_a_leap_second():
    # 2016-12-31 ended with a leap second: UT1−UTC jumps by one, UT1−TAI must not.
    second = 1_000_000_000
    midnight = int(clock.nanoseconds("2017-01-01"))
    when = np.array([midnight - second, midnight])
    pole = TablePole().at(when)
    ut1_minus_tai = pole.ut1_minus_utc_s - clock.tai_minus_utc_s(when)
    assert abs(pole.ut1_minus_utc_s[1] - pole.ut1_minus_utc_s[0] - 1.0) < 1e-6
    assert abs(np.diff(ut1_minus_tai)[0]) < 1e-6


def test_error_of_ut1_grows_past_the_table():
    # IERS Bulletin A: 0.00025·d^0.75 s, 21 ms after a year.
    orientation = hourarc.earth.Orientation.packaged()
    far = np.datetime64("2031-06-01") + np.arange(0, 2000, 400)
    row = orientation.at(far)
    error = np.asarray(row.ut1_error_s)
    assert np.all(np.diff(error) > 0.0)
    assert error[0] > 0.02
    days = (np.diff(error) / 0.00025).sum()
    assert days > 0.0
    measured = orientation.at(np.datetime64("2020-06-01"))
    assert np.all(np.asarray(measured.ut1_error_s) < 1e-3)


def test_constant_orientation_is_constant():
    orientation = hourarc.earth.Orientation.constant(0.25, 0.1, 0.2, 0.3, -0.4)
    pole = TablePole(orientation).at(clock.nanoseconds(["1975-01-01", "2026-11-05T03:04:05"]))
    assert np.allclose(pole.ut1_minus_utc_s, 0.25, atol=1e-12)
    for angle, expected in ((pole.xp, 0.1), (pole.yp, 0.2), (pole.dx, 0.3e-3), (pole.dy, -0.4e-3)):
        assert np.allclose(np.degrees(angle) * 3600, expected, atol=1e-12)
