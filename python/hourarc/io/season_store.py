"""A season as a Zarr store (format 3): arrays of nights by targets that xarray opens as a dataset.

| array | dimensions | holds |
|---|---|---|
| each quantity of `visibility_grid` | night, target | its numbers; instants as MJD, datetime64 in xarray |
| `night` | night | date of the evening |
| `night_start`, `dark_hours`, `night_status` | night | local mean noon, hours that the sky leaves, note |
| `target` | target | row number among the planned targets, from 0 |
| `row`, `name` | target | row in the source, from 1, and name |

Names, units and meanings follow the CF conventions; the record of origin is in the attributes `hourarc.*`.
"""

from __future__ import annotations

import json
import warnings
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from ..results import COLUMNS, STATUS_WORDS, require
from ..season import GRID_QUANTITIES
from .problems import WrongInput

if TYPE_CHECKING:
    import pyarrow as pa

#: Nights and, as far as they go, targets of a chunk: a few megabytes, so that a reader of one night or of one
#: target's year reads few and small ones. The engine, too, takes this many nights at a time.
CHUNK_NIGHTS, CHUNK_TARGETS = 16, 65_536

_SINCE_MJD = "days since 1858-11-17 00:00:00"


def check_store(path: Path, inputs: list[Path]) -> None:
    """Refuses a store that cannot be written, or would replace what is not one. Ask before the work."""
    require("zarr", "a season's store", "hourarc[zarr]")
    if path.suffix.lower() != ".zarr":
        raise WrongInput(f"{path}: a season is written as a .zarr store; the suffix is {path.suffix!r}")
    if not path.parent.is_dir():
        raise WrongInput(f"{path}: there is no folder {str(path.parent)!r}")
    if path.exists() and not (path / "zarr.json").is_file():
        raise WrongInput(f"{path}: exists and is no Zarr store; it is not replaced")
    for given in inputs:
        if path.exists() and given.resolve().is_relative_to(path.resolve()):
            raise WrongInput(f"{path}: writing it would replace {given}, which is an input")


class SeasonStore:
    """A store that is filled some nights at a time. `folder` is an empty folder."""

    def __init__(
        self,
        folder: Path,
        quantities: tuple[str, ...],
        night: NDArray[np.datetime64],
        targets: int,
        chunk_nights: int = CHUNK_NIGHTS,
    ) -> None:
        import zarr
        from zarr.codecs import ZstdCodec

        # The usual level 3 saves a fifteenth of the space and takes twice the time (hours of random stars).
        self._compressors = ZstdCodec(level=1)
        self._group = zarr.open_group(folder, mode="w", zarr_format=3)
        self._nights, self._targets = len(night), targets
        chunks = (min(chunk_nights, len(night)), max(1, min(CHUNK_TARGETS, targets)))
        self._arrays = {
            name: self._create(name, ("night", "target"), GRID_QUANTITIES[name], chunks, fill_value=np.nan)
            for name in quantities
        }
        for name, values in self._arrays.items():
            if GRID_QUANTITIES[name] == np.float64:
                values.attrs.update({"units": _SINCE_MJD, "calendar": "proleptic_gregorian"})
        dates = self._create("night", ("night",), np.dtype(np.int32))
        dates[:] = night.astype("datetime64[D]").astype(np.int64)
        dates.attrs.update({"units": "days since 1970-01-01", "calendar": "proleptic_gregorian", "axis": "T"})
        start = self._create("night_start", ("night",), np.dtype(np.int64))
        start.attrs.update(
            {
                "units": "nanoseconds since 1970-01-01",
                "calendar": "proleptic_gregorian",
                "long_name": "local mean noon at which the night begins, UTC",
            }
        )
        dark = self._create("dark_hours", ("night",), np.dtype(np.float64))
        dark.attrs.update({"units": "h", "long_name": "hours in which the limits on the sky alone hold"})
        status = self._create("night_status", ("night",), np.dtype(np.uint8))
        status.attrs.update(
            {
                "long_name": "what is to be said of the night",
                "flag_values": list(STATUS_WORDS),
                "flag_meanings": " ".join(STATUS_WORDS.values()),
            }
        )
        self._of_nights = {"night_start": start, "dark_hours": dark, "night_status": status}

    def write_targets(self, row: NDArray[np.int64], name: pa.Array) -> None:
        """The coordinates of the targets: row in the source, and name."""
        for key, values in (("target", np.arange(self._targets, dtype=np.int64)), ("row", row)):
            self._create(key, ("target",), np.dtype(np.int64))[:] = values
        self._group["row"].attrs["long_name"] = "row of the target in its source, from 1"
        texts = self._create("name", ("target",), np.dtypes.StringDType())
        for first in range(0, self._targets, CHUNK_TARGETS):
            part = name[first : first + CHUNK_TARGETS].to_pylist()
            texts[first : first + len(part)] = np.array(part, dtype=np.dtypes.StringDType())

    def write_nights(self, first: int, grid: Any) -> None:
        """The nights of a `Grid`, from the `first`-th of the store on."""
        nights = slice(first, first + len(grid))
        for name, array in self._arrays.items():
            array[nights] = grid[name]
        for name, array in self._of_nights.items():
            values = getattr(grid, name)
            array[nights] = values.view(np.int64) if values.dtype.kind == "M" else values

    def finish(self, record: Mapping[str, Any]) -> None:
        """The record of origin, as attributes, and the metadata of all arrays in one place."""
        import zarr

        texts = {
            f"hourarc.{key}": value if isinstance(value, str) else json.dumps(value, ensure_ascii=False)
            for key, value in record.items()
        }
        self._group.attrs.update({"Conventions": "CF-1.11", "coordinates": "row name", **texts})
        # Not yet in the standard, as a warning says, but what xarray looks for first.
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            zarr.consolidate_metadata(self._group.store)

    def _create(
        self,
        name: str,
        dimensions: tuple[str, ...],
        dtype: Any,
        chunks: tuple[int, ...] | None = None,
        fill_value: Any = None,
    ) -> Any:
        shape = tuple(self._nights if each == "night" else self._targets for each in dimensions)
        array = self._group.create_array(
            name,
            shape=shape,
            dtype=dtype,
            chunks=chunks or tuple(max(1, min(size, CHUNK_TARGETS)) for size in shape),
            dimension_names=dimensions,
            compressors=self._compressors,
            fill_value=fill_value,
        )
        if name in COLUMNS:
            about = COLUMNS[name]
            array.attrs.update({"long_name": about.meaning, "ucd": about.ucd})
            if about.unit:
                array.attrs["units"] = about.unit
        return array
