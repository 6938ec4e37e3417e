"""Slots and gaps, against counting one by one."""

import hourarc as ha
import numpy as np
import pytest
from hourarc.errors import InvalidArgument, WrongType

SITE = ha.Site(-70.4, -24.6, 2635.0)
rng = np.random.default_rng(2)
STARS = ha.Catalog(rng.uniform(0, 360, 60), rng.uniform(-80, 30, 60), name=[f"S{i}" for i in range(60)])
NAT = np.datetime64("NaT")


@pytest.fixture(scope="module")
def found():
    return ha.windows(SITE, STARS, "2026-03-10T16:41:36", "2026-03-12T16:41:36", ha.Limits(airmass_max=1.5))


def test_every_start_that_fits(found):
    made = ha.slots(found, 600.0, 1500.0, origin="2026-03-10T00:01")
    step, duration = np.timedelta64(600, "s"), np.timedelta64(1500, "s")
    raster = np.datetime64("2026-03-10T00:01", "ns") + np.arange(0, 600) * step
    total = 0
    for target in range(60):
        expected = []
        for window in found.of(target):
            expected += [t for t in raster if window.start <= t and t + duration <= window.stop]
        rows = made.rows(target)
        assert made.start[rows].tolist() == np.array(expected, dtype="datetime64[ns]").tolist()
        total += len(expected)
    assert total == len(made.start) == made.offsets[-1] > 300
    # Each is in the window that it names, and one number is one instant.
    assert (found.start[made.window] <= made.start).all() and (made.start < found.stop[made.window]).all()
    assert (found.target[made.window] == made.target).all()
    assert len(set(zip(made.slot.tolist(), made.start.tolist(), strict=True))) == len(set(made.slot.tolist()))
    assert made.slot.min() == 0 and (made.step_s, made.duration_s) == (600.0, 1500.0)


def test_tables_of_slots(found):
    pytest.importorskip("pyarrow")
    made = ha.slots(found, 600.0, 1500.0)
    assert made.to_arrow().column_names == ["target", "name", "start", "window"]
    assert repr(made).startswith("<Slots: ") and "of 60 targets" in repr(made)
    none = ha.slots(found, 600.0, 86_400.0)
    assert len(none.start) == 0 and len(none.slot) == 0 and none.offsets.tolist() == [0] * 61
    left = ha.after_gap(found, NAT, 0.0)
    assert left.to_arrow().column_names == ["target", "name", "start", "stop", "by_gap"]


def test_the_next_windows_at_least_a_gap_after_the_last_visit(found):
    gap = np.timedelta64(20, "h")
    visits = np.full(60, NAT, dtype="datetime64[ns]")
    visits[:40] = np.datetime64("2026-03-10T18:00") + rng.integers(600, 1200, 40) * np.timedelta64(1, "m")
    made = ha.after_gap(found, visits, 20 * 3600.0)
    cut = 0
    for target in range(60):
        earliest = visits[target] + gap
        expected = []
        for window in found.of(target):
            if np.isnat(earliest) or window.start >= earliest:
                expected.append((window.start, window.stop, False))
            elif window.stop > earliest:
                expected.append((earliest, window.stop, True))
        rows = made.rows(target)
        mine = list(zip(made.start[rows], made.stop[rows], made.by_gap[rows].tolist(), strict=True))
        assert mine == expected
        cut += sum(gap for _, _, gap in expected)
    assert cut >= 3
    # One visit for all is one for each.
    one = ha.after_gap(found, "2026-03-11T02:00", 60.0)
    each = ha.after_gap(found, np.full(60, np.datetime64("2026-03-11T02:00")), 60.0)
    assert one.start.tolist() == each.start.tolist() and one.offsets.tolist() == each.offsets.tolist()


def test_wrong_calls(found):
    for step, duration, said in (
        (0.0, 1.0, "slots: step_s: given 0 s, allowed above 0"),
        (1.0, -1.0, "slots: duration_s: given -1 s"),
        (1.0, np.nan, "slots: duration_s: given nan"),
        (1e10, 1.0, "slots: step_s: given 1e\\+10 s, allowed above 0, to 3e9 s"),
        (1e-9, 1e-9, "step: given .* slots, allowed at most"),
    ):
        with pytest.raises(InvalidArgument, match=said):
            ha.slots(found, step, duration)
    with pytest.raises(WrongType, match="slots: windows"):
        ha.slots([1, 2], 1.0, 1.0)
    with pytest.raises(InvalidArgument, match="slots: origin: given NaT"):
        ha.slots(found, 1.0, 1.0, origin="NaT")
    with pytest.raises(InvalidArgument, match=r"last_visit: given an array of shape \(3,\), .* each of 60"):
        ha.after_gap(found, [NAT, NAT, NAT], 1.0)
    with pytest.raises(InvalidArgument, match="gap_s: given -1 s, allowed 0 to 3e9 s"):
        ha.after_gap(found, NAT, -1.0)
    with pytest.raises(WrongType, match="after_gap: windows"):
        ha.after_gap(3, NAT, 1.0)
