"""Fit: values, covariance, limits, status as a sentence."""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from enum import StrEnum
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
import numpy.typing as npt

from vortexwidgets.fitting.kept import Kept
from vortexwidgets.fitting.limits import Profile, log_slope, null_chi_square, of_nonlinear, of_strength, of_swirl_scale
from vortexwidgets.fitting.problem import CENTRE_X, CENTRE_Y, CORE_RADIUS, SHAPE, Background, Problem
from vortexwidgets.fitting.separable import SHAPE_BOUNDS, Solution
from vortexwidgets.formatting import format_number
from vortexwidgets.uncertainty import PROBITS, Estimate

if TYPE_CHECKING:
    from vortexwidgets.models.model import VortexModel
    from vortexwidgets.models.vortex import Vortex

FloatArray = npt.NDArray[np.float64]
Uncertainties = Literal["absolute", "relative"]
Loss = Literal["linear", "huber", "soft_l1"]

# A core radius beyond these multiples of the nearest and the farthest sample is no longer seen by the survey.
_TOO_SMALL, _TOO_LARGE = 1e-3, 1e3
_PROBITS = np.array(PROBITS)
_SUSPECT = 0.1  # relative standard uncertainty from which one-sidedness is looked for
_FASTEST = 1e7  # m/s: a swirl scale that no flow has; samples of the far tail alone lead there
_NO_VORTEX = 1e-3  # chance at which the drop of chi-square by a vortex would be noise


class FitError(RuntimeError):
    """A fit that has no answer; its message is the status of the fit, which is in `.fit`."""

    def __init__(self, message: str, fit: Fit | None = None) -> None:
        super().__init__(message)
        self.fit = fit


class Status(StrEnum):
    """How a fit ended."""

    CONVERGED = "The fit converged."
    STOPPED = "The fit did not converge: the iteration stopped before the sum of squares was at rest."
    NO_VORTEX = "No vortex is seen: the samples are explained as well without one."


@dataclass(frozen=True, eq=False, repr=False)
class Fit:
    """One survey, one model: what was found and how well it is known.

    Attributes
    ----------
    model : VortexModel
        The profile that was fitted.
    names : tuple of str
        Free parameters, in the order of `values`: the strength (circulation or swirl_scale), the background, then
        centre_x, centre_y, core_radius and shape parameters as far as they were free.
    values, standard_uncertainties : ndarray, shape (P,)
        In SI units; NaN for a parameter that the survey does not determine.
    covariance : ndarray, shape (P, P)
        Rows and columns of undetermined parameters are NaN.
    chi_square : float
        Weighted sum of squared residuals; with unknown scatter in (m/s)².
    degrees_of_freedom : int
        Samples less free parameters.
    uncertainties : {"absolute", "relative"}
        Whether the covariance uses the stated uncertainties or the scatter of the residuals.

    Notes
    -----
    95 % limits come from the profile likelihood, which equals the linear limits where those hold.
    """

    model: VortexModel
    names: tuple[str, ...]
    chi_square: float
    degrees_of_freedom: int
    uncertainties: Uncertainties
    background: Background
    loss: Loss
    evaluations: int
    remarks: tuple[str, ...]
    _problem: Problem = field(repr=False)
    _solution: Solution = field(repr=False)

    # What was found ------------------------------------------------------------------------------------------------

    @Kept
    def _best(self) -> FloatArray:
        """Every free parameter at the minimum, determined or not."""
        solution = self._solution
        return np.array([self._strength, *solution.linear[1:], *[solution.nonlinear[i] for i in solution.free]])

    @Kept
    def _relative_covariance(self) -> list[list[float]]:
        """Covariance by relative change of strength and nonlinear parameters, all taken as determined."""
        inverse = self._solution.inverse
        if self.loss != "linear":
            inverse = self._sandwich(np.array(inverse), slice(None)).tolist()
        elif self.uncertainties == "relative":
            unit = self._variance
            inverse = [[unit * value for value in row] for row in inverse]
        return self._turned(inverse)

    def _sandwich(self, inverse: FloatArray, keep: Any) -> FloatArray:
        """Huber's covariance of a robust fit, whose rows carry the weights of the loss."""
        if not np.isfinite(inverse).all():
            return inverse
        rows = self._solution.jacobian[keep] * self._solution.residuals
        return np.asarray(inverse @ (rows @ rows.T) @ inverse)

    def _turned(self, covariance: list[list[float]]) -> list[list[float]]:
        """From the swirl scale to the strength: circulation is swirl scale times 2π core_radius."""
        if self._problem.by_circulation and CORE_RADIUS in self._solution.free:
            turn = self.names.index("core_radius")
            first = [a + b for a, b in zip(covariance[0], covariance[turn], strict=True)]
            for row, value in zip(covariance, first, strict=True):
                row[0] = value
            first[0] += first[turn]
            covariance[0] = first
        return covariance

    @property
    def _scale(self) -> list[float]:
        return [self._strength, *self._solution.scale[1:]]

    @Kept
    def covariance(self) -> FloatArray:
        """Covariance of the free parameters, shape (P, P), SI units."""
        if not self._is_seen:
            return np.full((len(self.names), len(self.names)), math.nan)
        scale = np.array(self._scale)
        covariance = np.array(self._relative_covariance)
        if self._open:
            # What is not determined is held at its limit; the rest is known given that.
            keep = np.flatnonzero([name not in self._open for name in self.names])
            covariance = np.full(covariance.shape, math.nan)
            if len(keep):
                part = np.ix_(keep, keep)
                inverse = np.asarray(np.linalg.pinv(self._solution.normal[part], hermitian=True), dtype=np.float64)
                covariance[part] = inverse * self._variance if self.loss == "linear" else self._sandwich(inverse, keep)
        return np.asarray(covariance * scale * scale[:, None])

    @Kept
    def values(self) -> FloatArray:
        """Best values of the free parameters, NaN where undetermined."""
        if not self._open:
            return self._best
        return np.where([name in self._open for name in self.names], math.nan, self._best)

    @Kept
    def standard_uncertainties(self) -> FloatArray:
        """Roots of the covariance's diagonal."""
        if self._open:
            variance = self.covariance.diagonal()
            return np.sqrt(np.where(variance >= 0.0, variance, math.nan))
        relative = self._relative_covariance
        return np.array([abs(size) * math.sqrt(relative[i][i]) for i, size in enumerate(self._scale)])

    @Kept
    def scatter(self) -> float:
        """Standard deviation of the weighted residuals: near 1 where stated uncertainties hold; without them in m/s."""
        return math.sqrt(self.chi_square / max(self.degrees_of_freedom, 1))

    @Kept
    def undetermined(self) -> tuple[str, ...]:
        """Parameters for which the survey gives at best a one-sided limit."""
        return tuple(self._open)

    @Kept
    def _open(self) -> dict[str, str]:
        """Undetermined parameters and the sentence for each."""
        if not self._is_seen:
            return dict.fromkeys(self.names, Status.NO_VORTEX.value)
        found: dict[str, str] = {}
        first = 1 + len(self._problem.samples.background)
        relative = self._relative_covariance
        for position, index in enumerate(self._solution.free, first):
            if index < CORE_RADIUS or 0.0 <= relative[position][position] < _SUSPECT**2:
                continue
            name = self.names[position]
            low, high = self._limits_of(name, 0.95)
            if low > 0.0 and math.isfinite(high):
                continue
            found[name] = _one_sided(name, low, high)
            if name == "core_radius" and not math.isfinite(high):
                found[self._problem.strength_name] = (
                    f"{self._problem.strength_name} is not determined: the survey does not reach outside the core."
                )
        return found

    @property
    def _variance(self) -> float:
        """What one unit of chi-square stands for."""
        if self.uncertainties == "absolute":
            return 1.0
        alone = self.chi_square / max(self.degrees_of_freedom, 1)
        together = self._station_scatter
        return alone if together is None else max(alone, together[0])

    @Kept
    def _station_scatter(self) -> tuple[float, int] | None:
        """Variance of the residuals from the means of repeated readings, and its degrees of freedom.

        Readings at one station share its errors of position and drift: where their means scatter more than they
        themselves allow, it is the stations that count and not the readings.
        """
        station = self._problem.samples.station
        if station is None:
            return None
        count = np.bincount(station)
        total = np.bincount(station, weights=self._solution.residuals)
        freedom = len(count) - len(self.names)
        return (float(np.sum(total**2 / count)) / freedom, freedom) if freedom > 0 else None

    @property
    def effective_samples(self) -> int:
        """Number of independent samples: of stations, where repeated readings share their error."""
        together = self._station_scatter
        samples = self.degrees_of_freedom + len(self.names)
        if together is None or together[0] * self.degrees_of_freedom <= 1.5 * self.chi_square:
            return samples
        return together[1] + len(self.names)

    @Kept
    def _is_seen(self) -> bool:
        null, added = null_chi_square(self._problem, uniform=CENTRE_X in self._solution.free)
        rise = null - self.chi_square
        extra = max(len(self._solution.free) + 1 - added, 1)
        unit = self._variance
        if unit == 0.0:
            return rise > 0.0
        samples = self.degrees_of_freedom + len(self.names)
        if rise > 1e3 * extra * unit and self.degrees_of_freedom > 10:
            return True
        from scipy.special import chdtrc, fdtrc

        freedom = max(self.degrees_of_freedom, 1)
        known = self.uncertainties == "absolute"
        chance = chdtrc(extra, max(rise, 0.0) / unit) if known else fdtrc(extra, freedom, max(rise, 0.0) / unit / extra)
        # Noise has as many places to look like a vortex as there are samples.
        return bool(chance * samples < _NO_VORTEX)

    @property
    def converged(self) -> bool:
        """Whether the sum of squares was at rest."""
        return self._solution.converged

    @Kept
    def status(self) -> str:
        """How the fit ended and what it could not determine, in sentences."""
        if not self._is_seen:
            return Status.NO_VORTEX.value
        first = Status.CONVERGED if self.converged else Status.STOPPED
        return " ".join([first.value, *dict.fromkeys(self._open.values()), *self.remarks])

    # One parameter --------------------------------------------------------------------------------------------------

    def value(self, name: str) -> float:
        """Best value of a parameter, a fixed one or a derived one (peak_radius, peak_swirl, miss_distance). [SI]

        NaN where the survey does not determine it.
        """
        if name in self.names:
            return float(self.values[self.names.index(name)])
        if name in ("peak_radius", "peak_swirl"):
            at, size = self.model.peak_of(*self._shape)
            if name == "peak_radius":
                return self.value("core_radius") * at
            undetermined = "core_radius" in self.undetermined or self._problem.strength_name in self.undetermined
            return math.nan if undetermined else self._swirl_scale * size
        if name == "miss_distance":
            return abs(self.value("centre_y"))
        index = self._nonlinear_index(name)
        if index is not None:
            return float(self._solution.nonlinear[index])
        raise KeyError(f"No parameter named {name!r}. Known: {', '.join([*self.names, 'peak_radius', 'peak_swirl'])}.")

    def uncertainty(self, name: str) -> float:
        """Standard uncertainty of a parameter [SI]; 0 for a fixed one, NaN for an undetermined one."""
        if name in self.names:
            return float(self.standard_uncertainties[self.names.index(name)])
        if name == "miss_distance":
            return self.uncertainty("centre_y")
        if name in ("peak_radius", "peak_swirl"):
            value = abs(self.value(name))
            return self._linear_or_half(value * self._log_uncertainty(name), *self.interval(name))
        self.value(name)
        return 0.0

    def interval(self, name: str, level: float = 0.95) -> tuple[float, float]:
        """Limits of a parameter by profile likelihood. [SI]

        Parameters
        ----------
        name : str
            A free parameter, or peak_radius, peak_swirl.
        level : float
            Coverage probability.

        Returns
        -------
        tuple of float
            (low, high); 0 or ±inf on a side that the survey leaves open.
        """
        if not 0.0 < level < 1.0:
            raise ValueError(f"level must lie between 0 and 1, got {level}; 0.95 is usual.")
        if name == "peak_radius":
            at, _ = self.model.peak_of(*self._shape)
            low, high = self.interval("core_radius", level)
            return low * at, high * at
        if name == "miss_distance":
            low, high = self.interval("centre_y", level)
            return 0.0 if low < 0.0 < high else min(abs(low), abs(high)), max(abs(low), abs(high))
        if name not in self.names and name != "peak_swirl":
            value = self.value(name)
            return value, value
        return self._limits_of(name, level)

    def estimate(self, name: str) -> Estimate:
        """A parameter with its standard uncertainty and its 95 % limits, as an Estimate."""
        value = self.value(name)
        if math.isnan(value) and not self._is_seen:
            return Estimate(math.nan, math.nan, _quantity(name))
        uncertainty = self.uncertainty(name)
        low, high = self.interval(name)
        if math.isnan(value):
            if low > 0.0:
                return Estimate(low, math.nan, _quantity(name), bound="lower")
            return Estimate(high if math.isfinite(high) else math.nan, math.nan, _quantity(name), bound="upper")
        return Estimate(
            value,
            uncertainty,
            _quantity(name),
            quantiles=two_sided_quantiles(value, low, high),
            degrees_of_freedom=self.degrees_of_freedom if self.uncertainties == "relative" else math.inf,
        )

    @property
    def parameters(self) -> dict[str, Estimate]:
        """Every free parameter as an Estimate."""
        return {name: self.estimate(name) for name in self.names}

    def core_pressure_drop(self, density: float) -> Estimate:
        """Pressure far away less pressure on the axis, of this model alone. [Pa]

        The uncertainty is the fit's; gain, density and the choice of model are added by `appraise`. Where the survey
        does not enter the core the estimate is a lower bound.
        """
        if not self._is_seen:
            return Estimate(math.nan, math.nan, "core_pressure_drop")
        low, high = self._limits_of("core_pressure_drop", 0.95)
        constant = self.model.centre_pressure(*self._shape)
        core_is_open = "core_radius" in self._open or self._problem.strength_name in self._open
        if core_is_open or not (low > 0.0 and math.isfinite(high)):
            return Estimate(density * max(low, 0.0), math.nan, "core_pressure_drop", bound="lower")
        if abs(self._swirl_scale) > _FASTEST:
            return Estimate(math.nan, math.nan, "core_pressure_drop")
        value = density * self._swirl_scale**2 * constant
        linear = value * self._log_uncertainty("core_pressure_drop")
        return Estimate(
            value,
            self._linear_or_half(linear, density * low, density * high),
            "core_pressure_drop",
            quantiles=two_sided_quantiles(value, density * low, density * high),
        )

    # The curve ------------------------------------------------------------------------------------------------------

    @property
    def centre(self) -> tuple[float, float]:
        """Centre of the vortex in the survey's plane. [m]"""
        return self._solution.nonlinear[CENTRE_X], self._solution.nonlinear[CENTRE_Y]

    @Kept
    def vortex(self) -> Vortex:
        """The fitted vortex.

        Where the core radius is undetermined it stands at its 95 % limit, the shallowest vortex the survey allows.
        """
        from vortexwidgets.models.vortex import Vortex

        solution = self._solution
        if "core_radius" in self.undetermined and self._is_seen:
            low, high = self._limits_of("core_radius", 0.95)
            edge = high if math.isfinite(high) else low
            if edge > 0.0:
                solution = self._profile("core_radius").at(edge, list(solution.nonlinear))
        core_radius = solution.nonlinear[CORE_RADIUS]
        turned = 2.0 * math.pi * core_radius if self._problem.by_circulation else 1.0
        strength: dict[str, Any] = {self._problem.strength_name: solution.swirl_scale * turned}
        names = [parameter.name for parameter in self.model.shape]
        shape: dict[str, Any] = dict(zip(names, solution.nonlinear[SHAPE:], strict=True))
        return Vortex(
            self.model,
            core_radius=core_radius,
            centre=(solution.nonlinear[CENTRE_X], solution.nonlinear[CENTRE_Y]),
            **strength,
            **shape,
        )

    @Kept
    def fitted(self) -> FloatArray:
        """Fitted velocity at the included in-plane samples, background and instrument included, shape (N,). [m/s]"""
        return np.asarray((self._problem.samples.target - self._solution.residuals) * self._problem.samples.uncertainty)

    @Kept
    def residuals(self) -> FloatArray:
        """Measured less fitted velocity, shape (N,). [m/s]"""
        return np.asarray(self._solution.residuals * self._problem.samples.uncertainty)

    @Kept
    def normalised_residuals(self) -> FloatArray:
        """Residuals over their uncertainties, shape (N,); over the scatter where that is unknown."""
        return np.asarray(self._solution.residuals / math.sqrt(self._variance or 1.0))

    @Kept
    def radius(self) -> FloatArray:
        """Distance of the included in-plane samples from the centre, shape (N,). [m]"""
        x, y = self._problem.samples.position
        return np.asarray(np.hypot(x - self.centre[0], y - self.centre[1]))

    def __repr__(self) -> str:
        return f"<Fit of {self.model.name}: {self.status}>"

    def __str__(self) -> str:
        lines = [f"{self.model.name}: {self.status}"]
        lines += [f"  {name} = {estimate}" for name, estimate in self.parameters.items()]
        return "\n".join(lines)

    # Inside ---------------------------------------------------------------------------------------------------------

    @property
    def _shape(self) -> list[float]:
        return self._solution.nonlinear[SHAPE:]

    @property
    def _swirl_scale(self) -> float:
        return self._solution.swirl_scale

    @property
    def _strength(self) -> float:
        scale = self._solution.swirl_scale
        return scale * 2.0 * math.pi * self._solution.nonlinear[CORE_RADIUS] if self._problem.by_circulation else scale

    def _nonlinear_index(self, name: str) -> int | None:
        fixed = ("centre_x", "centre_y", "core_radius")
        if name in fixed:
            return fixed.index(name)
        for index, parameter in enumerate(self.model.shape, SHAPE):
            if parameter.name == name:
                return index
        return None

    def _log_uncertainty(self, name: str) -> float:
        """Relative standard uncertainty of a derived quantity, linear in the logarithms."""
        gradient = np.zeros(len(self.names))
        power = {"peak_swirl": 1.0, "core_pressure_drop": 2.0, "peak_radius": 0.0}[name]
        for position, label in enumerate(self.names):
            if label == self._problem.strength_name:
                gradient[position] = power / self._strength
            elif label == "core_radius":
                change = -power * self._problem.by_circulation + (name == "peak_radius")
                gradient[position] = change / self._solution.nonlinear[CORE_RADIUS]
            elif (index := self._nonlinear_index(label)) is not None and index >= SHAPE:
                slope = log_slope(self._measure(name), self._shape, index - SHAPE)
                gradient[position] = slope / self._shape[index - SHAPE]
        used = gradient != 0.0
        part = self.covariance[np.ix_(used, used)]
        if not np.isfinite(part).all():
            return math.nan
        return math.sqrt(max(float(gradient[used] @ part @ gradient[used]), 0.0))

    @staticmethod
    def _linear_or_half(linear: float, low: float, high: float) -> float:
        """Linear uncertainty, or half the 95 % interval over 1.96 where a shape that is open leaves none."""
        return linear if math.isfinite(linear) else (high - low) / (2.0 * 1.959963984540054)

    def _measure(self, name: str) -> Any:
        if name == "core_pressure_drop":
            return self.model.centre_pressure
        which = 0 if name == "peak_radius" else 1
        return lambda *shape: abs(self.model.peak_of(*shape)[which])

    def _profile(self, name: str) -> Profile:
        problem, solution = self._problem, self._solution
        quick = math.nan
        if name in self.names:
            position = self.names.index(name)
            variance = self._relative_covariance[position][position]
            quick = math.sqrt(variance) if variance >= 0.0 else math.nan
        if name == problem.strength_name:
            return of_strength(problem, solution, quick * abs(self._strength))
        if name in problem.samples.background_names:
            raise KeyError(name)
        if name == "core_pressure_drop":
            root = abs(self._swirl_scale) * math.sqrt(self.model.centre_pressure(*self._shape))
            return of_swirl_scale(
                problem, solution, root, 0.1 * root, lambda *shape: math.sqrt(self.model.centre_pressure(*shape))
            )
        if name == "peak_swirl":
            peak = abs(self._swirl_scale) * abs(self.model.peak_of(*self._shape)[1])
            return of_swirl_scale(problem, solution, peak, 0.1 * peak, self._measure(name))
        index = self._nonlinear_index(name)
        if index is None:
            raise KeyError(name)
        scale = solution.nonlinear[CORE_RADIUS] if index <= CORE_RADIUS else solution.nonlinear[index]
        return of_nonlinear(problem, solution, index, quick * scale)

    def _limits_of(self, name: str, level: float) -> tuple[float, float]:
        store: dict[tuple[str, float], tuple[float, float]] = self.__dict__.setdefault("_limit_store", {})
        if (name, level) not in store:
            store[name, level] = self._find_limits(name, level)
        return store[name, level]

    def _find_limits(self, name: str, level: float) -> tuple[float, float]:
        unit = math.sqrt(self._variance)
        distance = self._coverage_factor(level) * unit
        if name in self._problem.samples.background_names or self.loss != "linear" or distance == 0.0:
            return self._linear_limits(name, self._coverage_factor(level))
        floor, ceiling = self._range_of(name)
        profile = self._profile(name)
        low = profile.limit(distance, -1, floor, ceiling)
        high = profile.limit(distance, +1, floor, ceiling)
        if name == "core_pressure_drop":
            return low * low, high * high
        if name == "peak_swirl" and self._swirl_scale < 0.0:
            return -high, -low
        return low, high

    def _linear_limits(self, name: str, factor: float) -> tuple[float, float]:
        """Limits from the covariance alone: of a robust loss, a background, or data without scatter."""
        if name in self.names:
            position = self.names.index(name)
            value = float(self._best[position])
            half = (
                factor * abs(self._scale[position]) * math.sqrt(max(self._relative_covariance[position][position], 0.0))
            )
            return value - half, value + half
        if name == "core_pressure_drop":
            value = self._swirl_scale**2 * self.model.centre_pressure(*self._shape)
        else:
            value = self._swirl_scale * self.model.peak_of(*self._shape)[1]
        spread = math.exp(min(factor * self._log_uncertainty(name), 700.0))
        low, high = sorted((value / spread, value * spread))
        return low, high

    def _range_of(self, name: str) -> tuple[float, float]:
        near, far = float(self.radius.min()), float(self.radius.max())
        near = max(near, 1e-6 * far)
        if name == "core_radius":
            return _TOO_SMALL * near, _TOO_LARGE * far
        index = self._nonlinear_index(name)
        if index is not None and index >= SHAPE:
            return SHAPE_BOUNDS
        if name in ("centre_x", "centre_y"):
            return 0.0, 1e3 * (far + abs(self._solution.nonlinear[index or 0]))
        reference = abs(self._strength) if name == self._problem.strength_name else abs(self._swirl_scale)
        return 1e-9 * reference, 1e6 * reference

    def _coverage_factor(self, level: float) -> float:
        from scipy.special import ndtri, stdtrit

        tail = 0.5 + 0.5 * level
        if self.uncertainties == "relative":
            return float(stdtrit(max(self.effective_samples - len(self.names), 1), tail))
        return float(ndtri(tail))


def two_sided_quantiles(value: float, low: float, high: float) -> tuple[float, ...] | None:
    """Quantiles from a median and 95 % limits: normal on each side, in the logarithm where all are positive."""
    if not (math.isfinite(low) and math.isfinite(high) and low < value < high):
        return None
    factor = 1.959963984540054  # 97.5 % point of the normal distribution
    if low > 0.0:
        below, above = math.log(value / low) / factor, math.log(high / value) / factor
        table = value * np.exp(_PROBITS * np.where(_PROBITS < 0.0, below, above))
    else:
        below, above = (value - low) / factor, (high - value) / factor
        table = value + _PROBITS * np.where(_PROBITS < 0.0, below, above)
    return tuple(table.tolist())


def _quantity(name: str) -> str:
    known = {"background_x": "background_velocity", "background_y": "background_velocity"}
    return "velocity_gradient" if name.startswith("gradient") else known.get(name, name)


def _one_sided(name: str, low: float, high: float) -> str:
    unit = "m" if name == "core_radius" else ""
    if not math.isfinite(high) and low <= 0.0:
        return f"{name} is not determined."
    if not math.isfinite(high):
        return f"{name} is not determined; it is above {format_number(low, unit)} (95 %)."
    why = ": the survey does not enter the core" if name == "core_radius" else ""
    return f"{name} is not determined{why}; it is below {format_number(high, unit)} (95 %)."
