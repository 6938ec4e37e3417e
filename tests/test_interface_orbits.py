"""`Orbits`: how they are made, read and advanced, and that every verb takes them like a catalogue."""

import pickle

import hourarc
import numpy as np
import pytest
from bridge import vectors

SITE = hourarc.Site(24.5, -20.9, 1148.0)
WHEN = "2023-09-15T20:00"
# As remembered from the Minor Planet Center's files [M].
CERES = (
    "00001    3.34  0.15 K239D  60.07881   73.42179   80.25496   10.58688  0.0789126  0.21411523   2.7672544"
    "  0 E2023-F87  7283 123 1801-2023 0.65 M-v 30k MPCLINUX   4000      (1) Ceres              20230321"
)
COMET = (
    "    CJ95O010  1997 03 29.6333  0.906507  0.994945  130.6044  282.1468   89.2186  20230225  -1.8  4.0"
    "  C/1995 O1 (Hale-Bopp)                                    MPC106342"
)


def ceres(**changed):
    columns = {
        "epoch_mjd_tt": 60200.0,
        "eccentricity": 0.0789126,
        "inclination_deg": 10.58688,
        "node_deg": 80.25496,
        "perihelion_argument_deg": 73.42179,
        "semi_major_axis_au": 2.7672544,
        "mean_anomaly_deg": 60.07881,
        "h_mag": 3.34,
    }
    return hourarc.Orbits(**columns | changed)


def test_columns_and_lines_give_the_same_orbit():
    read = hourarc.Orbits.from_mpc(CERES + "\n")
    made = ceres(name=["Ceres"])
    assert len(read) == len(made) == 1
    assert list(read.name) == ["1"] and list(made.name) == ["Ceres"] and read.rejected == ()
    a, b = (hourarc.place(SITE, orbits, WHEN, columns=hourarc.PLACE_COLUMNS) for orbits in (read, made))
    for column in hourarc.PLACE_COLUMNS:
        np.testing.assert_allclose(getattr(a, column), getattr(b, column), rtol=1e-9, atol=1e-9)
    assert made.epoch_mjd_tt[0] == 60200.0
    for key, value in (("eccentricity", 0.0789126), ("mean_anomaly_deg", 60.07881), ("h_mag", 3.34)):
        assert getattr(made, key)[0] == pytest.approx(value, abs=1e-12)
    # By perihelion distance and instant: the other pair of keywords.
    other = ceres(
        semi_major_axis_au=None,
        mean_anomaly_deg=None,
        perihelion_au=made.perihelion_au,
        perihelion_mjd_tt=made.perihelion_mjd_tt,
    )
    c = hourarc.place(SITE, other, WHEN)
    assert np.linalg.norm(vectors(a) - vectors(c)) < 1e-11


def test_bad_lines_are_told_with_their_numbers():
    lines = [
        CERES,
        CERES[:80],
        CERES.replace("0.0789126", "1.5789126"),
        "",
        CERES.replace("K239D", "K23!D"),
        COMET,
        COMET.replace(" 0.906507", " 0.000000"),
    ]
    read = hourarc.Orbits.from_mpc("\n".join(lines))
    assert list(read.name) == ["1", "C/1995 O1"]
    assert [line.line for line in read.rejected] == [2, 3, 5, 7]
    for line, word in zip(
        read.rejected, ("ends at column", "eccentricity", "epoch", "perihelion"), strict=True
    ):
        assert word in line.reason and 1 <= line.first_column <= line.last_column, line
    assert "4 lines rejected" in repr(read)


def test_a_file_is_read_by_its_path(tmp_path):
    path = tmp_path / "orbits.txt"
    path.write_text(f"A heading\n{'-' * 160}\n{CERES}\n{COMET}\n")
    for source in (path, str(path)):
        assert list(hourarc.Orbits.from_mpc(source).name) == ["1", "C/1995 O1"]
    with pytest.raises(FileNotFoundError):
        hourarc.Orbits.from_mpc(tmp_path / "none.txt")
    with pytest.raises(hourarc.errors.WrongType):
        hourarc.Orbits.from_mpc(3)


def test_a_wrong_row_touches_no_other():
    wrong = {
        "eccentricity": [0.1, np.nan, -0.1, 0.1, 1.0, 0.1],
        "inclination_deg": [10.0, 10.0, 10.0, 181.0, 10.0, 10.0],
        "semi_major_axis_au": [2.7, 2.7, 2.7, 2.7, 2.7, -2.7],
    }
    orbits = ceres(**wrong)
    words = list(orbits.status_words)
    assert words == ["ok", "not_finite"] + ["elements_out_of_range"] * 4
    assert list(orbits.bad) == [False] + [True] * 5
    places = hourarc.place(SITE, orbits, WHEN)
    assert np.isfinite(places.altitude_deg[0]) and np.isnan(places.altitude_deg[1:]).all()
    assert list(places.status_words) == words
    alone = hourarc.place(SITE, orbits[0], WHEN)
    assert alone.altitude_deg[0] == places.altitude_deg[0]
    span = ("2023-09-15T12:00", "2023-09-16T12:00")
    events = hourarc.rise_transit_set(SITE, orbits, *span)
    assert list(events.counts) == [3, 0, 0, 0, 0, 0]
    windows = hourarc.windows(
        SITE, orbits, *span, hourarc.Limits(altitude_min_deg=0.0, sun_altitude_max_deg=0.0)
    )
    assert windows.counts[0] >= 1 and not windows.counts[1:].any()
    grid = hourarc.visibility_grid(SITE, orbits, "2023-09-15", 3, hourarc.Limits(sun_altitude_max_deg=0.0))
    assert np.isfinite(grid.hours[:, 0]).all() and np.isnan(grid.hours[:, 1:]).all()


@pytest.mark.parametrize(
    ("changed", "words"),
    [
        ({"mean_anomaly_deg": None}, "semi_major_axis_au"),
        ({"perihelion_au": 2.5}, "perihelion_au"),
        ({"semi_major_axis_au": None, "mean_anomaly_deg": None}, "no place in the orbit"),
        ({"node_deg": [1.0, 2.0], "h_mag": [1.0, 2.0, 3.0]}, "different lengths"),
        ({"name": ["a", "b"]}, "2 names"),
        ({"node_deg": [[1.0]]}, "node_deg"),
    ],
)
def test_wrong_calls_are_refused(changed, words):
    with pytest.raises(hourarc.errors.InvalidArgument, match=words):
        ceres(**changed)


def test_orbits_do_not_change_and_can_be_kept():
    orbits = hourarc.Orbits.from_mpc(f"{CERES}\n{COMET}\nno line")
    with pytest.raises(AttributeError):
        orbits.name = None
    with pytest.raises(ValueError):
        orbits.eccentricity[0] = 0.0
    again = pickle.loads(pickle.dumps(orbits))
    a, b = (hourarc.place(SITE, each, WHEN, columns="magnitude_v") for each in (orbits, again))
    np.testing.assert_array_equal(a.magnitude_v, b.magnitude_v)
    assert again.rejected == orbits.rejected and list(again.name) == list(orbits.name)
    assert list(orbits[::-1].name) == ["C/1995 O1", "1"] and len(orbits[[1, 1, 0]]) == 3


def test_far_from_the_epoch_is_told_and_advancing_mends_it():
    orbits = ceres()
    later = "2025-09-15T20:00"
    far = hourarc.place(SITE, orbits, later)
    assert far.status_words[0] == "far_from_epoch"
    assert orbits.drift_au(60933.8)[0] > 1e-4 > 1e-7 > orbits.drift_au(60201.0)[0]
    moved = orbits.advance(60933.0)
    assert moved.epoch_mjd_tt[0] == pytest.approx(60933.0, abs=1e-9)
    near = hourarc.place(SITE, moved, later)
    assert near.status_words[0] == "ok"
    drift_arcsec = np.degrees(np.linalg.norm(vectors(far) - vectors(near))) * 3600
    print(f"{drift_arcsec:.1f}″")
    assert 5.0 < drift_arcsec < 600.0
    # And back again: the integration's own error.
    back = moved.advance(60200.0)
    a, b = hourarc.place(SITE, orbits, WHEN), hourarc.place(SITE, back, WHEN)
    assert np.degrees(np.linalg.norm(vectors(a) - vectors(b))) * 3600 < 1e-4
    gone = orbits.advance(100_000.0)
    assert gone.status_words[0] == "outside_ephemeris" and np.isnan(gone.eccentricity[0])
    # One answer for any number of threads.
    one, two = (orbits[[0] * 70].advance(60300.0, threads=threads) for threads in (1, 2))
    np.testing.assert_array_equal(one.mean_anomaly_deg, two.mean_anomaly_deg)


def test_columns_that_say_how_bodies_look():
    assert np.isnan(
        hourarc.place(SITE, hourarc.Catalog(10.0, 20.0), WHEN, columns="magnitude_v").magnitude_v
    ).all()
    bodies = hourarc.Bodies(["sun", "moon", "venus", "jupiter"])
    both = ["distance_au", "elongation_deg", "magnitude_v", "moon_age_d", "angular_diameter_arcsec"]
    seen = hourarc.place(SITE, bodies, WHEN, columns=both)
    # New Moon 2023-09-15 01:40 UT (almanac [M]); seen 18.3 hours later.
    assert seen.moon_age_d[1] == pytest.approx(18.33 / 24, abs=0.002)
    assert np.isnan(seen.moon_age_d[[0, 2, 3]]).all()
    # Venus had its greatest brilliancy on 2023-09-18, at −4.8 by Mallama and Hilton's formula [M].
    assert seen.magnitude_v[2] == pytest.approx(-4.8, abs=0.05)
    table = seen.to_table()
    assert str(table["distance_au"].unit) == "AU" and str(table["magnitude_v"].unit) == "mag"
    table = hourarc.place(SITE, bodies, WHEN, columns="rate_arcsec_min").to_table()
    assert str(table["rate_arcsec_min"].unit) == "arcsec / min"
    # A bad instant leaves no old numbers in the caller's arrays.
    out = {"magnitude_v": np.zeros((1, 4)), "status": np.zeros((1, 4), dtype=np.uint8)}
    hourarc.place(SITE, bodies, [np.datetime64("NaT")], columns="magnitude_v", out=out)
    assert np.isnan(out["magnitude_v"]).all()


def test_opposition_of_ceres():
    # Ceres was at opposition on 2023-03-21, at V 6.9 [M]: two-body motion from half a year later will do.
    seen = hourarc.place(
        SITE, ceres(), "2023-03-21T00:00", columns=("magnitude_v", "elongation_deg", "phase_angle_deg")
    )
    assert seen.elongation_deg[0] > 160.0 and seen.phase_angle_deg[0] < 8.0
    assert seen.magnitude_v[0] == pytest.approx(6.9, abs=0.2)


def test_mixed_cases_of_every_shape():
    orbits = ceres(mean_anomaly_deg=np.linspace(0.0, 350.0, 40))
    when = np.datetime64("2023-09-15T20:00", "ns") + np.arange(40) * np.timedelta64(601, "s")
    grid = hourarc.place(SITE, orbits, when)
    pairs = hourarc.place(SITE, orbits, when, pairwise=True)
    np.testing.assert_array_equal(np.diag(grid.altitude_deg), pairs.altitude_deg)
    np.testing.assert_array_equal(grid.azimuth_deg[7], hourarc.place(SITE, orbits, when[7]).azimuth_deg)
