"""Sites: what may be given, what is refused and in which words."""

import pickle

import hourarc as ha
import numpy as np
import pytest
from hourarc.errors import InvalidArgument, WrongType


def test_a_site_and_its_pressure():
    site = ha.Site(-70.4, -24.6, 2635.0, name="Saltpan Ridge")
    # US Standard Atmosphere 1976, table I: 743 hPa at 2500 m geometric altitude less 120-odd metres' worth.
    assert 730.0 < site.pressure_hpa < 740.0
    assert ha.Site(0.0, 0.0).pressure_hpa == 1013.25
    assert ha.Site(0.0, 0.0, pressure_hpa=0).pressure_hpa == 0.0
    assert "Saltpan Ridge" in repr(site) and "2635.0 m" in repr(site)
    assert site.lowest_altitude_deg < -1.0
    assert site.horizon_dip_deg == pytest.approx(1.76 * np.sqrt(2635.0) / 60.0, rel=1e-12)


def test_without_air_observed_is_topocentric():
    star, when = ha.Catalog(83.8, -5.4), "2026-03-10T04:00"
    bare = ha.place(ha.Site(-70.4, -24.6, pressure_hpa=0.0), star, when).altitude_deg[0]
    air = ha.place(ha.Site(-70.4, -24.6), star, when).altitude_deg[0]
    # Bennett 1982 at the observed altitude, good to 0.07 arcminute, scaled by nothing at 10 C and sea level.
    bennett_arcmin = 1.0 / np.tan(np.radians(air + 7.31 / (air + 4.4)))
    assert abs((air - bare) * 60.0 - bennett_arcmin) < 0.1


@pytest.mark.parametrize(
    "arguments, keywords, words",
    [
        ((0.0, 90.5), {}, ["latitude of the site: given 90.5 degrees", "-90 to 90"]),
        ((361.0, 0.0), {}, ["longitude of the site: given 361 degrees", "-360 to 360"]),
        ((0.0, 0.0, 10_001.0), {}, ["height of the site: given 10001 m", "-500 to 10000"]),
        ((0.0, 0.0, -501.0), {}, ["height of the site: given -501 m"]),
        ((np.nan, 0.0), {}, ["Site: longitude_deg: given nan", "a finite number"]),
        (([1.0, 2.0], 0.0), {}, ["Site: longitude_deg: given an array of shape (2,)", "one number"]),
        ((0.0, 0.0), {"pressure_hpa": -1.0}, ["pressure", "given -1", "0 to 1200"]),
        ((0.0, 0.0), {"temperature_c": 99.0}, ["temperature", "given 99", "-90 to 60"]),
        ((0.0, 0.0), {"relative_humidity": 30.0}, ["relative humidity", "given 30", "0 to 1"]),
        ((0.0, 0.0), {"wavelength_um": 550.0}, ["wavelength", "given 550", "0.2 to 100"]),
        ((0.0, 0.0), {"skyline": [1.0, 2.0]}, ["Site: skyline: given an array of shape (2,)", "(n, 2)"]),
        ((0.0, 0.0), {"skyline": [[20.0, 5.0], [10.0, 5.0]]}, ["skyline"]),
        ((0.0, 0.0), {"skyline": [[20.0, 95.0]]}, ["skyline"]),
        ((0.0, 0.0), {"skyline": np.empty((0, 2))}, ["skyline"]),
    ],
)
def test_what_is_refused_and_how_it_is_said(arguments, keywords, words):
    with pytest.raises(InvalidArgument) as caught:
        ha.Site(*arguments, **keywords)
    for word in words:
        assert word in str(caught.value)
    assert isinstance(caught.value, ValueError) and isinstance(caught.value, ha.HourarcError)


def test_text_is_no_number():
    with pytest.raises(WrongType, match=r"Site: latitude_deg: given '24S' \(str\)"):
        ha.Site(-70.4, "24S")
    with pytest.raises(WrongType, match="Site: name: given 7"):
        ha.Site(0.0, 0.0, name=7)
    with pytest.raises(WrongType, match="site: given 'here'"):
        ha.place("here", ha.Catalog(0.0, 0.0), "2026-03-10")


def test_a_site_is_a_value():
    skyline = np.array([[0.0, 5.0], [90.0, 10.0], [270.0, 2.0]])
    site = ha.Site(-70.4, -24.6, 2635.0, name="Saltpan Ridge", skyline=skyline)
    skyline[:] = 0.0
    assert site.skyline[1].tolist() == [90.0, 10.0]
    again = pickle.loads(pickle.dumps(site))
    assert again == site and hash(again) == hash(site)
    assert site != ha.Site(-70.4, -24.6, 2635.0, name="Saltpan Ridge")
    assert site != 3
    with pytest.raises(AttributeError, match="a Site does not change"):
        site.height_m = 0.0


def test_earth_location_there_and_back():
    coordinates = pytest.importorskip("astropy.coordinates")
    from astropy import units as u

    location = coordinates.EarthLocation.from_geodetic(-70.4 * u.deg, -24.6 * u.deg, 2635.0 * u.m)
    site = ha.Site.from_earth_location(location, name="Saltpan Ridge", pressure_hpa=0.0)
    assert site.longitude_deg == pytest.approx(-70.4, abs=1e-12)
    assert site.latitude_deg == pytest.approx(-24.6, abs=1e-12)
    assert site.height_m == pytest.approx(2635.0, abs=1e-6)
    assert site.pressure_hpa == 0.0
    back = site.to_earth_location()
    assert abs((back.x - location.x).to_value(u.m)) < 1e-6
    star = ha.Catalog(83.8, -5.4)
    taken = ha.place(location, star, "2026-03-10T04:00")
    plain = ha.place(ha.Site.from_earth_location(location), star, "2026-03-10T04:00")
    assert taken.altitude_deg.tolist() == plain.altitude_deg.tolist()
    several = coordinates.EarthLocation.from_geodetic([1, 2] * u.deg, [3, 4] * u.deg)
    with pytest.raises(InvalidArgument, match="2 locations"):
        ha.Site.from_earth_location(several)
    with pytest.raises(WrongType, match="an astropy EarthLocation"):
        ha.Site.from_earth_location((1, 2))


def test_quantities_are_converted():
    u = pytest.importorskip("astropy.units")
    site = ha.Site(np.radians(10.0) * u.rad, 20.0 * u.deg, 1.5 * u.km, temperature_c=12.0 * u.deg_C)
    assert site.longitude_deg == pytest.approx(10.0, abs=1e-13) and site.height_m == 1500.0
    with pytest.raises(InvalidArgument, match="Site: height_m: given a value in s"):
        ha.Site(0.0, 0.0, 3.0 * u.s)
