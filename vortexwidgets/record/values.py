"""A record's values as what JSON can hold, and back; only named dataclasses are made, and nothing is executed."""

from __future__ import annotations

import dataclasses
import inspect
import math
import sys
import types
import typing
from collections.abc import Mapping
from typing import Any

import numpy as np

_ARRAY_KINDS = ("float64", "int64", "bool")
_SPECIAL = {"nan": math.nan, "inf": math.inf, "-inf": -math.inf}


def encode(value: Any) -> Any:
    """Turn a value into what JSON can hold, so that `decode` gives an equal value back.

    Parameters
    ----------
    value : object
        None, a number, text, a tuple, a list, a mapping, an array, a vortex model, or a frozen dataclass of such
        values. Fields of a dataclass whose name begins with an underscore are left out.

    Returns
    -------
    object
        Made of None, bool, int, float, str, list and dict; equal for equal values, NaN included.

    Raises
    ------
    TypeError
        If the value is of another kind.

    Examples
    --------
    >>> encode((1.5, float("nan")))
    [1.5, {'float': 'nan'}]
    """
    if value is None or isinstance(value, (bool, np.bool_)):
        return None if value is None else bool(value)
    if isinstance(value, str):
        return str(value)
    if isinstance(value, (int, np.integer)):
        return int(value)
    if isinstance(value, (float, np.floating)):
        number = float(value)
        return number if math.isfinite(number) else {"float": _special(number)}
    if isinstance(value, tuple):
        return [encode(item) for item in value]
    if isinstance(value, list):
        return {"list": [encode(item) for item in value]}
    if isinstance(value, np.ndarray):
        return _encode_array(value)
    if isinstance(value, Mapping):
        return {"mapping": [[encode(key), encode(item)] for key, item in value.items()]}
    if type(value).__name__ == "VortexModel":
        return {"model": value.key}
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {
            "class": type(value).__name__,
            "fields": {name: encode(getattr(value, name)) for name in _kept_fields(type(value))},
        }
    raise TypeError(f"A record cannot hold a {type(value).__name__}; it holds numbers, text, arrays and dataclasses.")


def decode(encoded: Any, registry: Mapping[str, type]) -> Any:
    """Turn what `encode` made back into the value; only classes of the registry are made, and nothing is executed.

    Parameters
    ----------
    encoded : object
        As `json.loads` gives it.
    registry : mapping of str to type
        Dataclasses that may be made, by name.

    Returns
    -------
    object

    Raises
    ------
    ValueError
        If the encoding is none of ours, names another class, or has fields that are missing, unknown or wrong.
    """
    return _decode(encoded, registry, "record")


# Inside ---------------------------------------------------------------------------------------------------------------


def _special(number: float) -> str:
    return "nan" if math.isnan(number) else "inf" if number > 0.0 else "-inf"


def _encode_array(array: np.ndarray[Any, Any]) -> dict[str, Any]:
    if array.dtype.name not in _ARRAY_KINDS:
        raise TypeError(f"A record cannot hold an array of {array.dtype.name}; it holds {', '.join(_ARRAY_KINDS)}.")
    values = array.ravel().tolist()
    if array.dtype.name == "float64":
        values = [number if math.isfinite(number) else _special(number) for number in values]
    return {"array": array.dtype.name, "shape": list(array.shape), "values": values}


def _kept_fields(cls: type) -> list[str]:
    return [item.name for item in dataclasses.fields(cls) if item.init and not item.name.startswith("_")]


def _decode(encoded: Any, registry: Mapping[str, type], where: str) -> Any:
    if encoded is None or isinstance(encoded, (bool, int, float, str)):
        return encoded
    if isinstance(encoded, list):
        return tuple(_decode(item, registry, f"{where}[{number}]") for number, item in enumerate(encoded))
    kind = frozenset(encoded)
    if kind == {"float"} and encoded["float"] in _SPECIAL:
        return _SPECIAL[encoded["float"]]
    if kind == {"list"} and isinstance(encoded["list"], list):
        return [_decode(item, registry, f"{where}[{number}]") for number, item in enumerate(encoded["list"])]
    if kind == {"mapping"} and _is_pairs(encoded["mapping"]):
        pairs = [(_decode(key, registry, where), item) for key, item in encoded["mapping"]]
        if all(isinstance(key, (str, int, float)) for key, _ in pairs):
            return {key: _decode(item, registry, f"{where}[{key!r:.40}]") for key, item in pairs}
    if kind == {"array", "shape", "values"}:
        return _decode_array(encoded, where)
    if kind == {"model"} and isinstance(encoded["model"], str):
        return _decode_model(encoded["model"], where)
    if kind == {"class", "fields"} and isinstance(encoded["fields"], dict):
        return _decode_instance(encoded, registry, where)
    raise ValueError(f"The record is damaged at {where}: {_short(encoded)} is nothing that a record holds.")


def _decode_array(encoded: Mapping[str, Any], where: str) -> np.ndarray[Any, Any]:
    name, shape, values = encoded["array"], encoded["shape"], encoded["values"]
    kinds: dict[str, tuple[type, ...]] = {"float64": (int, float), "int64": (int,), "bool": (bool,)}
    if name not in kinds or not isinstance(shape, list) or not isinstance(values, list):
        raise ValueError(f"The record is damaged at {where}: {_short(encoded)} is no array.")
    if not all(type(size) is int and size >= 0 for size in shape) or math.prod(shape) != len(values):
        raise ValueError(f"The record is damaged at {where}: an array of shape {shape} has {len(values)} values.")
    if name == "float64":
        values = [_SPECIAL.get(value, value) if isinstance(value, str) else value for value in values]
    if not all(type(value) in kinds[name] for value in values):
        raise ValueError(f"The record is damaged at {where}: an array of {name} holds something else.")
    return np.array(values, dtype=name).reshape(shape)


def _decode_model(key: str, where: str) -> Any:
    from vortexwidgets.models.catalogue import MODELS

    if key not in MODELS:
        raise ValueError(
            f"The record names the model {key!r:.60} at {where}, which is not in this catalogue: {', '.join(MODELS)}. "
            "Update vortexwidgets, or add the model before the record is loaded."
        )
    return MODELS[key]


def _decode_instance(encoded: Mapping[str, Any], registry: Mapping[str, type], where: str) -> Any:
    name, given = encoded["class"], encoded["fields"]
    cls = registry.get(name) if isinstance(name, str) else None
    if cls is None:
        raise ValueError(f"The record holds a {name!r:.60} at {where}, which is not one of the classes of a record.")
    kept = _kept_fields(cls)
    unknown, missing = [field for field in given if field not in kept], [field for field in kept if field not in given]
    if unknown:
        raise ValueError(f"The record is damaged at {where}: a {name} has no field {unknown[0]!r:.60}.")
    required = {field.name for field in dataclasses.fields(cls) if not _has_default(field)}
    if lacking := [field for field in missing if field in required]:
        raise ValueError(f"The record is damaged at {where}: the field {lacking[0]!r} of {name} is missing.")
    values = {field: _decode(item, registry, f"{where}.{field}") for field, item in given.items()}
    hints = _hints(cls, registry)
    for field, value in values.items():
        if field in hints and not _fits(value, hints[field]):
            raise ValueError(
                f"The record is damaged at {where}.{field}: {_short(value)} cannot be the {field} of a {name}."
            )
    try:
        return cls(**values)
    except (ValueError, TypeError, ArithmeticError, AttributeError, LookupError) as error:
        raise ValueError(f"The record is damaged at {where}: its {name} cannot be made. {error}") from error


def _has_default(field: dataclasses.Field[Any]) -> bool:
    return field.default is not dataclasses.MISSING or field.default_factory is not dataclasses.MISSING


def _hints(cls: type, registry: Mapping[str, type]) -> dict[str, Any]:
    """Types of the fields; where a name is known to type checkers only, the field is left free."""
    known = {**vars(sys.modules[cls.__module__]), **registry}
    hints = {}
    for name in _kept_fields(cls):
        note = next(found[name] for found in map(inspect.get_annotations, cls.__mro__) if name in found)
        holder = type("_Field", (), {"__annotations__": {name: note}})
        try:
            hints[name] = typing.get_type_hints(holder, known, {})[name]
        except NameError:
            continue
    return hints


def _fits(value: Any, hint: Any) -> bool:
    """Whether a value may stand where a type is asked for; what is not understood may."""
    origin, parts = typing.get_origin(hint), typing.get_args(hint)
    if origin in (typing.Union, types.UnionType):
        return any(_fits(value, part) for part in parts)
    if origin is typing.Literal:
        return value in parts
    if hint is None or hint is type(None):
        return value is None
    if hint is float:
        return isinstance(value, (int, float)) and not isinstance(value, bool)
    if hint is int:
        return isinstance(value, int) and not isinstance(value, bool)
    if origin is tuple:
        if not isinstance(value, tuple):
            return False
        if len(parts) == 2 and parts[1] is Ellipsis:
            return all(_fits(item, parts[0]) for item in value)
        return len(value) == len(parts) and all(_fits(item, part) for item, part in zip(value, parts, strict=True))
    if isinstance(origin, type) and issubclass(origin, Mapping):
        return isinstance(value, Mapping) and all(
            _fits(key, parts[0]) and _fits(item, parts[1]) for key, item in value.items()
        )
    if isinstance(origin, type):
        return isinstance(value, origin)
    return isinstance(value, hint) if isinstance(hint, type) else True


def _is_pairs(given: Any) -> bool:
    return isinstance(given, list) and all(isinstance(pair, list) and len(pair) == 2 for pair in given)


def _short(value: Any) -> str:
    text = repr(value)
    return text if len(text) <= 60 else text[:57] + "..."
