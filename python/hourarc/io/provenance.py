"""Where a result came from: enough to compute it again, and to see why two results differ.

Nothing in the record changes from one run to the next with the same inputs: there is no date of writing
in it.
"""

from __future__ import annotations

import shlex
from typing import Any

import numpy as np

from ..limits import LIMITS, SUN_CAUTION
from .lists import Lists
from .plan import Plan
from .targets import Targets


def provenance(
    *,
    plan: Plan,
    site: Any,
    command: str = "",
    limits: Any = None,
    targets: Targets | Lists | None = None,
    done: str = "planned",
    **about: Any,
) -> dict[str, Any]:
    """The record, by topic; texts, or nested values that go to a file as JSON.

    `done`: the word for what became of the rows that were not rejected.
    """
    import hourarc

    record: dict[str, Any] = {"software": f"hourarc {hourarc.__version__}"}
    if command:
        record["command"] = command
    record.update(about)
    record["plan"] = {"file": plan.path.name, "sha256": plan.sha256}
    if targets is not None:
        records = [
            _list_record(each, done) for each in (targets if isinstance(targets, Lists) else [targets])
        ]
        record["targets"] = records[0] if len(records) == 1 else records
    record["site"] = site_record(site)
    if limits is not None:
        record["limits"] = limits_record(plan, limits)
        if sun_limit_lowered(limits):
            record["caution"] = f"The Sun separation limit was lowered below its default. {SUN_CAUTION}"
    record["earth_orientation"] = hourarc.Orientation.packaged().provenance.to_dict()
    record["models"] = models_record()
    return record


def _list_record(targets: Targets, done: str) -> dict[str, Any]:
    origin: dict[str, Any] = {"bodies": list(targets.bodies)}
    if targets.ephemeris is not None:
        origin["ephemeris"] = str(targets.ephemeris)
    if targets.path is not None:
        origin = {"file": targets.path.name, "sha256": targets.sha256}
    return origin | {
        "rows_read": targets.rows_read,
        done: len(targets),
        "rejected": len(targets.rejected),
    }


def site_record(site: Any) -> dict[str, Any]:
    """The site as it was computed with: the defaults filled in, the pressure in force."""
    keys = (
        "name",
        "longitude_deg",
        "latitude_deg",
        "height_m",
        "pressure_hpa",
        "temperature_c",
        "relative_humidity",
        "wavelength_um",
        "sky_extinction_mag",
        "dark_sky_mag_arcsec2",
    )
    record: dict[str, Any] = {key: getattr(site, key) for key in keys}
    if site.skyline is not None:
        record["skyline"] = np.asarray(site.skyline).tolist()
    return record


def limits_record(plan: Plan, limits: Any) -> dict[str, Any]:
    """The limits as they were computed with: the defaults filled in, columns named and not copied."""
    columns = {key: {"column": column} for key, column in plan.limit_columns.items()}
    return {key: columns.get(key, value) for key, value in limits.to_dict().items()}


def sun_limit_lowered(limits: Any) -> bool:
    """Whether a target may stand nearer to the Sun than by default."""
    key = "sun_separation_min_deg"
    return limits[key] is None or bool(np.min(limits[key], initial=180.0) < LIMITS[key].default)


def command_line(*words: object) -> str:
    """The command as it can be typed again."""
    return shlex.join(["hourarc", *map(str, words)])


def models_record() -> dict[str, str]:
    """The models of the computation, each by the name its paper or standard gives it."""
    return {
        "precession_nutation": "IAU 2006 precession, IAU 2000A nutation with the 2006 adjustments, CIO based",
        "ephemeris": "built-in compact ephemeris, fitted to JPL DE440",
        "refraction": "ray trace after Auer & Standish (2000), atmosphere of Hohenkerk & Sinclair (1985)",
        "altitude_limits": "targets: observed altitude; Sun and Moon: topocentric altitude of the centre",
    }
