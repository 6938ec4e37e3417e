"""`visibility_grid` as callers meet it: arrays of theirs, callbacks, threads, memory, errors, summaries."""

import pickle
import subprocess
import sys
import textwrap
import threading
from pathlib import Path

import hourarc as ha
import numpy as np
import pytest
from hourarc.season_summary import SeasonTally

SITE = ha.Site(24.5, -20.9, 1148.0, name="Saltpan Ridge")
ALL = tuple(ha.GRID_QUANTITIES)
RNG = np.random.default_rng(12)
STARS = ha.Catalog(
    RNG.uniform(0.0, 360.0, 300), np.degrees(np.arcsin(RNG.uniform(-1.0, 1.0, 300))), name=np.arange(300)
)
BAD = ha.Catalog([10.0, 20.0, 30.0], [-40.0, np.nan, 89.0])


def grid(targets=STARS, nights=20, **keywords):
    return ha.visibility_grid(SITE, targets, "2026-07-01", nights, **keywords)


def test_shapes_types_and_what_is_said_of_targets_and_nights():
    made = grid(BAD, 3, quantities=ALL)
    assert made.quantities == ALL and made.shape == (3, 3) and len(made) == 3
    for name in ALL:
        assert made[name].shape == (3, 3) and made[name].flags.c_contiguous
        assert made[name].dtype == (np.float64 if name in ("start", "stop", "transit") else np.float32)
        assert np.isnan(made[name][:, 1]).all()
    assert made.status_words.tolist() == ["ok", "not_finite", "ok"]
    assert made.night.tolist() == [np.datetime64(f"2026-07-0{day}").item() for day in (1, 2, 3)]
    assert (made.night_status_words == "ok").all()
    # Local mean noon before, and the astronomical night of the almanac.
    almanac = ha.almanac(SITE, "2026-07-01", 3)
    assert np.array_equal(made.night_start, almanac.start)
    assert np.allclose(made.dark_hours, almanac.dark_hours, rtol=0, atol=1e-5)
    assert not made.window_count[:, 2].any() and not made.hours[:, 2].any()
    assert np.isnan(made.start[:, 2]).all() and not np.isnan(made.transit[:, 2]).any()


def test_a_grid_does_not_change_and_says_what_it_has():
    made = grid(BAD, 2)
    with pytest.raises(AttributeError, match="hours cannot be set"):
        made.hours = 0
    with pytest.raises(ha.errors.MissingColumn, match="transit was not computed.*Computed: hours"):
        _ = made.transit
    with pytest.raises(ha.errors.UnknownName, match="nearest is 'hours'"):
        made["hour"]
    with pytest.raises(AttributeError, match="no attribute 'height'"):
        _ = made.height
    again = pickle.loads(pickle.dumps(made))
    assert np.array_equal(again.hours, made.hours, equal_nan=True) and again.night[1] == made.night[1]
    assert repr(made) == "<Grid of 2 nights x 3 targets: hours, 2026-07-01 to 2026-07-02>"


def test_out_is_filled_in_place_wherever_it_lives(tmp_path):
    new = grid(quantities=("hours", "start"))
    on_disk = np.memmap(tmp_path / "start", dtype=np.float64, mode="w+", shape=new.shape)
    inside = np.zeros((60, 300), dtype=np.float32)
    made = grid(quantities=("hours", "start"), out={"hours": inside[20:40], "start": on_disk})
    assert made.start is on_disk and np.shares_memory(made.hours, inside)
    assert np.array_equal(inside[20:40], new.hours) and not inside[:20].any() and not inside[40:].any()
    on_disk.flush()
    again = np.fromfile(tmp_path / "start").reshape(new.shape)
    assert np.array_equal(again, new.start, equal_nan=True)
    # One array for one quantity, and a former result.
    alone = np.empty(new.shape, dtype=np.float32)
    assert grid(out=alone).hours is alone and np.array_equal(alone, grid().hours)
    assert grid(out=made, quantities=("hours", "start")).start is on_disk


def read_only(array):
    array.flags.writeable = False
    return array


BUFFER = np.empty((20, 300), dtype=np.float32)
WRONG_OUT = [
    (
        {"hours": np.empty((20, 299), np.float32)},
        ("hours",),
        r"float32 of shape \(20, 299\), allowed .*\(20, 300\)",
    ),
    ({"hours": np.empty((300, 20), np.float32).T}, ("hours",), "not C-contiguous"),
    (
        {"hours": np.empty((20, 300))},
        ("hours",),
        "float64 of shape .*, allowed a writable C-contiguous float32",
    ),
    ({"hours": np.empty((20, 300), ">f4")}, ("hours",), ">f4"),
    ({"start": np.empty((20, 300), np.float32)}, ("start",), "float64"),
    ({"hours": read_only(np.empty((20, 300), np.float32))}, ("hours",), "read-only"),
    ({"hours": np.empty(24_001, np.uint8)[1:].view(np.float32).reshape(20, 300)}, ("hours",), "not aligned"),
    ({"hours": [0.0]}, ("hours",), r"out\['hours'\]: given \[0.0\] \(list\)"),
    ({}, ("hours",), r"out\['hours'\]: given nothing"),
    ({"start": np.empty((20, 300)), "hours": BUFFER}, ("hours",), "start, which is not computed"),
    ({"hour": BUFFER}, ("hours",), "nearest is 'hours'"),
    (
        {"hours": BUFFER, "best_airmass": BUFFER},
        ("hours", "best_airmass"),
        "one memory for hours and best_air",
    ),
    (BUFFER, ("hours", "start"), "one array for 2 quantities"),
    ("hours", ("hours",), "an array, arrays by quantity, or a Grid"),
]


@pytest.mark.parametrize(("out", "quantities", "said"), WRONG_OUT)
def test_arrays_that_do_not_fit_are_refused(out, quantities, said):
    with pytest.raises(ha.HourarcError, match=said):
        grid(out=out, quantities=quantities)


WRONG_CALLS = [
    ({"quantities": ("hours", "seeing")}, "quantities: given 'seeing'"),
    ({"quantities": ()}, "at least one"),
    ({"quantities": ("hours", "hours")}, "each quantity once"),
    ({"nights": 0}, "nights: given 0, allowed a whole number from 1 to 75,000"),
    ({"nights": 75_001}, "given 75001"),
    ({"nights": 2.5}, "nights: given 2.5"),
    ({"nights": True}, "nights: given True"),
    ({"limits": {"altitude_min_deg": 3}}, "allowed a Limits"),
    ({"limits": ha.Limits(altitude_min_deg=[30.0, 40.0])}, "one for each of 300 targets"),
    ({"progress": 3}, "progress: given 3"),
    ({"threads": 0}, "threads: given 0"),
]


@pytest.mark.parametrize(("keywords", "said"), WRONG_CALLS)
def test_wrong_calls_say_what_is_allowed(keywords, said):
    with pytest.raises(ha.HourarcError, match=said):
        grid(**keywords)


def test_nights_outside_utc_and_outside_the_ephemeris():
    for first, said in (("1959-12-30", "from 1960 on"), ("2150-01-01", "within the ephemeris")):
        with pytest.raises(ha.errors.InvalidArgument, match=said):
            ha.visibility_grid(SITE, STARS, first, 3)
    far = ha.visibility_grid(SITE, STARS, "2060-01-01", 1)
    assert far.night_status_words.tolist() == ["orientation_extrapolated"]
    with pytest.raises(ha.errors.OutsideOrientation, match="visibility_grid: nights: given 2060-01-01"):
        strict = ha.Orientation.packaged(policy="strict")
        ha.visibility_grid(SITE, STARS, "2060-01-01", 1, orientation=strict)


def test_limits_may_differ_from_target_to_target():
    lowest = np.linspace(10.0, 60.0, 300)
    lowest[7] = np.nan
    made = grid(limits=ha.Limits(altitude_min_deg=lowest))
    assert made.status_words[7] != "ok" and np.isnan(made.hours[:, 7]).all()
    for row in (0, 8, 150, 299):
        one = ha.Catalog(STARS.ra_deg[row], STARS.dec_deg[row])
        same = grid(one, limits=ha.Limits(altitude_min_deg=lowest[row]))
        assert np.array_equal(same.hours[:, 0], made.hours[:, row])


def test_progress_hears_of_the_nights_and_can_end_the_work():
    heard = []
    grid(nights=100, progress=lambda done, nights: heard.append((done, nights)))
    assert [nights for _, nights in heard] == [100] * len(heard)
    done = [done for done, _ in heard]
    assert len(done) > 3 and done == sorted(set(done)) and done[-1] == 100

    def refuse(done, nights):
        heard.append(done)
        raise RuntimeError("enough")

    heard.clear()
    with pytest.raises(RuntimeError, match="enough"):
        grid(nights=40_000, targets=BAD, progress=refuse)
    assert len(heard) == 1


def test_two_threads_of_python_at_once():
    """Both compute while the other does, and a third thread of Python goes on meanwhile."""
    alone = [
        grid(nights=200, quantities=ALL),
        grid(nights=200, quantities=ALL, limits=ha.Limits(airmass_max=1.5)),
    ]
    together = [None, None]
    limits = [None, ha.Limits(airmass_max=1.5)]

    def call(index):
        together[index] = grid(nights=200, quantities=ALL, limits=limits[index])

    threads = [threading.Thread(target=call, args=(index,)) for index in range(2)]
    for thread in threads:
        thread.start()
    turns = 0
    while any(thread.is_alive() for thread in threads):
        turns += 1
    for thread in threads:
        thread.join()
    assert turns > 100
    for one, other in zip(alone, together, strict=True):
        for name in ALL:
            assert one[name].tobytes() == other[name].tobytes()


def test_one_memory_is_not_filled_by_two_calls_at_once():
    out = np.empty((400, 300), dtype=np.float32)
    failed = []

    def again(done, nights):
        if not failed:
            with pytest.raises(
                ha.errors.InvalidArgument, match="hours: given an array that cannot be filled"
            ):
                grid(nights=400, out=out)
            failed.append(True)

    grid(nights=400, out=out, progress=again)
    assert failed and np.array_equal(out, grid(nights=400).hours)


@pytest.mark.skipif(not Path("/proc/self/status").exists(), reason="asks Linux for the peak")
def test_memory_is_the_result_and_64_megabytes():
    code = """
        import numpy as np
        import hourarc as ha
        n, nights = 200_000, 150
        site, stars = ha.Site(24.5, -20.9), ha.Catalog(np.linspace(0, 360, n), np.linspace(-90, 90, n))
        limits = ha.Limits(moon_separation_min_deg=30.0)
        ha.visibility_grid(site, ha.Catalog([1.0], [2.0]), "2026-07-01", 1, limits)
        def memory(kind):
            (line,) = (line for line in open("/proc/self/status") if line.startswith(kind))
            return 1024 * int(line.split()[1])
        before = memory("VmRSS:")
        made = ha.visibility_grid(site, stars, "2026-07-01", nights, limits)
        print((memory("VmHWM:") - before - made.hours.nbytes) / 1e6)
    """
    done = subprocess.run(
        [sys.executable, "-c", textwrap.dedent(code)], capture_output=True, text=True, timeout=120
    )
    assert done.returncode == 0, done.stderr
    beyond = float(done.stdout)
    print(f"beyond the result: {beyond:.1f} MB")
    assert beyond < 64.0


def hours_of(rows):
    """A grid of given hours, shape (nights, targets)."""
    hours = np.array(rows, dtype=np.float32)
    nights, targets = hours.shape
    days = np.datetime64("2026-07-01") + np.arange(nights)
    return ha.Grid(
        {"hours": hours},
        night=days,
        night_start=days.astype("datetime64[ns]"),
        night_status=np.zeros(nights, np.uint8),
        dark_hours=np.full(nights, 9.0),
        status=np.where(np.isnan(hours[0]), 16, 0).astype(np.uint8),
        name=np.array([f"T{i}" for i in range(targets)]),
    )


# Nights by targets: never; always; the second and the last but one; split by the span; a bad row; once.
BY_HAND = hours_of(
    [
        [0.0, 1.0, 0.0, 3.0, np.nan, 0.0],
        [0.0, 1.0, 2.0, 0.0, np.nan, 0.0],
        [0.0, 1.0, 0.0, 0.0, np.nan, 0.25],
        [0.0, 1.0, 4.0, 0.0, np.nan, 0.0],
        [0.0, 1.0, 0.0, 5.0, np.nan, 0.0],
    ]
)


def test_the_summary_by_hand():
    made = BY_HAND.summary()
    dates = [None if np.isnat(d) else int(str(d)[-2:]) for d in made.first_night]
    assert dates == [None, 1, 2, 1, None, 3]
    dates = [None if np.isnat(d) else int(str(d)[-2:]) for d in made.last_night]
    assert dates == [None, 5, 4, 5, None, 3]
    assert made.useful_nights.tolist() == [0, 5, 2, 2, 0, 1]
    assert made.longest_gap.tolist() == [0, 0, 1, 3, 0, 0]
    assert np.array_equal(made.hours, [0.0, 5.0, 6.0, 8.0, np.nan, 0.25], equal_nan=True)
    assert made.never.tolist() == [0]
    assert made.night_hours.tolist() == [4.0, 3.0, 1.25, 5.0, 6.0] == BY_HAND.night_hours.tolist()
    assert made.useful_targets.tolist() == [2, 2, 2, 2, 2]
    assert BY_HAND.summary(useful_hours=1.0).useful_nights.tolist() == [0, 0, 2, 2, 0, 0]
    assert repr(made) == "<Season of 5 nights: 4 of 6 targets observable>"
    for wrong in (-1.0, 24.0, np.nan):
        with pytest.raises(ha.errors.InvalidArgument, match="useful_hours"):
            BY_HAND.summary(useful_hours=wrong)


def test_hours_left_by_hand():
    left = BY_HAND.hours_left("2026-07-04")
    assert np.array_equal(left, [0.0, 2.0, 4.0, 5.0, np.nan, 0.0], equal_nan=True)
    assert np.array_equal(BY_HAND.hours_left("2020-01-01"), BY_HAND.summary().hours, equal_nan=True)
    assert BY_HAND.hours_left("2026-07-06")[1] == 0.0


def test_nights_left_by_hand():
    whole = BY_HAND.summary()
    assert BY_HAND.nights_left("2020-01-01").tolist() == whole.useful_nights.tolist()
    late = BY_HAND.hours[np.searchsorted(BY_HAND.night, np.datetime64("2026-07-04")) :]
    assert BY_HAND.nights_left("2026-07-04").tolist() == np.sum(late > 0.0, axis=0).tolist()
    assert BY_HAND.nights_left("2020-01-01", useful_hours=1.0).tolist() == [0, 0, 2, 2, 0, 0]
    assert not BY_HAND.nights_left("2030-01-01").any()


def test_a_tally_in_pieces_is_the_summary_of_the_whole():
    made = grid(nights=40)
    tally = SeasonTally(300)
    for first in (0, 7, 8, 30):
        last = {0: 7, 7: 8, 8: 30, 30: 40}[first]
        tally.add(made.night[first:last], made.hours[first:last])
    whole, pieces = made.summary(), tally.summary(made.status, made.name)
    for table in ("to_arrow", "nights_to_arrow"):
        one, other = getattr(whole, table)().to_pydict(), getattr(pieces, table)().to_pydict()
        for key in one:
            assert one[key] == pytest.approx(other[key]) if "hours" in key else one[key] == other[key]


def test_tables():
    table = grid(BAD, 2, quantities=("hours", "start", "window_count")).to_arrow()
    assert table.column_names == ["night", "target", "hours", "start", "window_count"]
    assert table["target"].to_pylist() == [0, 1, 2, 0, 1, 2]
    assert str(table.schema.field("start").type) == "timestamp[ns, tz=UTC]"
    assert table["start"].null_count == 4 and table.schema.field("hours").metadata[b"unit"] == b"h"
    table = BY_HAND.summary().to_arrow()
    assert table["name"].to_pylist() == [f"T{i}" for i in range(6)]
    assert table["first_night"].null_count == 2 and table["status"].to_pylist()[4] != "ok"
    assert BY_HAND.summary().nights_to_arrow()["useful_targets"].to_pylist() == [2] * 5


def test_astropy_tables():
    pytest.importorskip("astropy")
    table = grid(BAD, 2, quantities=("hours", "start", "moon_separation_min")).to_table()
    assert table["hours"].unit == "h" and table["moon_separation_min"].unit == "deg"
    assert table["start"].scale == "utc"
    assert len(BY_HAND.summary().to_table()) == 6
