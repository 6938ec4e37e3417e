"""Between the oracles and `hourarc`: the same site, stars and pole on both sides, results as plain arrays."""

import hourarc
import numpy as np
from oracle import clock
from oracle.place import Observer
from oracle.pole import Pole


def site(observer, **keywords):
    """The observer as our site, without refraction unless asked for."""
    keywords = {"pressure_hpa": 0.0} | keywords
    return hourarc.Site(observer.longitude_deg, observer.latitude_deg, observer.height_m, **keywords)


def catalog(stars):
    """The stars as our catalogue."""
    return hourarc.Catalog(stars.ra_deg, stars.dec_deg, **stars.keywords())


def times(utc_ns):
    """Nanoseconds as `datetime64[ns]`."""
    return clock.datetime(utc_ns)


def nanoseconds(when):
    """`datetime64` as int64 nanoseconds."""
    return np.asarray(when).astype("datetime64[ns]").astype(np.int64)


class TablePole:
    """Our Earth orientation handed to the oracle: that both sides turn the same Earth."""

    def __init__(self, orientation=None):
        self.orientation = orientation or hourarc.earth.Orientation.packaged()

    def at(self, utc_ns):
        """The pole at each instant."""
        utc_ns = np.asarray(utc_ns, dtype=np.int64)
        row = self.orientation.at(times(utc_ns))
        names = ("ut1_minus_utc_s", "xp_arcsec", "yp_arcsec", "dx_mas", "dy_mas")
        return Pole.from_units(*(np.asarray(getattr(row, name)).reshape(utc_ns.shape) for name in names))


def vectors(places):
    """Unit vectors (north, east, up) of the places."""
    altitude, azimuth = np.radians(places.altitude_deg), np.radians(places.azimuth_deg)
    c = np.cos(altitude)
    return np.stack([c * np.cos(azimuth), c * np.sin(azimuth), np.sin(altitude)], axis=-1)


def random_directions(rng, count):
    """Right ascension and declination, degrees, evenly over the sphere."""
    return rng.uniform(0.0, 360.0, count), np.degrees(np.arcsin(rng.uniform(-1.0, 1.0, count)))


def random_observer(rng):
    """A site anywhere on the Earth, from 400 m below the sea to 5000 m above."""
    latitude = np.degrees(np.arcsin(rng.uniform(-1.0, 1.0)))
    return Observer(rng.uniform(-180.0, 180.0), latitude, rng.uniform(-400.0, 5000.0))


def events_of(events, target):
    """One target's events: [(kind, nanoseconds)], kinds as the words rise, transit and set."""
    rows = slice(int(events.offsets[target]), int(events.offsets[target + 1]))
    kinds = [("rise", "transit", "set")[k] for k in events.kind[rows]]
    return list(zip(kinds, nanoseconds(events.time[rows]).tolist(), strict=True))


def kinds_of(events, target=0):
    """One target's events as a list of words."""
    return [kind for kind, _ in events_of(events, target)]


def windows_of(found, target):
    """One target's windows: [(start, stop, start reason, stop reason)], reasons as words."""
    rows = slice(int(found.offsets[target]), int(found.offsets[target + 1]))
    start, stop = nanoseconds(found.start[rows]).tolist(), nanoseconds(found.stop[rows]).tolist()
    opens, closes = reasons(found.start_reason[rows]), reasons(found.stop_reason[rows])
    return list(zip(start, stop, opens, closes, strict=True))


def reasons(codes):
    """Reason codes as words."""
    words = hourarc.REASON_WORDS
    return [words[code] for code in np.asarray(codes).tolist()]


def status_word(result, target=0):
    """The status of one target of a result as a word."""
    return str(result.status_words[target])


def altitude_pairs(site_with_air, *, lowest_deg=-2.0, count=40_000):
    """Topocentric and observed altitudes, degrees, ascending, with the airmass, as our place gives them.

    For a site whose air is to be measured: the same stars with and without its refraction.
    """
    rng = np.random.default_rng(34)
    stars = hourarc.Catalog(*random_directions(rng, count))
    bare = hourarc.Site(
        site_with_air.longitude_deg, site_with_air.latitude_deg, site_with_air.height_m, pressure_hpa=0.0
    )
    when = np.datetime64("2026-03-10T00:00:00")
    topocentric = hourarc.place(bare, stars, when, columns=("altitude_deg",)).altitude_deg
    observed = hourarc.place(site_with_air, stars, when, columns=("altitude_deg", "airmass"))
    keep = np.nonzero(topocentric > lowest_deg)[0]
    keep = keep[np.argsort(topocentric[keep])]
    return topocentric[keep], observed.altitude_deg[keep], observed.airmass[keep]
