"""Earth rotation, sidereal time and the celestial matrices, against pyerfa over two centuries."""

import erfa
import hourarc
import numpy as np

EPOCHS = 10_000
MICROARCSECONDS = 648_000e6 / np.pi


def test_attitude_1900_to_2100(figures):
    rng = np.random.default_rng(20260310)
    day = np.floor(rng.uniform(15_020.0, 88_069.0, EPOCHS))  # MJD of 1900-01-01 to 2100-01-01
    tt_fraction = rng.uniform(0.0, 1.0, EPOCHS)
    ut_fraction = tt_fraction - rng.uniform(-5.0, 120.0, EPOCHS) / 86_400.0
    ut, tt = (2_400_000.5 + day, ut_fraction), (2_400_000.5 + day, tt_fraction)

    def turn(ours, theirs):
        return np.abs(np.angle(np.exp(1j * (np.asarray(ours) - theirs)))).max()

    def sidereal(apparent):
        return hourarc.earth.sidereal_time(
            day, day, ut1_fraction=ut_fraction, tt_fraction=tt_fraction, apparent=apparent
        )

    errors = {
        "era": turn(hourarc.earth.rotation_angle(day, ut_fraction), erfa.era00(*ut)),
        "gmst": turn(sidereal(False), erfa.gmst06(*ut, *tt)),
        "gast": turn(sidereal(True), erfa.gst06a(*ut, *tt)),
        "cio": np.abs(hourarc.earth.precession_nutation(day, tt_fraction) - erfa.c2i06a(*tt)).max(),
        "equinox": np.abs(hourarc.earth.bias_precession_nutation(day, tt_fraction) - erfa.pnm06a(*tt)).max(),
    }
    print({name: f"{error * MICROARCSECONDS:.2g} µas" for name, error in errors.items()})
    figures.hold("earth_attitude", max(errors.values()) * MICROARCSECONDS, EPOCHS * len(errors))


def test_equinox_route_closes_on_the_cio_route():
    # Laws: R3(GAST)·NPB = R3(ERA)·C to 1e-12 rad. The equation of the origins is the whole difference.
    rng = np.random.default_rng(1)
    day, fraction = np.floor(rng.uniform(15_020, 88_069, 2_000)), rng.uniform(0, 1, 2_000)
    era = hourarc.earth.rotation_angle(day, fraction)
    gast = hourarc.earth.sidereal_time(day, day, ut1_fraction=fraction, tt_fraction=fraction)
    by_cio = rotation_3(era) @ hourarc.earth.precession_nutation(day, fraction)
    by_equinox = rotation_3(gast) @ hourarc.earth.bias_precession_nutation(day, fraction)
    assert np.abs(by_cio - by_equinox).max() < 1e-12


def test_matrices_are_rotations():
    # Laws: orthogonal to 1e-15. The product of two matrices in doubles rounds at 3 units of 2.2e-16 itself,
    # so it is summed in extended precision.
    rng = np.random.default_rng(2)
    day = rng.uniform(15_020, 88_069, 2_000)
    for matrix in (hourarc.earth.precession_nutation(day), hourarc.earth.bias_precession_nutation(day)):
        wide = matrix.astype(np.longdouble)
        product = np.einsum("nij,nkj->nik", wide, wide)
        assert np.abs(product - np.eye(3)).max() < 1e-15
        assert np.linalg.det(matrix).min() > 0.0


def test_a_day_and_its_fraction_may_be_split_anyhow():
    day, fraction = 54_195.0, 0.500754444444444
    whole = hourarc.earth.precession_nutation(day, fraction)
    assert np.abs(hourarc.earth.precession_nutation(day + fraction) - whole).max() < 1e-15
    assert np.abs(hourarc.earth.precession_nutation(day - 3.0, fraction + 3.0) - whole).max() < 1e-15
    angle = hourarc.earth.rotation_angle(day, fraction)
    assert abs(hourarc.earth.rotation_angle(day - 3.0, fraction + 3.0) - angle) < 1e-14


def rotation_3(angle):
    """Frame rotation about the third axis."""
    c, s, zero = np.cos(angle), np.sin(angle), np.zeros_like(angle)
    rows = [np.stack(row, axis=-1) for row in ([c, s, zero], [-s, c, zero], [zero, zero, zero + 1.0])]
    return np.stack(rows, axis=-2)
