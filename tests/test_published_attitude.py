"""Published values of Earth rotation, sidereal time and the celestial matrices."""

import erfa
import hourarc
import numpy as np
import pytest

earth = hourarc.earth

# IAU SOFA, "Tools for Earth Attitude", section 5: 2007-04-05 12:00 UTC. TT and UT1 as printed there.
TT = (54195.0, 0.500754444444444)
UT1 = (54195.0, 0.499999165813831)
X, Y = 0.000712264729599, 0.000044385250426  # dX, dY included
S = np.radians(-0.002200475 / 3600)
DX, DY = np.radians(0.1750e-3 / 3600), np.radians(-0.2259e-3 / 3600)
WITHOUT_POLAR_MOTION = np.array(
    [
        [0.973104317573127, 0.230363826247709, -0.000703332818845],
        [-0.230363798804182, 0.973104570735574, 0.000120888549586],
        [X, Y, 0.999999745354420],
    ]
)


def rotation_3(angle):
    c, s = np.cos(angle), np.sin(angle)
    return np.array([[c, s, 0.0], [-s, c, 0.0], [0.0, 0.0, 1.0]])


def test_earth_attitude_example(figures):
    era = earth.rotation_angle(*UT1)
    # ERA is printed to 1e-12 deg: half of that is 1e-14 rad; UT1 to 1e-15 day, 3e-15 rad.
    assert abs(np.degrees(era) - 13.318492966097) < 1e-12
    matrix = earth.precession_nutation(*TT)
    assert abs(matrix[2, 0] + DX - X) < 1e-14
    assert abs(matrix[2, 1] + DY - Y) < 1e-14
    # The first two rows hold s: with the published s and our X, Y the matrix closes (IERS Conventions, 5.10).
    error = np.abs(matrix - erfa.c2ixys(matrix[2, 0], matrix[2, 1], S)).max()
    # With the published offsets added after s: the printed matrix without polar motion.
    full = rotation_3(era) @ erfa.c2ixys(matrix[2, 0] + DX, matrix[2, 1] + DY, S)
    error = max(error, np.abs(full - WITHOUT_POLAR_MOTION).max())
    figures.hold("earth_example", error, 18)


def test_apparent_sidereal_time_of_the_example():
    gast = earth.sidereal_time(UT1[0], TT[0], ut1_fraction=UT1[1], tt_fraction=TT[1])
    assert abs(np.degrees(gast) - 13.412416949356) < 1.5e-12
    era = earth.rotation_angle(*UT1)
    assert abs(np.degrees(era - gast) + 0.093923983260) < 1.5e-12  # equation of the origins


def test_regression_values_of_the_erfa_test_suite():
    # ERFA t_erfa_c: era00, gmst06, gst06a, xys06a; each to the precision held there.
    assert abs(earth.rotation_angle(54388.0) - 0.4022837240028158102) < 1e-12
    assert abs(earth.sidereal_time(53736.0, 53736.0, apparent=False) - 1.754174971870091203) < 1e-12
    assert abs(earth.sidereal_time(53736.0, 53736.0) - 1.754166137675019159) < 1e-12
    matrix = earth.precession_nutation(53736.0)
    assert abs(matrix[2, 0] - 0.5791308482835292617e-3) < 1e-14
    assert abs(matrix[2, 1] - 0.4020580099454020310e-4) < 1e-15


@pytest.mark.parametrize(
    ("mjd", "fraction", "apparent", "printed_s", "iau2006_ms"),
    # Meeus, Astronomical Algorithms, 2nd ed., examples 12.a and 12.b [M]. IAU 2006/2000A lies later by 3.3
    # and 3.8 ms (equinox of 1982 against that of 2006).
    [
        (46895.0, 0.0, False, 13 * 3600 + 10 * 60 + 46.3668, 3.3),
        (46895.0, 0.0, True, 13 * 3600 + 10 * 60 + 46.1351, 3.8),
        (46895.0, 0.80625, False, 8 * 3600 + 34 * 60 + 57.0896, 3.3),
    ],
)
def test_sidereal_times_of_meeus(mjd, fraction, apparent, printed_s, iau2006_ms):
    delta_t = 55.5 / 86_400.0
    ours = earth.sidereal_time(
        mjd, mjd, ut1_fraction=fraction, tt_fraction=fraction + delta_t, apparent=apparent
    )
    seconds = ours / (2 * np.pi) * 86_400.0
    assert abs((seconds - printed_s) * 1e3 - iau2006_ms) < 0.11


def test_nutation_and_obliquity_of_meeus():
    # Meeus 22.a, 1987-04-10 0h TD [M]: Δψ −3.788″, Δε +9.443″, ε0 23°26′27.407″; 2000A: −3.7810″, +9.4454″.
    matrix = earth.bias_precession_nutation(46895.0)
    # The pole of date against that of precession alone: x = Δψ sin ε0, y = Δε, in the mean frame of date.
    mean = erfa.pmat06(2400000.5, 46895.0)
    pole = mean @ matrix[2]
    obliquity = np.radians(23 + 26 / 60 + 27.407 / 3600)
    assert abs(np.degrees(pole[0] / np.sin(obliquity)) * 3600 + 3.7810) < 1e-3
    assert abs(np.degrees(pole[1]) * 3600 - 9.4454) < 1e-3
