"""Grid: NetCDF variables with CF-style units as flat columns."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from vortexwidgets.survey.columns import Heading, understand
from vortexwidgets.survey.samples import FloatArray, SurveyError

LARGEST_GRID = 512_000_000
"""[bytes] Numbers in memory; a small compressed file can unpack to more than a computer holds."""

_NUMERIC = ("length", "velocity", "pressure", "number")


@dataclass(frozen=True)
class Grid:
    """Columns of numbers, all of one length, and the attributes of the file as comments."""

    columns: tuple[tuple[Heading, FloatArray], ...]
    comments: tuple[str, ...]


def is_grid(content: bytes) -> bool:
    """Whether a file begins like NetCDF 3 or 4."""
    return content.startswith((b"CDF\x01", b"CDF\x02", b"CDF\x05", b"\x89HDF\r\n"))


def read_grid(path: Path) -> Grid:
    """Read the variables of a NetCDF file whose names say that they are positions, velocities or uncertainties.

    Parameters
    ----------
    path : Path
        NetCDF 3 or 4, with a `units` attribute on every variable.

    Returns
    -------
    Grid

    Raises
    ------
    SurveyError
        If the file is damaged, too large, or its variables depend on something that is not a position.
    """
    import xarray

    with path.open("rb") as stream:
        engine = "scipy" if stream.read(3) == b"CDF" else "h5netcdf"
    try:
        with xarray.open_dataset(path, engine=engine, decode_times=False) as dataset:
            size = sum(variable.size * variable.dtype.itemsize for variable in dataset.variables.values())
            if size > LARGEST_GRID:
                raise SurveyError(
                    f"{path.name} holds {size / 1e6:.0f} MB of numbers, the limit is {LARGEST_GRID / 1e6:.0f} MB; "
                    "average the survey, or give a part of it."
                )
            loaded = dataset.load()
    except SurveyError:
        raise
    except Exception as error:  # a damaged file raises whatever the library below met first
        raise SurveyError(f"{path.name} cannot be read as NetCDF ({_first_line(error)}); write it again.") from error
    return Grid(_columns(loaded, path.name), _comments(loaded.attrs))


def _columns(dataset: Any, file: str) -> tuple[tuple[Heading, FloatArray], ...]:
    import xarray

    found = {}
    for name, variable in dataset.variables.items():
        heading = _heading(str(name), variable.attrs)
        if heading.kind in _NUMERIC and np.issubdtype(variable.dtype, np.number):
            found[str(name)] = heading
    places = [name for name, heading in found.items() if heading.kind == "length" and heading.role != "uncertainty"]
    spanned = {dimension for name in places for dimension in dataset[name].dims}
    for name in found:
        for dimension in dataset[name].dims:
            if dimension not in spanned and dataset.sizes[dimension] > 1:
                raise SurveyError(
                    f"{file}: '{name}' varies along '{dimension}' ({dataset.sizes[dimension]} values), along which no "
                    "position is given; average over it, or select one, before writing the file."
                )
    if not found:
        raise SurveyError(
            f"{file} has no variable whose name says position or velocity; name them x, y, u, v, or position, velocity."
        )
    arrays = xarray.broadcast(*(dataset[name].squeeze(drop=True) for name in found))
    flat = [np.asarray(array.values, dtype=float).ravel() for array in arrays]
    return tuple(zip(found.values(), flat, strict=True))


def _heading(name: str, attributes: dict[str, Any]) -> Heading:
    unit = attributes.get("units")
    unit = None if unit is None else str(unit)
    for text in (name, attributes.get("standard_name"), attributes.get("long_name")):
        if text is not None:
            heading = understand(str(text), unit)
            if heading.role:
                return heading
    return understand(name, unit)


def _comments(attributes: dict[str, Any]) -> tuple[str, ...]:
    comments = []
    for key, value in attributes.items():
        if isinstance(value, str | int | float | np.number) and not str(key).endswith("_units"):
            unit = attributes.get(f"{key}_units", "")
            comments.append(f"{key}: {value} {unit}".strip().replace("\n", " "))
    return tuple(comments)


def _first_line(error: Exception) -> str:
    return (str(error).strip().splitlines() or [type(error).__name__])[0][:120]
