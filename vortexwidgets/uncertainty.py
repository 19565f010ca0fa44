"""Estimate: value, standard uncertainty, coverage interval, budget; propagate (GUM, JCGM 101)."""

from __future__ import annotations

import inspect
import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any, Literal

import numpy as np
import numpy.typing as npt

from vortexwidgets.formatting import format_estimate
from vortexwidgets.quantities import check, quantity_named

FloatArray = npt.NDArray[np.float64]
Correlation = npt.ArrayLike | Mapping[tuple[str, str], float]

PROBITS: tuple[float, ...] = tuple(round(-4.0 + 0.05 * step, 2) for step in range(161))
"""Standard normal deviates at which the quantiles of an Estimate are kept."""

PROBABILITIES: tuple[float, ...] = tuple(0.5 * math.erfc(-deviate / math.sqrt(2.0)) for deviate in PROBITS)
"""Probabilities of those deviates: dense in the middle, and out to 3 in 100 000 on either side."""

_SEED = 20_240_607  # fixed: the same inputs give the same answer
_BUDGET_DRAWS = 20_000  # a contribution needs two digits, not four


@dataclass(frozen=True)
class Contribution:
    """What one input contributes to the standard uncertainty of a result, in the unit of the result.

    Raises
    ------
    ValueError
        If the uncertainty is negative.
    """

    name: str
    uncertainty: float

    def __post_init__(self) -> None:
        object.__setattr__(self, "uncertainty", float(self.uncertainty))
        if self.uncertainty < 0.0:
            raise ValueError(
                f"The contribution of {self.name} must not be negative, got {self.uncertainty:g}; "
                "give its absolute value."
            )


@dataclass(frozen=True, eq=False)
class Estimate:
    """A value with what is known of its uncertainty.

    Parameters
    ----------
    value : float
        Best estimate; the limit itself where `bound` is set; NaN = undetermined. [SI]
    uncertainty : float
        Standard uncertainty (k = 1), NaN = not known. [SI]
    quantity : str
        Key of the quantity, which gives unit and symbol; empty for a plain number.
    budget : tuple of Contribution
        Which input contributes how much. The squares add up to that of the uncertainty unless inputs are correlated.
    quantiles : tuple of float, optional
        Quantiles at `PROBABILITIES`; None = normal (or Student's t, see `degrees_of_freedom`). [SI]
    bound : "lower", "upper" or None
        "lower": the true value is at or above `value`, and nothing more is known.
    degrees_of_freedom : float
        Of the uncertainty; finite makes a normal estimate Student's t.

    Raises
    ------
    ValueError
        If the uncertainty is negative, the quantity unknown, the quantiles are not ascending or not as many as
        `PROBABILITIES`, or the degrees of freedom are not positive.

    Notes
    -----
    Estimates are equal when all that they say is equal, two undetermined ones included.

    Examples
    --------
    >>> print(Estimate(0.83, 0.012, "circulation"))
    0.830 ± 0.012 m²/s
    """

    value: float
    uncertainty: float = 0.0
    quantity: str = ""
    budget: tuple[Contribution, ...] = ()
    quantiles: tuple[float, ...] | None = None
    bound: Literal["lower", "upper"] | None = None
    degrees_of_freedom: float = math.inf

    def __post_init__(self) -> None:
        for name in ("value", "uncertainty", "degrees_of_freedom"):
            object.__setattr__(self, name, float(getattr(self, name)))
        object.__setattr__(self, "budget", tuple(self.budget))
        if self.quantity:
            quantity_named(self.quantity)
        name = self.quantity or "the estimate"
        if self.uncertainty < 0.0:
            got = f"{self.uncertainty:g} {self.unit}".rstrip()
            raise ValueError(
                f"The standard uncertainty of {name} must not be negative, got {got}; give its absolute value."
            )
        if self.bound not in (None, "lower", "upper"):
            raise ValueError(f"bound must be 'lower', 'upper' or None, got {self.bound!r}.")
        if not self.degrees_of_freedom > 0.0:
            raise ValueError(f"Degrees of freedom must be positive, got {self.degrees_of_freedom:g}.")
        if self.quantiles is not None:
            table = np.asarray(self.quantiles, dtype=float)
            if table.shape != (len(PROBABILITIES),):
                raise ValueError(
                    f"quantiles must hold {len(PROBABILITIES)} values, one for each of PROBABILITIES, got {table.size}."
                )
            if not np.all(np.diff(table) >= 0.0):  # NaN fails too
                raise ValueError(f"The quantiles of {name} must be finite and ascending; sort them.")
            object.__setattr__(self, "quantiles", tuple(table.tolist()))

    def _key(self) -> tuple[object, ...]:
        numbers = (self.value, self.uncertainty, self.degrees_of_freedom)
        parts = tuple((part.name, _known(part.uncertainty)) for part in self.budget)
        return (*map(_known, numbers), self.quantity, parts, self.quantiles, self.bound)

    def __eq__(self, other: object) -> bool:
        return self._key() == other._key() if isinstance(other, Estimate) else NotImplemented

    def __hash__(self) -> int:
        return hash(self._key())

    def __str__(self) -> str:
        return format_estimate(self)

    def __format__(self, unit: str) -> str:
        """Write the estimate, in a unit when one is given: f"{drop:kPa}"."""
        return format_estimate(self, unit or None)

    @property
    def unit(self) -> str:
        """SI unit of the value, empty for a plain number."""
        return quantity_named(self.quantity).unit if self.quantity else ""

    @property
    def is_determined(self) -> bool:
        """Whether value and uncertainty are both known, and not just a limit."""
        return self.bound is None and math.isfinite(self.value) and math.isfinite(self.uncertainty)

    def scaled(self, factor: float, quantity: str | None = None) -> Estimate:
        """The estimate times an exact positive factor, as the same quantity or another.

        Parameters
        ----------
        factor : float
        quantity : str, optional
            Key of the result.

        Returns
        -------
        Estimate
            With its budget, distribution and bound.
        """
        return replace(
            self,
            value=self.value * factor,
            uncertainty=self.uncertainty * factor,
            quantity=self.quantity if quantity is None else quantity,
            budget=tuple(Contribution(part.name, part.uncertainty * factor) for part in self.budget),
            quantiles=None if self.quantiles is None else tuple(value * factor for value in self.quantiles),
        )

    def interval(
        self, level: float = 0.95, kind: Literal["symmetric", "shortest"] = "symmetric"
    ) -> tuple[float, float]:
        """Coverage interval.

        Parameters
        ----------
        level : float
            Coverage probability between 0 and 1.
        kind : "symmetric" or "shortest"
            Equal probability on either side, or the shortest interval of that probability (JCGM 101, 5.3.4).

        Returns
        -------
        tuple of float
            Lower and upper end. [SI] A lower bound gives (value, inf), an upper one (-inf, value), whatever the level;
            an estimate that is not determined gives (-inf, inf).

        Raises
        ------
        ValueError
            If the level is not between 0 and 1, or the kind is not known.

        Examples
        --------
        GUM table G.2: a coverage factor of 2.57 for 95 % at 5 degrees of freedom.

        >>> low, high = Estimate(0.0, 1.0, degrees_of_freedom=5).interval(0.95)
        >>> round(high, 2)
        2.57
        """
        if not 0.0 < level < 1.0:
            raise ValueError(f"The level of an interval lies between 0 and 1, got {level:g}; 95 % is 0.95.")
        if kind not in ("symmetric", "shortest"):
            raise ValueError(f"kind must be 'symmetric' or 'shortest', got {kind!r}.")
        if self.bound is not None or not self._has_spread():
            low = self.value if self.bound == "lower" and not math.isnan(self.value) else -math.inf
            high = self.value if self.bound == "upper" and not math.isnan(self.value) else math.inf
            return low, high
        tail = 0.5 - 0.5 * level
        if kind == "shortest" and self.quantiles is not None:
            tail = self._shortest_tail(level)
        return float(self.quantile(tail)), float(self.quantile(tail + level))

    def _has_spread(self) -> bool:
        return self.quantiles is not None or (math.isfinite(self.value) and math.isfinite(self.uncertainty))

    def _shortest_tail(self, level: float) -> float:
        tails = np.linspace(0.0, 1.0 - level, 4001)
        width = self.quantile(np.minimum(tails + level, 1.0)) - self.quantile(tails)
        return float(tails[int(np.argmin(width))])

    def quantile(self, probability: npt.ArrayLike) -> FloatArray:
        """Value below which the truth lies with a probability.

        Parameters
        ----------
        probability : array_like, shape (...)
            Between 0 and 1.

        Returns
        -------
        ndarray, shape of `probability`
            [SI] Where quantiles are kept, those beyond the outermost stand at the outermost.

        Raises
        ------
        ValueError
            If the estimate is a limit or is not determined, or a probability lies outside 0 to 1.
        """
        self._require_spread("has no quantiles")
        wanted = np.asarray(probability, dtype=float)
        if not np.all((wanted >= 0.0) & (wanted <= 1.0)):
            raise ValueError(
                f"A probability lies between 0 and 1, got {wanted[~((wanted >= 0) & (wanted <= 1))].flat[0]:g}."
            )
        if self.quantiles is not None:
            return np.interp(_probit(wanted), PROBITS, self.quantiles)
        if self.uncertainty == 0.0:
            return np.full(wanted.shape, self.value)
        if math.isinf(self.degrees_of_freedom):
            return np.asarray(self.value + self.uncertainty * _probit(wanted))
        from scipy.special import stdtrit

        return np.asarray(self.value + self.uncertainty * stdtrit(self.degrees_of_freedom, wanted))

    def probability_below(self, threshold: float) -> float:
        """Probability that the true value lies below a threshold.

        Parameters
        ----------
        threshold : float
            [SI]

        Returns
        -------
        float
            NaN where the estimate does not say: it is not determined, or it is a lower bound and the threshold lies
            above it (or an upper bound and the threshold lies below it). A bound is taken as it stands: a threshold on
            its safe side gives 0 or 1.
        """
        if math.isnan(threshold) or (self.bound is None and not self._has_spread()) or math.isnan(self.value):
            return math.nan
        if self.bound == "lower":
            return 0.0 if threshold <= self.value else math.nan
        if self.bound == "upper":
            return 1.0 if threshold > self.value else math.nan
        if self.quantiles is not None:
            return self._probability_from_quantiles(threshold)
        if self.uncertainty == 0.0:
            return 1.0 if self.value < threshold else 0.0
        deviate = (threshold - self.value) / self.uncertainty
        if math.isinf(self.degrees_of_freedom):
            return _normal_below(deviate)
        from scipy.special import stdtr

        return float(stdtr(self.degrees_of_freedom, deviate))

    def _probability_from_quantiles(self, threshold: float) -> float:
        table = np.asarray(self.quantiles)
        if threshold <= table[0]:
            return 0.0
        if threshold > table[-1]:
            return 1.0
        right = int(np.searchsorted(table, threshold, side="left"))
        share = (threshold - table[right - 1]) / (table[right] - table[right - 1])
        return _normal_below(PROBITS[right - 1] + share * (PROBITS[right] - PROBITS[right - 1]))

    def draw(self, count: int, generator: np.random.Generator) -> FloatArray:
        """Draw values at random.

        Parameters
        ----------
        count : int
        generator : numpy.random.Generator

        Returns
        -------
        ndarray, shape (count,)
            [SI]

        Raises
        ------
        ValueError
            If the estimate is a limit or is not determined.
        """
        self._require_spread("cannot be drawn from")
        return self._at(generator.standard_normal(count), self._stretch(count, generator))

    def _stretch(self, count: int, generator: np.random.Generator) -> FloatArray | float:
        """Factor that turns normal deviates into Student's t."""
        if math.isinf(self.degrees_of_freedom) or self.quantiles is not None:
            return 1.0
        return np.sqrt(self.degrees_of_freedom / generator.chisquare(self.degrees_of_freedom, count))

    def _at(self, deviates: FloatArray, stretch: FloatArray | float) -> FloatArray:
        if self.quantiles is not None:
            return np.interp(deviates, PROBITS, self.quantiles)
        return self.value + self.uncertainty * stretch * deviates

    def _require_spread(self, what: str) -> None:
        if self.bound is not None or not self._has_spread():
            why = f"only a {self.bound} bound" if self.bound else "not determined"
            raise ValueError(
                f"{self.quantity or 'The estimate'} is {why} ({self}), so it {what}; use its interval, or determine it."
            )


Given = float | tuple[float, float] | Estimate
"""What a person may give: a number, (value, standard uncertainty), or an Estimate."""


def as_estimate(given: Given, quantity: str, *, name: str = "") -> Estimate:
    """Turn what a person gave into an Estimate of a quantity, checked.

    Parameters
    ----------
    given : float, (float, float) or Estimate
        Number, number with its standard uncertainty, or an Estimate of the same unit. [SI]
    quantity : str
        Key of the quantity; empty for a plain number of any size.
    name : str
        What a refusal calls it; the quantity by default.

    Returns
    -------
    Estimate

    Raises
    ------
    ValueError
        If the value is outside the quantity's range, the uncertainty is negative or not finite, the pair is no pair,
        or the Estimate is of another unit.
    """
    name = name or quantity or "the value"
    if isinstance(given, Estimate):
        own = given.quantity
        if own and quantity and quantity_named(own).unit != quantity_named(quantity).unit:
            raise ValueError(
                f"{quantity} is in {quantity_named(quantity).unit or 'plain numbers'}, got {own} in "
                f"{given.unit or 'plain numbers'} ({given}); give an estimate of {quantity}."
            )
        estimate = replace(given, quantity=quantity) if quantity and own != quantity else given
    elif isinstance(given, tuple | list):
        if len(given) != 2:
            raise ValueError(f"{name} takes a number or (value, standard uncertainty), got {len(given)} numbers.")
        value, uncertainty = (
            _number(part, label + name) for part, label in zip(given, ("", "the uncertainty of "), strict=True)
        )
        if not math.isfinite(uncertainty) or uncertainty < 0.0:
            got = f"{uncertainty:g} {quantity_named(quantity).unit if quantity else ''}".rstrip()
            raise ValueError(
                f"The standard uncertainty of {name} must be finite and not negative, got {got}; "
                "give 0 when the value is taken as exact."
            )
        estimate = Estimate(value, uncertainty, quantity)
    else:
        estimate = Estimate(_number(given, name), 0.0, quantity)
    if quantity:
        check(quantity, estimate.value)
    return estimate


def _number(given: Any, name: str) -> float:
    if isinstance(given, str | bytes | bool) or not hasattr(given, "__float__") or getattr(given, "ndim", 0) != 0:
        raise ValueError(f"{name} must be a number or (value, standard uncertainty), got {given!r:.60}.")
    return float(given)


def from_draws(draws: npt.ArrayLike, quantity: str, budget: Sequence[Contribution] = ()) -> Estimate:
    """Summarise random draws of a quantity: mean, standard deviation and quantiles (JCGM 101, 7.6 and 7.7).

    Parameters
    ----------
    draws : array_like, shape (M,)
        [SI]
    quantity : str
        Key of the quantity; empty for a plain number.
    budget : sequence of Contribution
        Carried as it is.

    Returns
    -------
    Estimate

    Raises
    ------
    ValueError
        If there are fewer than two draws or one of them is not finite.
    """
    values = np.asarray(draws, dtype=float).ravel()
    _require_finite(values, quantity)
    mean, deviation = float(values.mean()), float(values.std(ddof=1))
    if deviation == 0.0 or float(np.ptp(values)) == 0.0:
        return Estimate(mean, 0.0, quantity, tuple(budget))
    table = np.quantile(values, PROBABILITIES)
    return Estimate(mean, deviation, quantity, tuple(budget), quantiles=tuple(table.tolist()))


def _require_finite(values: FloatArray, quantity: str) -> None:
    name = quantity or "the result"
    if values.size < 2:
        raise ValueError(f"{name} was drawn {values.size} times; at least two draws are needed, better 10 000.")
    bad = int(np.count_nonzero(~np.isfinite(values)))
    if bad:
        raise ValueError(
            f"{name} is not finite in {bad} of {values.size} draws; an input reaches where the formula does not hold, "
            "so reduce its uncertainty or mend the formula there."
        )


def propagate(
    function: Callable[..., Any],
    estimates: Mapping[str, Given] | Sequence[Given],
    *,
    method: Literal["linear", "monte carlo"] = "linear",
    correlation: Correlation | None = None,
    quantity: str = "",
    draws: int = 200_000,
    seed: int = _SEED,
) -> Estimate:
    """Carry uncertainties through a formula.

    Parameters
    ----------
    function : callable
        Takes the values by name (a mapping was given) or in order. For the Monte Carlo method it is called once with
        arrays, so it is written with NumPy.
    estimates : mapping or sequence
        Inputs: numbers, (value, standard uncertainty), Estimates. [SI]
    method : "linear" or "monte carlo"
        First-order propagation through derivatives (GUM, 5.1 and 5.2), or random draws of the inputs' whole
        distributions (JCGM 101). Near a minimum, as for the square of a quantity near zero, only the latter holds.
    correlation : array_like, shape (N, N), or mapping of (name, name) to float, optional
        Correlation coefficients of the inputs; independent by default.
    quantity : str
        Key of the result's quantity; empty for a plain number.
    draws : int
        Monte Carlo draws.
    seed : int
        Of the random numbers.

    Returns
    -------
    Estimate
        With a budget by input; an input's own budget is kept as "input: part". Monte Carlo contributions are the
        standard deviations with one input drawn and the others held (JCGM 101, annex B), and quantiles are kept.

    Raises
    ------
    ValueError
        If an input is a limit or is not determined, the correlation is not one, the method is not known or the result
        is not finite.
    TypeError
        If the function cannot take arrays and the method is Monte Carlo.

    Notes
    -----
    Effective degrees of freedom are Welch-Satterthwaite's (GUM, G.4.1). That formula needs independent inputs; for
    correlated ones the smallest of theirs is taken.

    References
    ----------
    .. [1] JCGM 100:2008, Guide to the expression of uncertainty in measurement (GUM).
    .. [2] JCGM 101:2008, Propagation of distributions using a Monte Carlo method.

    Examples
    --------
    Dynamic pressure, worked by hand: u/q = √(0.01² + (2·0.02)²) = 4.12 %.

    >>> q = propagate(lambda density, speed: density * speed**2 / 2, {"density": (1000.0, 10.0), "speed": (2.0, 0.04)},
    ...               quantity="pressure")
    >>> print(q)
    2.00 ± 0.08 kPa
    """
    named = isinstance(estimates, Mapping)
    given = list(estimates.values()) if isinstance(estimates, Mapping) else list(estimates)
    names = [str(key) for key in estimates] if named else _argument_names(function, len(given))
    inputs = [as_estimate(item, "") for item in given]
    for name, item in zip(names, inputs, strict=True):
        if item.bound is not None or not item._has_spread():
            raise ValueError(f"{name} is {item}: a limit cannot be propagated; give a value with its uncertainty.")
    if method not in ("linear", "monte carlo"):
        raise ValueError(f"method must be 'linear' or 'monte carlo', got {method!r}.")
    matrix = None if correlation is None else _correlation_matrix(correlation, names)

    def call(values: Sequence[Any]) -> Any:
        return function(**dict(zip(names, values, strict=True))) if named else function(*values)

    if method == "linear":
        return _linear(call, names, inputs, matrix, quantity)
    return _monte_carlo(call, names, inputs, matrix, quantity, draws, seed)


def _linear(
    call: Callable[[Sequence[Any]], Any],
    names: Sequence[str],
    inputs: Sequence[Estimate],
    matrix: FloatArray | None,
    quantity: str,
) -> Estimate:
    values = [item.value for item in inputs]
    result = _finite(call(values), quantity)
    signed = np.zeros(len(inputs))
    for which, item in enumerate(inputs):
        if item.uncertainty == 0.0:
            continue
        # Small beside the uncertainty, large beside rounding; the five-point rule's own error is of order step**4.
        step = max(1e-2 * item.uncertainty, 1e-5 * abs(item.value))
        around = []
        for multiple in (-2.0, -1.0, 1.0, 2.0):
            moved = list(values)
            moved[which] = item.value + multiple * step
            around.append(_finite(call(moved), quantity))
        slope = (around[0] - 8.0 * around[1] + 8.0 * around[2] - around[3]) / (12.0 * step)
        signed[which] = slope * item.uncertainty
    variance = float(signed @ signed) if matrix is None else float(signed @ matrix @ signed)
    uncertainty = math.sqrt(max(variance, 0.0))
    freedom = [item.degrees_of_freedom for item in inputs]
    return Estimate(
        result,
        uncertainty,
        quantity,
        _budget(names, inputs, np.abs(signed)),
        degrees_of_freedom=_effective_freedom(signed, freedom, uncertainty, independent=matrix is None),
    )


def _monte_carlo(
    call: Callable[[Sequence[Any]], Any],
    names: Sequence[str],
    inputs: Sequence[Estimate],
    matrix: FloatArray | None,
    quantity: str,
    draws: int,
    seed: int,
) -> Estimate:
    generator = np.random.default_rng(seed)
    deviates = generator.standard_normal((len(inputs), draws))
    if matrix is not None:
        value, vector = np.linalg.eigh(matrix)
        deviates = (vector * np.sqrt(np.maximum(value, 0.0))) @ deviates
    stretches: dict[float, FloatArray | float] = {}
    columns = []
    for item, own in zip(inputs, deviates, strict=True):
        # Correlated inputs were measured together, so equal degrees of freedom are the same ones (multivariate t).
        freedom = item.degrees_of_freedom
        stretch = stretches.get(freedom) if matrix is not None else None
        if stretch is None:
            stretch = stretches[freedom] = item._stretch(draws, generator)
        columns.append(item._at(own, stretch))
    results = _column(call, columns, draws)
    _require_finite(results, quantity)
    fewer = min(draws, _BUDGET_DRAWS)
    shares = np.zeros(len(inputs))
    for which, item in enumerate(inputs):
        if item.uncertainty == 0.0 and item.quantiles is None:
            continue
        alone: list[Any] = [np.full(fewer, other.value) for other in inputs]
        alone[which] = columns[which][:fewer]
        moved = _column(call, alone, fewer)
        _require_finite(moved, quantity)
        shares[which] = float(np.std(moved, ddof=1))
    return from_draws(results, quantity, _budget(names, inputs, shares))


def _column(call: Callable[[Sequence[Any]], Any], columns: Sequence[Any], count: int) -> FloatArray:
    advice = "write it with NumPy so that it takes arrays, or wrap it in numpy.vectorize"
    try:
        with np.errstate(all="ignore"):  # what is not finite is counted and answered in words
            result = np.asarray(call(columns), dtype=float)
    except TypeError as error:
        raise TypeError(
            f"The function was called with arrays of {count} draws and failed ({error}); {advice}."
        ) from error
    if result.ndim == 0:
        return np.full(count, float(result))
    if result.shape != (count,):
        raise ValueError(f"The function returned shape {result.shape} for {count} draws; {advice}.")
    return result


def _budget(names: Sequence[str], inputs: Sequence[Estimate], shares: FloatArray) -> tuple[Contribution, ...]:
    """One entry per input; an input that knows its own parts keeps them where they add up."""
    entries = []
    labels = [name.replace("_", " ") for name in names]
    for name, item, share in zip(labels, inputs, shares.tolist(), strict=True):
        total = math.sqrt(sum(part.uncertainty**2 for part in item.budget))
        if len(item.budget) > 1 and item.uncertainty > 0.0 and math.isclose(total, item.uncertainty, rel_tol=1e-6):
            entries += [Contribution(f"{name}: {part.name}", share * part.uncertainty / total) for part in item.budget]
        elif share > 0.0 or item.uncertainty > 0.0:
            entries.append(Contribution(name, share))
    return tuple(entries)


def _effective_freedom(signed: FloatArray, freedom: Sequence[float], uncertainty: float, *, independent: bool) -> float:
    finite = [
        (part, own) for part, own in zip(signed.tolist(), freedom, strict=True) if math.isfinite(own) and part != 0.0
    ]
    if not finite or uncertainty == 0.0:
        return math.inf
    if not independent:
        return min(own for _, own in finite)
    return float(uncertainty**4 / sum(part**4 / own for part, own in finite))


def _finite(result: Any, quantity: str) -> float:
    number = float(result)
    if not math.isfinite(number):
        raise ValueError(
            f"{quantity or 'The result'} is {number} at or near the given values; the formula does not hold there."
        )
    return number


def _correlation_matrix(given: Correlation, names: Sequence[str]) -> FloatArray:
    size = len(names)
    if isinstance(given, Mapping):
        matrix = np.eye(size)
        for pair, coefficient in given.items():
            for name in pair:
                if name not in names:
                    raise ValueError(
                        f"The correlation names '{name}', which is no input; inputs are {', '.join(names)}."
                    )
            i, j = (names.index(name) for name in pair)
            matrix[i, j] = matrix[j, i] = coefficient
    else:
        matrix = np.asarray(given, dtype=float)
    if matrix.shape != (size, size):
        raise ValueError(f"The correlation has shape {matrix.shape}, expected {(size, size)}: one row per input.")
    if not np.allclose(matrix, matrix.T, atol=1e-12) or not np.allclose(matrix.diagonal(), 1.0, atol=1e-12):
        raise ValueError(
            "A correlation matrix is symmetric with 1 on its diagonal; give coefficients, not covariances."
        )
    if float(np.linalg.eigvalsh(matrix)[0]) < -1e-9:
        raise ValueError(
            f"The correlation is impossible: its smallest eigenvalue is {float(np.linalg.eigvalsh(matrix)[0]):.3g}, "
            "below 0; check the coefficients."
        )
    return matrix


def _argument_names(function: Callable[..., Any], count: int) -> list[str]:
    numbered = [f"input {number + 1}" for number in range(count)]
    try:
        parameters = inspect.signature(function).parameters.values()
    except (TypeError, ValueError):  # NumPy's own functions have no signature
        return numbered
    names = [item.name for item in parameters if item.kind in (item.POSITIONAL_ONLY, item.POSITIONAL_OR_KEYWORD)]
    return [*names, *numbered[len(names) :]][:count]


def _normal_below(deviate: float) -> float:
    return 0.5 * math.erfc(-deviate / math.sqrt(2.0))


def _probit(probability: FloatArray) -> FloatArray:
    from statistics import NormalDist  # late: half of the time that importing this module may take

    inverse = NormalDist().inv_cdf
    flat = [-math.inf if p <= 0.0 else math.inf if p >= 1.0 else inverse(p) for p in np.ravel(probability).tolist()]
    return np.reshape(np.array(flat), np.shape(probability))


def _known(number: float) -> float | None:
    return None if math.isnan(number) else number
