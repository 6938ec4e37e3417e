"""Topocentric directions of the Sun, the Moon and the planets, against DE440."""

import hourarc
import numpy as np
import pytest
from bridge import TablePole, random_observer, site, vectors
from oracle import clock
from oracle.place import Orientation, Sky, separation

SITES, INSTANTS = 20, 100
BODIES = ["sun", "moon", "mercury", "venus", "mars", "jupiter", "saturn", "uranus", "neptune"]
MILLIARCSECONDS = 648_000e3 / np.pi


@pytest.fixture(scope="module")
def errors():
    """{body: errors in milliarcseconds} at random sites and instants 1960–2099."""
    rng = np.random.default_rng(440)
    first, last = clock.nanoseconds(["1960-01-02", "2099-12-01"])
    pole, out = TablePole(), {body: [] for body in BODIES}
    for _ in range(SITES):
        observer, utc = random_observer(rng), np.sort(rng.integers(first, last, INSTANTS))
        ours = vectors(hourarc.place(site(observer), hourarc.Bodies(BODIES), clock.datetime(utc)))
        sky = Sky(observer, utc, pole, orientation=Orientation(utc, pole))
        for column, body in enumerate(BODIES):
            out[body].append(separation(ours[:, column], sky.body(body).vector) * MILLIARCSECONDS)
    out = {body: np.concatenate(parts) for body, parts in out.items()}
    print({body: f"{error.max():.3f} mas" for body, error in out.items()})
    return out


def test_sun_and_moon(figures, errors):
    both = np.concatenate([errors["sun"], errors["moon"]])
    figures.hold("bodies_sun_moon", both.max(), len(both))


def test_planets(figures, errors):
    planets = np.concatenate([errors[body] for body in BODIES[2:]])
    figures.hold("bodies_planets", planets.max(), len(planets))


def test_separations_from_sun_and_moon():
    # Topocentric, between centres: what the limits of a telescope ask about.
    rng = np.random.default_rng(5)
    observer = random_observer(rng)
    utc = rng.integers(*clock.nanoseconds(["2020-01-01", "2026-01-01"]), 200)
    from bridge import catalog, random_directions
    from oracle.place import Stars

    stars = Stars(*random_directions(rng, 50))
    columns = ("sun_separation_deg", "moon_separation_deg")
    ours = hourarc.place(site(observer), catalog(stars), clock.datetime(utc), columns=columns)
    sky = Sky(observer, utc, TablePole())
    local = sky.stars(stars)
    for body in ("sun", "moon"):
        theirs = np.degrees(separation(local.vector, sky.body(body).vector[:, np.newaxis, :]))
        error = np.abs(getattr(ours, f"{body}_separation_deg") - theirs).max() * 3600e3
        assert error < 1.0, f"{body}: {error} mas"
