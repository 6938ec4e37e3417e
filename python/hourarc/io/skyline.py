"""Reading a skyline: two columns of numbers, azimuth (from north through east) and altitude, in degrees.

Comma, semicolon, tab or blanks between them; lines that begin with # are comments, and one line of names may
stand above the numbers. That the azimuths are in order and in range is checked by `hourarc.Site`.
"""

from __future__ import annotations

import math
import re
from pathlib import Path

import numpy as np

from .problems import BrokenFile, WrongInput


def read_skyline(path: Path, where: str) -> np.ndarray:
    """The skyline of a text file, shape (n, 2), degrees. `where`: the beginning of a message."""
    try:
        text = path.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError as error:
        raise BrokenFile(f"{path}: not a text file in UTF-8, byte {error.start} cannot be read") from error
    except OSError as error:
        raise WrongInput(f"{where}: skyline: {path}: {error.strerror}") from error
    points: list[list[float]] = []
    named = False
    for number, line in enumerate(text.splitlines(), start=1):
        bare = line.partition("#")[0].strip()
        if not bare:
            continue
        cells = re.split(r"\s*[,;\t]\s*|\s+", bare)
        try:
            point = [float(cell) for cell in cells]
        except ValueError:
            point = []
        if not points and not point and not named:
            named = True  # the names of the columns
            continue
        if len(point) != 2 or not all(map(math.isfinite, point)):
            raise WrongInput(
                f"{path}, line {number}: {bare!r}; an azimuth and an altitude in degrees are needed"
            )
        points.append(point)
    if not points:
        raise BrokenFile(f"{path}: there is no point of a skyline in it")
    return np.array(points)
