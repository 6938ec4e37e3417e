"""Plans: what they may say, and what is said of a wrong one, with its line."""

from __future__ import annotations

import re
from pathlib import Path

import hourarc
import pytest
from hourarc.io.columns import ColumnSpec
from hourarc.io.plan import Plan, read_plan
from hourarc.io.problems import BrokenFile, WrongInput

SITE = "[site]\nname = 'Saltpan Ridge'\nlongitude_deg = 24.5\nlatitude_deg = -20.9\nheight_m = 1148\n"


def plan(folder: Path, text: str) -> Plan:
    path = folder / "plan.toml"
    path.write_text(text, encoding="utf-8")
    return read_plan(path)


def refused(folder: Path, text: str, error: type[Exception] = WrongInput) -> str:
    """The message for a plan that is wrong, be it in its words or in its numbers."""
    with pytest.raises(error) as caught:
        read = plan(folder, text)
        read.site()
        read.limits()
    message = str(caught.value)
    assert "plan.toml" in message
    return message


def test_a_whole_plan(tmp_path: Path) -> None:
    read = plan(
        tmp_path,
        SITE
        + "pressure_hpa = 880\nskyline = [[0, 3.0], [180, 5.0]]\n"
        + "[limits]\naltitude_min_deg = 'off'\nairmass_max = 1.8\nsun_altitude_max_deg = 'nautical'\n"
        + "moon_separation_min_deg = { column = 'moon' }\n"
        + "[columns]\nra = { column = 'RA', unit = 'hourangle' }\ndec = 'DE'\n"
        + "name = 1\nepoch = { value = 1991.25 }\n"
        + "[targets]\nlayout = 'spaces'\nheader = false\nmissing = ['-']\n",
    )
    site, limits = read.site(), read.limits()
    assert (site.name, site.height_m, site.pressure_hpa) == ("Saltpan Ridge", 1148.0, 880.0)
    assert site.skyline.tolist() == [[0.0, 3.0], [180.0, 5.0]]
    assert limits["airmass_max"] == 1.8 and limits["sun_altitude_max_deg"] == -12.0
    assert limits["altitude_min_deg"] is None
    assert read.limit_columns == {"moon_separation_min_deg": "moon"}
    assert read.columns == {
        "ra": ColumnSpec("RA", "hourangle"),
        "dec": ColumnSpec("DE"),
        "name": ColumnSpec(1),
        "epoch": ColumnSpec(value=1991.25),
    }
    assert (read.layout.layout, read.layout.header, read.layout.missing) == ("spaces", False, ("-",))


def test_only_the_site_is_needed(tmp_path: Path) -> None:
    read = plan(tmp_path, "site.longitude_deg = 24.5\nsite.latitude_deg = -20.9\n")
    assert read.site().latitude_deg == -20.9
    assert read.limits() == hourarc.Limits()


def test_limits_that_are_lists(tmp_path: Path) -> None:
    read = plan(
        tmp_path,
        SITE
        + "[limits]\nskyline = false\nazimuth_sectors_deg = [[300, 60.0]]\ncable_range_deg = [-270, 270]\n"
        + "allowed_intervals = [\n    [2026-03-10T23:00:00Z, 2026-03-11T05:30:00+02:00],\n"
        + "    ['2026-03-11T04:00', 2026-03-12],\n]\n",
    )
    limits = read.limits()
    assert limits["azimuth_sectors_deg"] == ((300.0, 60.0),) and limits["skyline"] is False
    assert limits.to_dict()["allowed_intervals"] == [
        ["2026-03-10T23:00:00.000000000", "2026-03-11T03:30:00.000000000"],
        ["2026-03-11T04:00:00.000000000", "2026-03-12T00:00:00.000000000"],
    ]


def test_the_examples_in_the_demo_plan_are_right(tmp_path: Path) -> None:
    from hourarc.demo import write_demo

    path, _, _ = write_demo(tmp_path)
    before, comment, rest = path.read_text().partition("# The skyline above is a limit too")
    examples, heading, after = rest.partition("[columns]")
    said = re.sub(r"^# (?=[a-z_0-9]+ = )", "", examples, flags=re.MULTILINE)
    assert said.count("\n# ") == 0 and heading
    path.write_text(before + comment + said + heading + after)
    read = read_plan(path)
    assert set(read.limit_columns) == {"moon_separation_min_deg", "phase_epoch_jd", "phase_period_d"}
    assert {"hour_angle_min_h", "allowed_intervals", "phase_half_width_d"} <= set(read.limit_keywords)
    for key in read.limit_columns:
        read.limit_keywords[key] = {"phase_epoch_jd": 2455197.5, "phase_period_d": 3.0}.get(key, 30.0)
    read.limits()


def test_a_skyline_of_a_file(tmp_path: Path) -> None:
    ridge = tmp_path / "ridge.csv"
    for text in (
        "# surveyed from the pier\nazimuth,altitude\n0, 3.0\n\n180,5.5 # the mast\n",
        "0 3.0\n180\t5.5\n",
        "az;alt\n0;3.0\n180;5.5",
    ):
        ridge.write_text(text)
        site = plan(tmp_path, SITE + "skyline = 'ridge.csv'\n").site()
        assert site.skyline.tolist() == [[0.0, 3.0], [180.0, 5.5]]
    for text, said in (
        ("0,3\n90,x\n", "ridge.csv, line 2: '90,x'; an azimuth and an altitude in degrees are needed"),
        ("0,3,4\n", "ridge.csv, line 1: '0,3,4'"),
        ("0,3\n90,nan\n", "line 2"),
        ("a,b\nc,d\n", "line 2"),
    ):
        ridge.write_text(text)
        with pytest.raises(WrongInput) as caught:
            plan(tmp_path, SITE + "skyline = 'ridge.csv'\n")
        assert said in str(caught.value)
    ridge.write_text("# nothing\n")
    with pytest.raises(BrokenFile, match="no point of a skyline"):
        plan(tmp_path, SITE + "skyline = 'ridge.csv'\n")
    assert "line 6, [site]: skyline: " in refused(tmp_path, SITE + "skyline = 'nowhere.csv'\n")
    ridge.write_text("180,3\n90,4\n")
    message = refused(tmp_path, SITE + "skyline = 'ridge.csv'\n")
    assert (
        "line 6, [site]: azimuth of skyline point 2: given 90 degrees, allowed azimuths in order" in message
    )


def test_unknown_keys_name_the_nearest_and_the_line(tmp_path: Path) -> None:
    assert refused(tmp_path, SITE + "elevation = 3\n").endswith(
        'plan.toml, line 6, [site]: unknown key "elevation"; known: longitude_deg, latitude_deg, height_m, '
        "name, pressure_hpa, temperature_c, relative_humidity, wavelength_um, sky_extinction_mag, "
        "dark_sky_mag_arcsec2, skyline"
    )
    message = refused(tmp_path, SITE + "\n[limits]\n# a remark\naltitude_min = 30\n")
    assert message.endswith(
        'plan.toml, line 9, [limits]: unknown key "altitude_min"; did you mean "altitude_min_deg"?'
    )
    message = refused(tmp_path, SITE + "[columns]\npm_ra = 'x'\n")
    assert 'line 7, [columns]: unknown key "pm_ra"; did you mean "pmra"?' in message
    message = refused(tmp_path, SITE + "[limit]\nairmass_max = 2\n")
    assert 'line 6: unknown section "limit"; did you mean "limits"?' in message
    message = refused(tmp_path, SITE + "[targets]\nlayuot = 'csv'\n")
    assert 'line 7, [targets]: unknown key "layuot"; did you mean "layout"?' in message
    message = refused(tmp_path, SITE + "[columns]\nra = { colum = 'x' }\n")
    assert 'line 7, [columns]: ra has an unknown key "colum"; did you mean "column"?' in message


@pytest.mark.parametrize(
    ("key", "value", "allowed"),
    [
        ("latitude_deg", "91", "90"),
        ("latitude_deg", "-90.5", "90"),
        ("height_m", "-501", "-500"),
        ("height_m", "10001", "10"),
        ("longitude_deg", "1000", "360"),
        ("relative_humidity", "30", "1"),
    ],
)
def test_a_site_outside_the_earth(tmp_path: Path, key: str, value: str, allowed: str) -> None:
    lines = {"longitude_deg": "24.5", "latitude_deg": "-20.9", "height_m": "1148", key: value}
    message = refused(tmp_path, "[site]\n" + "".join(f"{k} = {v}\n" for k, v in lines.items()))
    line = 2 + list(lines).index(key)
    assert f"plan.toml, line {line}, [site]: " in message and f"given {value}" in message
    assert "allowed" in message and allowed in message.partition("allowed")[2]


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("longitude_deg = 24.5\n", "[site]: latitude_deg is missing"),
        (
            "longitude_deg = '24.5'\nlatitude_deg = 1\n",
            "line 2, [site]: longitude_deg is given '24.5'; a number is needed",
        ),
        ("longitude_deg = true\nlatitude_deg = 1\n", "longitude_deg is given True; a number is needed"),
        (
            "longitude_deg = 1\nlatitude_deg = 1\nname = 5\n",
            "line 4, [site]: name is given 5; a text is needed",
        ),
        (
            "longitude_deg = 1\nlatitude_deg = 1\nskyline = [1, 2]\n",
            "[azimuth, altitude] pairs in degrees is needed",
        ),
        ("longitude_deg = 1\nlatitude_deg = nan\n", "latitude_deg"),
    ],
)
def test_wrong_values_in_the_site(tmp_path: Path, text: str, said: str) -> None:
    assert said in refused(tmp_path, "[site]\n" + text)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        (
            "altitude_min_deg = 95",
            "line 7, [limits]: altitude_min_deg: given 95, allowed -5 to 90 deg",
        ),
        ("airmass_max = 0.5", "airmass_max: given 0.5, allowed 1 to 40"),
        ("airmass_max = '2'", "airmass_max: given '2'"),
        ("sun_altitude_max_deg = 'nautic'", "the nearest is 'nautical'"),
        ("airmass_model = 'none'", "airmass_model"),
        ("moon_separation_min_deg = { col = 'x' }", 'or { column = "..." } to take each target\'s own'),
        ("altitude_min_deg = 50\naltitude_max_deg = 40", "altitude_min_deg=50 above altitude_max_deg=40"),
        ("skyline = 'off'", "line 7, [limits]: skyline: given None, allowed true or false"),
        ("skyline = 3", "line 7, [limits]: skyline: given 3 (int), allowed true or false"),
        (
            "allowed_intervals = { column = 'x' }",
            "line 7, [limits]: allowed_intervals is given {'column': 'x'}; it is one for all targets, "
            'allowed pairs of UTC instants, each a start before its stop, or "off"',
        ),
        (
            "allowed_intervals = [[2026-03-11, 2026-03-10]]",
            "given 2026-03-11T00:00:00.000000000 to 2026-03-10",
        ),
        ("azimuth_sectors_deg = [[10, 400]]", "line 7, [limits]: azimuth_sectors_deg: given [10, 400]"),
        ("phase_period_d = 3", "line 7, [limits]: phase_period_d: given without phase_epoch_jd"),
        (
            "moon_avoidance_dark_deg = 3",
            "without moon_avoidance_bright_deg, allowed moon_avoidance_dark_deg,",
        ),
    ],
)
def test_wrong_values_in_the_limits(tmp_path: Path, text: str, said: str) -> None:
    assert said in refused(tmp_path, SITE + "[limits]\n" + text + "\n")


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("ra = 1.5", "ra is given 1.5; a column's name or number is needed"),
        ("ra = { unit = 'deg' }", 'ra needs either "column" or "value", and not both'),
        ("ra = { column = 'a', value = 3 }", 'ra needs either "column" or "value", and not both'),
        ("ra = { column = 'a', unit = 'furlong' }", 'line 7, [columns]: ra cannot be in "furlong"'),
        ("dec = { column = 'a', unit = 'hourangle' }", "a declination is never in hours"),
        ("epoch = { value = 'now' }", "the value of epoch is given 'now'; a number is needed"),
        ("ra = { column = [1] }", "the column of ra is given [1]"),
    ],
)
def test_wrong_values_in_the_columns(tmp_path: Path, text: str, said: str) -> None:
    assert said in refused(tmp_path, SITE + "[columns]\n" + text + "\n")


def test_wrong_values_in_the_layout(tmp_path: Path) -> None:
    assert "layout is given 'xls'; one of csv, tsv" in refused(tmp_path, SITE + "[targets]\nlayout = 'xls'\n")
    assert "header is given 1; true or false is needed" in refused(tmp_path, SITE + "[targets]\nheader = 1\n")
    assert "missing is given '-'; a list of texts" in refused(tmp_path, SITE + "[targets]\nmissing = '-'\n")


def test_files_that_are_no_plans(tmp_path: Path) -> None:
    assert "there is no [site]" in refused(tmp_path, "")
    message = refused(tmp_path, SITE + "latitude_deg = 3\n")
    assert "not a TOML file" in message and "line 6" in message
    (tmp_path / "plan.toml").write_bytes(b"[site]\nname = '\xff'\n")
    with pytest.raises(BrokenFile, match="byte 15 cannot be read"):
        read_plan(tmp_path / "plan.toml")
    assert "site is given 5; it is a section, written [site]" in refused(tmp_path, "site = 5\n")


def test_lowering_the_sun_limit_is_cautioned(tmp_path: Path) -> None:
    with pytest.warns(hourarc.errors.SunLimitWarning, match="never the interlock"):
        plan(tmp_path, SITE + "[limits]\nsun_separation_min_deg = 10\n").limits()


def test_messages_speak_the_language_of_the_plan(tmp_path: Path) -> None:
    def limits(line: str) -> str:
        return refused(tmp_path, f"{SITE}[limits]\n{line}\n")

    assert limits("altitude_min_deg = 100").endswith(
        'line 7, [limits]: altitude_min_deg: given 100, allowed -5 to 90 deg, or "off"'
    )
    assert limits("window_min_s = [1, 2]").endswith(
        'line 7, [limits]: window_min_s is given [1, 2]; one value, or { column = "..." } '
        "to take each target's own from the table"
    )
    message = limits('sun_altitude_max_deg = "astro"')
    assert "line 7, [limits]: sun_altitude_max_deg: given 'astro', which is unknown" in message
    assert "the nearest is 'astronomical'; allowed -90 to 90 deg, or \"off\"" in message
    assert "line 1: longitude_deg stands in no section; the sections are site, limits" in refused(
        tmp_path, "longitude_deg = 24.5\n" + SITE
    )
