"""The watch: the same bits as the exact calls, at edges of windows too; threads, outputs and refusals."""

import pickle
import threading

import hourarc as ha
import numpy as np
import pytest
from hourarc.errors import InvalidArgument, MissingColumn, UnknownName, WrongType

SITE = ha.Site(24.5127, -20.8714, 1148.0, name="Saltpan Ridge", pressure_hpa=880.0)
NIGHT = "2026-03-10"
SECOND = np.timedelta64(1, "s")
TICK = np.timedelta64(1, "ns")


def stars(count=2000, seed=1):
    rng = np.random.default_rng(seed)
    dec = np.degrees(np.arcsin(rng.uniform(-1.0, 1.0, count)))
    dec[5::50] = 95.0
    dec[6::50] = np.nan
    name = [f"star {row}" for row in range(count)]
    motion = {"pm_ra_mas_yr": rng.uniform(-99.0, 99.0, count), "parallax_mas": rng.uniform(0.0, 50.0, count)}
    return ha.Catalog(rng.uniform(0.0, 360.0, count), dec, name=name, **motion)


# An upper limit parts the windows of stars that culminate high, so that many have two.
LIMITS = ha.Limits(altitude_min_deg=25.0, altitude_max_deg=55.0, moon_separation_min_deg=20.0)


@pytest.fixture(scope="module")
def watch():
    return ha.Watch(SITE, stars(), NIGHT, LIMITS)


def compare(moment, watch, when):
    """Holds a moment to `windows` and `place`, by another way than the engine's."""
    found = watch.windows
    assert moment.time == when and len(moment) == len(watch)
    in_window = (found.start <= when) & (when < found.stop)
    up = np.bincount(found.target[in_window], minlength=len(watch)) > 0
    left, to_next = np.full(len(watch), np.nan), np.full(len(watch), np.nan)
    reason = np.zeros(len(watch), np.uint8)
    left[found.target[in_window]] = (found.stop[in_window] - when) / SECOND
    reason[found.target[in_window]] = found.stop_reason[in_window]
    ahead = np.flatnonzero(found.start > when)[::-1]  # of two, the earlier is written last
    to_next[found.target[ahead]] = (found.start[ahead] - when) / SECOND
    assert np.array_equal(moment.up, up) and np.array_equal(moment.stop_reason, reason)
    for name, expected in (("seconds_left", left), ("seconds_to_next", to_next)):
        if name in moment.columns:
            assert np.array_equal(moment[name], expected, equal_nan=True), name
    of_place = [name for name in moment.columns if name in ha.PLACE_COLUMNS]
    if of_place:
        places = ha.place(watch.site, watch.targets, when, columns=of_place)
        for name in of_place:
            assert np.array_equal(moment[name], places[name], equal_nan=True), name
        assert np.array_equal(moment.status, np.maximum(places.status, found.status))


def test_the_same_bits_as_the_exact_calls(watch):
    counts = np.bincount(watch.windows.counts)
    assert counts.size > 2 and counts.min() > 50
    rng = np.random.default_rng(7)
    seconds = rng.integers(0, 86_400, 12)
    edges = rng.choice(np.concatenate([watch.windows.start, watch.windows.stop]), 12)
    instants = [watch.start, watch.stop - TICK, *(watch.start + seconds * SECOND)]
    instants += [*(edges - TICK), *edges, *(edges + TICK)]
    for number, when in enumerate(instants):
        compare(watch.at(when, columns=ha.WATCH_COLUMNS, threads=1 + number % 3), watch, when)


def test_windows_of_the_watch_are_those_of_the_night(watch):
    row = ha.almanac(SITE, NIGHT)
    assert (watch.start, watch.stop) == (row.start[0], row.stop[0])
    found = ha.windows(SITE, watch.targets, watch.start, watch.stop, LIMITS)
    for name in ("offsets", "start", "stop", "stop_reason"):
        assert np.array_equal(getattr(found, name), getattr(watch.windows, name))


def test_a_window_is_half_open(watch):
    window = int(np.argmax(watch.windows.stop_reason == ha.REASON_WORDS.index("altitude_min")))
    row = int(watch.windows.target[window])
    start, stop = watch.windows.start[window], watch.windows.stop[window]
    assert not watch.at(start - TICK).up[row] and watch.at(start).up[row]
    last = watch.at(stop - TICK)
    assert last.up[row] and last.seconds_left[row] == 1e-9
    assert last.stop_reason_words[row] == "altitude_min"
    assert not watch.at(stop).up[row] and watch.at(stop).stop_reason_words[row] == "none"


def test_bad_rows_are_never_up():
    targets = stars(500)
    lowest = np.where(np.arange(500) % 40 == 3, np.nan, 25.0)
    watch = ha.Watch(SITE, targets, NIGHT, ha.Limits(altitude_min_deg=lowest))
    moment = watch.at(watch.start + np.timedelta64(10, "h"))
    assert set(moment.status_words) == {
        "ok",
        "not_finite",
        "declination_out_of_range",
        "limit_out_of_range",
    }
    bad = moment.status >= 16
    assert not moment.up[bad].any() and np.isnan(moment.seconds_to_next[bad]).all()
    assert moment.up[~bad].any()
    compare(moment, watch, moment.time)


def test_bodies_are_watched_too():
    watch = ha.Watch(
        SITE, ha.Bodies(["moon", "mars", "jupiter", "sun"]), NIGHT, ha.Limits(altitude_min_deg=20.0)
    )
    for hour in range(24):
        when = watch.start + np.timedelta64(hour, "h")
        compare(watch.at(when, columns=ha.WATCH_COLUMNS), watch, when)


def test_python_threads_may_ask_at_once(watch):
    failures = []

    def ask(first):
        try:
            out = watch.at(watch.start)
            for step in range(25):
                when = watch.start + np.timedelta64(3 * step + first, "m") * 10
                out = watch.at(when, out=out, threads=2)
                compare(out, watch, when)
        except BaseException as failure:
            failures.append(failure)

    threads = [threading.Thread(target=ask, args=(first,)) for first in range(3)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert failures == []


def test_outputs_of_the_caller(watch):
    when = watch.start + np.timedelta64(9, "h")
    first = watch.at(when)
    again = watch.at(when + SECOND, out=first)
    assert again.up is first.up and again.airmass is first.airmass and again.time != first.time
    rows = len(watch)
    mine = {"azimuth_deg": np.empty(rows), "up": np.empty(rows, bool)}
    moment = watch.at(when, columns="azimuth_deg", out=mine)
    assert moment.azimuth_deg is mine["azimuth_deg"] and moment.up is mine["up"]
    compare(moment, watch, when)
    up = watch.at(when, columns=())
    assert up.columns == ()
    compare(up, watch, when)
    for out, error, message in (
        ({}, InvalidArgument, "out['azimuth_deg']: given nothing"),
        ({"azimuth_deg": np.empty(3)}, InvalidArgument, "float64 of shape (3,)"),
        ({**mine, "up": np.empty(rows, np.uint8)}, InvalidArgument, "allowed a writable"),
        ({**mine, "airmass": np.empty(rows)}, InvalidArgument, "airmass, which is not computed"),
        ({**mine, "azimut": np.empty(rows)}, UnknownName, "azimut"),
        ([np.empty(rows)], WrongType, "a Moment, or arrays"),
    ):
        with pytest.raises(error) as caught:
            watch.at(when, columns="azimuth_deg", out=out)
        assert message in str(caught.value)


def test_the_night_and_nothing_but_the_night(watch):
    for outside in (watch.start - TICK, watch.stop, "2026-03-09T20:00", "2026-03-12"):
        with pytest.raises(InvalidArgument, match="the span watched"):
            watch.at(outside)
    with pytest.raises(InvalidArgument, match="NaT"):
        watch.at(np.datetime64("NaT"))
    with pytest.raises(InvalidArgument, match="one instant"):
        watch.at([watch.start, watch.start + SECOND])


def test_wrong_calls(watch):
    when = watch.start
    with pytest.raises(UnknownName, match="seconds_left"):
        watch.at(when, columns=["second_left"])
    with pytest.raises(InvalidArgument, match="each column once"):
        watch.at(when, columns=["airmass", "airmass"])
    with pytest.raises(MissingColumn, match="azimuth_deg was not computed"):
        _ = watch.at(when).azimuth_deg
    with pytest.raises(UnknownName):
        watch.at(when)["azimuth"]
    with pytest.raises(InvalidArgument, match="Watch: night"):
        ha.Watch(SITE, stars(3), "2026-03-10T12:00", LIMITS)
    for night, message in (("1955-03-10", "1960"), ("2150-03-10", "ephemeris")):
        with pytest.raises(InvalidArgument, match=message):
            ha.Watch(SITE, stars(3), night, LIMITS)
    with pytest.raises(WrongType, match="Watch: limits"):
        ha.Watch(SITE, stars(3), NIGHT, {"airmass_max": 2.0})
    with pytest.raises(AttributeError):
        watch.site = SITE


def test_moments_do_not_change_and_can_be_sent(watch):
    moment = watch.at(watch.start + np.timedelta64(10, "h"))
    with pytest.raises(AttributeError):
        moment.up = None
    same = pickle.loads(pickle.dumps(moment))
    assert same.time == moment.time and np.array_equal(same.up, moment.up)
    assert np.array_equal(same.airmass, moment.airmass, equal_nan=True)
    assert f"{int(moment.up.sum()):,} of 2,000 targets up" in repr(moment)
    assert "2,000 targets" in repr(watch)
    table = moment.to_arrow()
    assert table.num_rows == 2000
    assert table.column_names == ["target", "name", "up", "stop_reason", *moment.columns, "status"]
    assert table["up"].to_pylist() == moment.up.tolist()
    assert table["stop_reason"].to_pylist() == moment.stop_reason_words.tolist()


def test_rates_are_those_of_the_angles():
    # A second before and after, of stars: their azimuths and parallactic angles are held to pyerfa elsewhere.
    targets = stars(3000, seed=4)
    when = np.datetime64("2026-03-10T20:00:00")
    columns = ("altitude_deg", "azimuth_deg", "parallactic_angle_deg")
    rates = ("azimuth_rate_arcsec_s", "parallactic_angle_rate_arcsec_s")
    site = ha.Site(24.5127, -20.8714, 1148.0, pressure_hpa=0.0)
    now = ha.place(site, targets, when, columns=(*columns, *rates))
    around = ha.place(site, targets, [when - SECOND, when + SECOND], columns=columns)
    usual = (now.status < 16) & (np.abs(now.altitude_deg) < 80.0)
    assert usual.sum() > 2500
    for angle, rate in zip(columns[1:], rates, strict=True):
        turned = (around[angle][1] - around[angle][0] + 180.0) % 360.0 - 180.0
        expected = 3600.0 * turned / 2.0
        assert np.nanmax(np.abs(now[rate] - expected)[usual]) < 0.02  # annual aberration and the rest
    # The keyhole: dA/dt reaches v at about 15.04 cos φ / v from the zenith, on the meridian.
    zenith_distance = 90.0 - now.altitude_deg
    cos_latitude = np.cos(np.radians(20.8714))
    near = usual & (zenith_distance < 15.0)
    assert near.any()
    bound = 15.0411 * cos_latitude / np.tan(np.radians(zenith_distance[near])) + 15.0411
    assert np.all(np.abs(now.azimuth_rate_arcsec_s[near]) <= bound)
