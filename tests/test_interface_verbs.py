"""Shapes, columns, outputs and refusals of the four verbs; scalars and arrays give the same bits."""

import itertools
import pickle

import hourarc as ha
import numpy as np
import pytest
from hourarc.errors import InvalidArgument, MissingColumn, UnknownName, WrongType

SITE = ha.Site(-70.4, -24.6, 2635.0, name="Saltpan Ridge")
WHEN = np.datetime64("2026-03-10T00:00:00") + np.arange(5) * np.timedelta64(7001, "s")
SPAN = ("2026-03-10T16:41:36", "2026-03-11T16:41:36")


def stars(count=30, seed=1, **keywords):
    rng = np.random.default_rng(seed)
    dec = np.degrees(np.arcsin(rng.uniform(-1.0, 1.0, count)))
    return ha.Catalog(rng.uniform(0.0, 360.0, count), dec, pm_ra_mas_yr=50.0, parallax_mas=10.0, **keywords)


def test_place_shapes_and_bits():
    targets = stars()
    places = ha.place(SITE, targets, WHEN, columns=ha.PLACE_COLUMNS)
    assert places.shape == (5, 30) and places.time.shape == (5,)
    assert places.columns == ha.PLACE_COLUMNS
    at_once = ha.place(SITE, targets, WHEN[2], columns=ha.PLACE_COLUMNS)
    assert at_once.shape == (30,) and at_once.time.shape == ()
    one_row = ha.place(SITE, targets, WHEN[2:3], columns=ha.PLACE_COLUMNS)
    assert one_row.shape == (1, 30)
    pairs = ha.place(SITE, targets[:5], WHEN, columns=ha.PLACE_COLUMNS, pairwise=True)
    assert pairs.shape == (5,) and pairs.pairwise
    for name in ha.PLACE_COLUMNS:
        column = places[name]
        assert column.shape == (5, 30) and column.dtype == np.float64 and column.flags.c_contiguous
        # The instants alone: the track between its nodes is the same for one instant as for many.
        assert np.array_equal(at_once[name], column[2], equal_nan=True)
        assert np.array_equal(one_row[name][0], column[2], equal_nan=True)
        assert np.array_equal(pairs[name], np.diagonal(column[:, :5]), equal_nan=True)
        for row in (0, 17):
            alone = ha.place(SITE, targets[row], WHEN[2], columns=[name])
            assert alone[name].shape == (1,)
            assert np.array_equal(alone[name], column[2, row : row + 1], equal_nan=True)
    assert np.all((places.azimuth_deg >= 0.0) & (places.azimuth_deg < 360.0))
    assert np.all(np.abs(places.hour_angle_deg) <= 180.0)
    assert np.array_equal(np.isnan(places.airmass), places.altitude_deg < 0.0)


def test_any_order_and_any_number_of_threads_give_the_same_bits():
    targets = stars(20_000, seed=2)
    order = np.random.default_rng(3).permutation(20_000)
    one = ha.place(SITE, targets, WHEN[0], threads=1)
    for places, index in (
        (ha.place(SITE, targets, WHEN[0], threads=2), slice(None)),
        (ha.place(SITE, targets, WHEN[0], threads=7), slice(None)),
        (ha.place(SITE, targets, WHEN[0]), slice(None)),
        (ha.place(SITE, targets[order], WHEN[0]), order),
    ):
        for name in one.columns:
            assert np.array_equal(places[name], one[name][index], equal_nan=True)
    found = [ha.windows(SITE, targets[:3000], *SPAN, threads=threads) for threads in (1, 2, 5)]
    events = [ha.rise_transit_set(SITE, targets[:3000], *SPAN, threads=threads) for threads in (1, 2, 5)]
    for results in (found, events):
        for other in results[1:]:
            for name in results[0].__dataclass_fields__:
                if name != "name":
                    assert np.array_equal(getattr(results[0], name), getattr(other, name)), name


def test_only_the_columns_that_are_named():
    targets = stars(3)
    places = ha.place(SITE, targets, WHEN[0])
    assert places.columns == ha.PLACE_COLUMNS[:6]
    one = ha.place(SITE, targets, WHEN[0], columns="airmass")
    assert one.columns == ("airmass",)
    with pytest.raises(MissingColumn, match=r"altitude_deg was not computed; .*Computed: airmass"):
        _ = one.altitude_deg
    assert not hasattr(one, "altitude_deg") and not hasattr(one, "nonsense")
    with pytest.raises(UnknownName, match="Places: column: given 'altitude', .*nearest is 'altitude_deg'"):
        one["altitude"]
    with pytest.raises(UnknownName, match="place: columns: given 'azimut_deg', .*nearest is 'azimuth_deg'"):
        ha.place(SITE, targets, WHEN[0], columns=["altitude_deg", "azimut_deg"])
    with pytest.raises(InvalidArgument, match="each column once"):
        ha.place(SITE, targets, WHEN[0], columns=["airmass", "airmass"])
    with pytest.raises(InvalidArgument, match="place: columns: given none"):
        ha.place(SITE, targets, WHEN[0], columns=[])


def test_places_into_the_callers_arrays():
    targets = stars(8)
    expected = ha.place(SITE, targets, WHEN)
    out = {name: np.empty((5, 8)) for name in expected.columns} | {"status": np.full((5, 8), 99, np.uint8)}
    filled = ha.place(SITE, targets, WHEN, out=out)
    for name in expected.columns:
        assert filled[name] is out[name]
        assert np.array_equal(out[name], expected[name], equal_nan=True)
    assert np.all(out["status"] == 0) and filled.status is out["status"]
    again = ha.place(SITE, targets, WHEN + 60, out=filled)
    assert again.altitude_deg is filled.altitude_deg
    assert not np.array_equal(again.altitude_deg, expected.altitude_deg)
    # Columns of a larger block, as a caller who owns the memory would hand them in.
    block = np.empty((2, 5, 8))
    ha.place(SITE, targets, WHEN, columns=["airmass"], out={"airmass": block[1]})
    assert np.array_equal(block[1], expected.airmass, equal_nan=True)


@pytest.mark.parametrize(
    "out, message",
    [
        (
            {"airmass": np.empty((5, 7))},
            r"out\['airmass'\]: given float64 of shape \(5, 7\), allowed .*\(5, 8\)",
        ),
        ({"airmass": np.empty((5, 8), np.float32)}, "given float32 of shape"),
        ({"airmass": np.empty((8, 5)).T}, "an array that is not C-contiguous"),
        ({"airmass": np.broadcast_to(0.0, (5, 8))}, "a read-only array"),
        ({}, r"out\['airmass'\]: given nothing"),
        (
            {"airmass": np.empty((5, 8)), "altitude_deg": np.empty((5, 8))},
            "altitude_deg, which is not computed",
        ),
        ({"airmass": np.empty((5, 8)), "status": np.empty((5, 8))}, r"out\['status'\]: given float64"),
    ],
)
def test_outputs_that_do_not_fit(out, message):
    with pytest.raises(InvalidArgument, match=message):
        ha.place(SITE, stars(8), WHEN, columns=["airmass"], out=out)


def test_outputs_of_another_kind():
    with pytest.raises(WrongType, match=r"place: out\['airmass'\]: given \[1, 2\]"):
        ha.place(SITE, stars(8), WHEN, columns=["airmass"], out={"airmass": [1, 2]})
    with pytest.raises(WrongType, match="place: out: given 3"):
        ha.place(SITE, stars(8), WHEN, out=3)
    with pytest.raises(UnknownName, match="place: out: given 'air_mass', .*nearest is 'airmass'"):
        ha.place(SITE, stars(8), WHEN, columns=["airmass"], out={"air_mass": np.empty((5, 8))})


def test_times_that_are_no_instants_touch_only_themselves():
    targets = stars(4)
    when = np.array(["2026-03-10", "NaT", "1950-01-01", "2026-03-10", "2150-01-01"], "M8[s]")
    places = ha.place(SITE, targets, when)
    assert places.status_words[:, 0].tolist() == ["ok", "not_a_time", "before_utc", "ok", "outside_ephemeris"]
    for name in places.columns:
        assert np.all(np.isnan(places[name][[1, 2, 4]]))
        assert np.array_equal(places[name][0], places[name][3], equal_nan=True)
    assert np.array_equal(places.altitude_deg[0], ha.place(SITE, targets, "2026-03-10").altitude_deg)


def test_shapes_that_do_not_fit():
    with pytest.raises(InvalidArgument, match=r"place: when: given an array of shape \(1, 5\)"):
        ha.place(SITE, stars(3), WHEN[None])
    with pytest.raises(
        InvalidArgument, match="place: pairwise: given 3 targets at 5 times, allowed one time for each"
    ):
        ha.place(SITE, stars(3), WHEN, pairwise=True)
    with pytest.raises(InvalidArgument, match="given 3 targets at one time"):
        ha.place(SITE, stars(3), WHEN[0], pairwise=True)


@pytest.mark.parametrize("threads", [0, -1, 5000])
def test_numbers_of_threads_that_are_not_allowed(threads):
    with pytest.raises(InvalidArgument, match=f"threads: given {threads}, allowed None"):
        ha.place(SITE, stars(3), WHEN, threads=threads)


def test_threads_of_another_kind():
    for threads in (2.0, "2", True):
        with pytest.raises(WrongType, match="threads: given"):
            ha.windows(SITE, stars(3), *SPAN, threads=threads)


def test_nothing_in_nothing_out():
    none = ha.Catalog([], [])
    assert ha.place(SITE, none, WHEN).shape == (5, 0)
    assert ha.place(SITE, none, WHEN[0]).shape == (0,)
    assert ha.place(SITE, stars(3), WHEN[:0]).shape == (0, 3)
    assert ha.place(SITE, none, WHEN[:0], pairwise=True).shape == (0,)
    assert len(ha.windows(SITE, none, *SPAN)) == 0
    assert len(ha.rise_transit_set(SITE, none, *SPAN)) == 0
    for result in (
        ha.place(SITE, none, WHEN),
        ha.windows(SITE, none, *SPAN),
        ha.rise_transit_set(SITE, none, *SPAN),
    ):
        assert len(result.to_table()) == 0 and result.to_arrow().num_rows == 0


def test_bodies_are_targets_of_every_verb():
    bodies = ha.Bodies(["sun", "moon", "mars"])
    places = ha.place(SITE, bodies, WHEN, columns=ha.PLACE_COLUMNS)
    assert places.shape == (5, 3) and np.all(places.status == 0)
    assert np.all(places.sun_separation_deg[:, 0] < 1e-6) and np.all(places.moon_separation_deg[:, 1] < 1e-6)
    assert ha.rise_transit_set(SITE, bodies, *SPAN).counts.tolist() == [3, 3, 3]
    found = ha.windows(SITE, bodies, *SPAN)
    assert found.counts[0] == 0 and found.blocked_by_words[0] != "none"


def test_events_are_ordered_and_counted():
    targets = ha.Catalog([83.8, 40.0, 40.0, np.nan], [-5.4, -89.0, 85.0, 0.0], name=list("abcd"))
    events = ha.rise_transit_set(SITE, targets, *SPAN)
    assert len(events) == 4 and events.offsets.shape == (5,) and events.offsets[-1] == len(events.time)
    assert events.status_words.tolist() == ["crosses", "always_above", "always_below", "bad_row"]
    assert events.row_status_words.tolist() == ["ok", "ok", "ok", "not_finite"]
    assert sorted(event.kind for event in events.of(0)) == ["rise", "set", "transit"]
    assert [event.kind for event in events.of(1)] == ["transit"] and events.of(3) == []
    for target in events:
        assert [event.time for event in target] == sorted(event.time for event in target)
    assert events.target.tolist() == np.repeat([0, 1, 2, 3], events.counts).tolist()
    assert events.of(-4) == events.of(0)
    assert len(list(events)) == 4
    assert np.all((events.time >= np.datetime64(SPAN[0])) & (events.time < np.datetime64(SPAN[1])))
    for row in (4, -5):
        with pytest.raises(InvalidArgument, match=f"target: given {row}, allowed row numbers from -4 to 3"):
            events.of(row)
    with pytest.raises(WrongType, match="target: given 'a'"):
        events.of("a")
    assert repr(events) == f"<Events: {len(events.time)} of 4 targets>"
    rises = events.time[(events.kind == 0)]
    placed = ha.place(SITE, targets[:1], rises[:1])
    assert abs(placed.altitude_deg[0, 0]) < 1e-6


def test_the_threshold_of_events():
    targets = ha.Catalog(83.8, -5.4)
    high = ha.rise_transit_set(SITE, targets, *SPAN, altitude_deg=30.0)
    rise = high.time[high.kind == 0][:1]
    assert ha.place(SITE, targets, rise).altitude_deg[0, 0] == pytest.approx(30.0, abs=1e-6)
    with pytest.raises(InvalidArgument, match="rise_transit_set: altitude_deg: given 91"):
        ha.rise_transit_set(SITE, targets, *SPAN, altitude_deg=91.0)
    with pytest.raises(InvalidArgument, match="rise_transit_set: altitude_deg: given an array"):
        ha.rise_transit_set(SITE, targets, *SPAN, altitude_deg=[1.0, 2.0])


def test_windows_say_what_opens_closes_and_blocks():
    targets = ha.Catalog([130.0, 40.0, np.nan], [-20.0, 85.0, 0.0], name=["up", "never", "bad"])
    found = ha.windows(SITE, targets, *SPAN, ha.Limits(airmass_max=1.8))
    assert found.counts.tolist() == [1, 0, 0] and len(found) == 3
    (window,) = found.of(0)
    assert window.start < window.best_time < window.stop
    assert window.start_reason == "sun_altitude_max" and window.stop_reason == "airmass_max"
    assert found.start_reason_words.tolist() == ["sun_altitude_max"]
    assert found.stop_reason_words.tolist() == ["airmass_max"]
    assert found.blocked_by_words.tolist() == ["none", "airmass_max", "bad_row"]
    assert found.status_words.tolist() == ["ok", "ok", "not_finite"]
    assert found.blocked_counts == {"airmass_max": 1, "bad_row": 1}
    assert found.hours[0] == pytest.approx((window.stop - window.start) / np.timedelta64(1, "h"))
    assert found.hours[1:].tolist() == [0.0, 0.0]
    assert repr(found) == "<Windows: 1, of 1 of 3 targets>"
    assert np.array_equal(found.duration_s, [window.duration_s for each in found for window in each])
    assert found.duration_s.shape == (1,) and found.hours.sum() == found.duration_s.sum() / 3600.0
    # At the edge that the airmass closes, the airmass is the limit.
    assert ha.place(SITE, targets[:1], found.stop[:1]).airmass[0, 0] == pytest.approx(1.8, abs=1e-6)


def test_spans_that_are_refused():
    targets = stars(2)
    for verb in (ha.windows, ha.rise_transit_set):
        with pytest.raises(InvalidArgument, match="a stop later than the start"):
            verb(SITE, targets, SPAN[1], SPAN[0])
        for span in (("1850-01-01", "1850-01-02"), ("2150-01-01", "2150-01-02")):
            with pytest.raises(InvalidArgument, match=span[0]):
                verb(SITE, targets, *span)


def test_almanac_rows():
    almanac = ha.almanac(SITE, "2026-03-01", 30)
    assert len(almanac) == 30
    assert almanac.night[0] == np.datetime64("2026-03-01") and almanac.night.dtype == "M8[D]"
    order = ("start", "sunset", "dusk_civil", "dusk_nautical", "dusk_astronomical", "dawn_astronomical")
    order += ("dawn_nautical", "dawn_civil", "sunrise", "stop")
    for before, after in itertools.pairwise(order):
        assert np.all(getattr(almanac, before) < getattr(almanac, after))
    assert np.all(almanac.stop[:-1] == almanac.start[1:])
    assert np.all((almanac.moon_illuminated_fraction >= 0.0) & (almanac.moon_illuminated_fraction <= 1.0))
    assert np.all(almanac.dark_hours_moonless <= almanac.dark_hours)
    assert repr(almanac) == "<Almanac of 30 nights, 2026-03-01 to 2026-03-30>"
    assert repr(ha.almanac(SITE, "2026-03-01")) == "<Almanac of the night 2026-03-01>"
    one = ha.almanac(SITE, np.datetime64("2026-03-10"))
    assert len(one) == 1 and one.sunset[0] == almanac.sunset[9]
    # Polar night and midnight sun: no sunset, NaT and not a made-up time.
    tromso = ha.Site(18.96, 69.65)
    assert np.isnat(ha.almanac(tromso, "2026-12-21").sunset[0])
    assert np.isnat(ha.almanac(tromso, "2026-06-21").sunset[0])


def test_almanacs_that_are_refused():
    with pytest.raises(WrongType, match="almanac: nights: given 3.0"):
        ha.almanac(SITE, "2026-03-01", 3.0)
    for nights in (0, -3, 75_001):
        with pytest.raises(InvalidArgument, match=f"nights: given {nights}"):
            ha.almanac(SITE, "2026-03-01", nights)
    for night in ("2026-02-30", "2026-3-1"):
        with pytest.raises(InvalidArgument, match="almanac: first_night: given"):
            ha.almanac(SITE, night)
    with pytest.raises(InvalidArgument, match="given 1850-01-01|ephemeris|before"):
        ha.almanac(SITE, "1850-01-01")


def test_results_do_not_change_and_can_be_sent():
    targets = stars(3, name=["a", "b", "c"])
    results = [
        ha.place(SITE, targets, WHEN),
        ha.windows(SITE, targets, *SPAN),
        ha.rise_transit_set(SITE, targets, *SPAN),
        ha.almanac(SITE, "2026-03-01", 2),
    ]
    for result in results:
        with pytest.raises(AttributeError):
            result.status = None
        again = pickle.loads(pickle.dumps(result))
        # As text, in which a NaN equals a NaN.
        assert again.to_arrow().to_string() == result.to_arrow().to_string()
        assert repr(again) == repr(result)
