"""An Appraisal's values as one HTML page for people and one JSON file for machines, and back."""

from __future__ import annotations

import json
import os
from collections.abc import Mapping
from importlib.metadata import version
from pathlib import Path
from typing import Any

from vortexwidgets.record.values import decode, encode

FORMAT = "vortexwidgets record"
FORMAT_VERSION = 1

__all__ = ["decode", "encode", "from_json", "load_json", "page", "save_html", "save_json", "to_json", "write_whole"]


# JSON -----------------------------------------------------------------------------------------------------------------


def to_json(value: Any) -> str:
    """Write a value as JSON text.

    Parameters
    ----------
    value : object
        As for `encode`.

    Returns
    -------
    str
        Floats have the digits that give the same number back.
    """
    document = {
        "format": FORMAT,
        "format_version": FORMAT_VERSION,
        "written_by": f"vortexwidgets {version('vortexwidgets')}",
        "content": encode(value),
    }
    return json.dumps(document, ensure_ascii=False, allow_nan=False) + "\n"


def from_json(text: str, registry: Mapping[str, type]) -> Any:
    """Read a value from the JSON text that `to_json` wrote.

    Parameters
    ----------
    text : str
    registry : mapping of str to type
        Dataclasses that may be made, by name.

    Returns
    -------
    object

    Raises
    ------
    ValueError
        If the text is no JSON, no record, of a newer format, or not complete; the message says which and what to do.
    """
    try:
        return _read(text, registry)
    except RecursionError as error:
        raise ValueError("The record is nested deeper than any record is; give one that this package wrote.") from error


def _read(text: str, registry: Mapping[str, type]) -> Any:
    try:
        document = json.loads(text, parse_constant=_refuse_constant, object_pairs_hook=_unique)
    except json.JSONDecodeError as error:
        raise ValueError(
            f"The record is not JSON: {error.msg} in line {error.lineno}, column {error.colno}. Give a file that "
            "appraisal.save('record.json') wrote."
        ) from error
    if not isinstance(document, dict) or document.get("format") != FORMAT:
        raise ValueError(
            "The JSON is not a record of this package: its 'format' is not 'vortexwidgets record'. Give a file that "
            "appraisal.save('record.json') wrote."
        )
    written = document.get("format_version")
    if type(written) is not int or written < 1:
        raise ValueError(f"The record has the format version {written!r:.40}, which is not a number of a version.")
    if written > FORMAT_VERSION:
        raise ValueError(
            f"The record has format version {written} ({document.get('written_by', 'writer unknown')!s:.60}); this "
            f"package reads up to version {FORMAT_VERSION}. Update vortexwidgets."
        )
    if "content" not in document:
        raise ValueError("The record has no content; it was cut short. Save it again.")
    return decode(document["content"], registry)


def save_json(value: Any, path: str | Path) -> None:
    """Write a value as a JSON file, whole or not at all.

    Parameters
    ----------
    value : object
        As for `encode`.
    path : str or Path
    """
    write_whole(path, to_json(value))


def load_json(path: str | Path, registry: Mapping[str, type]) -> Any:
    """Read a value from a JSON file.

    Parameters
    ----------
    path : str or Path
    registry : mapping of str to type
        Dataclasses that may be made, by name.

    Returns
    -------
    object

    Raises
    ------
    ValueError
        If the file is no record; as for `from_json`, with the name of the file.
    OSError
        If it cannot be read.
    """
    source = Path(path)
    try:
        text = source.read_bytes().decode("utf-8-sig")
    except OSError as error:
        why = (error.strerror or str(error)).lower()
        raise type(error)(
            f"{source} cannot be read ({why}); give the path of a record that appraisal.save('record.json') wrote."
        ) from error
    except UnicodeDecodeError as error:
        raise ValueError(f"{source.name} is not text (byte {error.start}); give a JSON record.") from error
    try:
        return from_json(text, registry)
    except ValueError as error:
        raise ValueError(f"{source.name}: {error}") from error


# HTML -----------------------------------------------------------------------------------------------------------------


def page(appraisal: Any) -> str:
    """Return an appraisal as one HTML page that needs nothing else: figures, formulas and font are inside.

    Parameters
    ----------
    appraisal : Appraisal

    Returns
    -------
    str
        Text that came from files is escaped; there is no script in it.
    """
    from vortexwidgets.record.page import render

    return render(appraisal)


def save_html(appraisal: Any, path: str | Path) -> None:
    """Write an appraisal as an HTML page, whole or not at all.

    Parameters
    ----------
    appraisal : Appraisal
    path : str or Path
    """
    write_whole(path, page(appraisal))


def write_whole(path: str | Path, text: str) -> None:
    """Write a text file under a temporary name and move it into place, so that no reader sees half of it.

    Parameters
    ----------
    path : str or Path
        A file of that name is replaced.
    text : str
    """
    target = Path(path)
    waiting = target.with_name(f".{target.name}.{os.getpid()}.partial")
    try:
        with waiting.open("w", encoding="utf-8", newline="\n") as stream:
            stream.write(text)
            stream.flush()
            os.fsync(stream.fileno())
        waiting.replace(target)
    finally:
        waiting.unlink(missing_ok=True)


# Inside ---------------------------------------------------------------------------------------------------------------


def _refuse_constant(name: str) -> Any:
    raise ValueError(f"The record holds a bare {name}, which JSON does not have; it was not written by this package.")


def _unique(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) != len(pairs):
        raise ValueError("The record names one field twice; it was not written by this package.")
    return found
