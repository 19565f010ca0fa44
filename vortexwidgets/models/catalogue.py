"""The published models, one entry each, with source."""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterable, Iterator, Mapping

import sympy as sp

from vortexwidgets.models.model import ShapeParameter, VortexModel, X

_N = sp.Symbol("n", positive=True)
_S = X**2

FREE = VortexModel(
    key="free",
    name="Free",
    swirl=1 / X,
    source="H. Lamb, Hydrodynamics, 6th ed., Cambridge University Press, 1932.",
    ranked=False,
    has_core=False,
    limits="Outside any core only: speed and pressure drop are infinite on the axis.",
)

FORCED = VortexModel(
    key="forced",
    name="Forced",
    swirl=X,
    source="H. Lamb, Hydrodynamics, 6th ed., Cambridge University Press, 1932.",
    strength="rotation_rate",
    ranked=False,
    has_core=False,
    limits="Solid-body rotation, as in a rotating bucket: inside a wall only, and without a pressure far away.",
)

RANKINE = VortexModel(
    key="rankine",
    name="Rankine",
    swirl=sp.Piecewise((X, X <= 1), (1 / X, True)),
    source="W. J. M. Rankine, A Manual of Applied Mechanics, 1858, on the combined vortex.",
    published_peak=(sp.S.One, sp.S.One),
    published_pressure_constant=sp.S.One,
    published_source="½ρv² inside the core and ½ρv² outside; US NRC Regulatory Guide 1.76 Rev. 1 (from memory).",
    limits="The sharpest core there is, hence the smallest drop for a given peak swirl: no real core has an edge.",
)

KAUFMANN = VortexModel(
    key="kaufmann",
    name="Kaufmann",
    swirl=X / (1 + X**2),
    source=(
        "W. Kaufmann, Ingenieur-Archiv 31 (1962) 1-9; also known as Scully (MIT ASRL TR 178-1, 1975) and "
        "Burnham-Hallock (1982)."
    ),
    published_peak=(sp.S.One, sp.Rational(1, 2)),
    published_pressure_constant=sp.Integer(2),
    published_source="Closed form of the literature, derived: K = 2 (Vatistas n = 1).",
    limits="Empirical. Its tail is heavy: half of the circulation lies outside the peak.",
)


def _vatistas_share(y: sp.Expr) -> sp.Expr:
    """∫₀^y (1 + w^n)^(-2/n) dw, as a series of positive terms."""
    q = y**_N
    return y * (1 + q) ** (-2 / _N) * sp.hyper([1, 2 / _N], [1 + 1 / _N], q / (1 + q))


VATISTAS = VortexModel(
    key="vatistas",
    name="Vatistas",
    swirl=X / (1 + X ** (2 * _N)) ** (1 / _N),
    source="G. H. Vatistas, V. Kozel and W. C. Mih, Exp. Fluids 11 (1991) 73-76.",
    shape=(
        ShapeParameter(
            name="exponent",
            symbol="n",
            default=2.0,
            valid=(0.0, 1000.0),
            typical=(0.5, 10.0),
            description="Sharpness of the core: 1 is Kaufmann, 2 close to Lamb-Oseen, large values tend to Rankine",
        ),
    ),
    # SymPy's own integral for general n is oo*hyper(...); with w = 1/x² it is an incomplete beta function.
    stated={
        "pressure_drop": sp.Piecewise(
            ((sp.beta(1 / _N, 1 / _N) / _N - _vatistas_share(X**2)) / 2, X <= 1),
            (_vatistas_share(X**-2) / 2, True),
        )
    },
    published_peak=(sp.S.One, 2 ** (-1 / _N)),
    published_pressure_constant=4 ** (1 / _N) * sp.gamma(1 / _N) ** 2 / (2 * _N * sp.gamma(2 / _N)),
    published_source="Closed form; n = 1 gives 2, n = 2 gives π/2 (derived).",
    limits="Empirical family.",
)

_LAMB_OSEEN_PEAK = sp.sqrt(sp.Float("1.25643"))

LAMB_OSEEN = VortexModel(
    key="lamb-oseen",
    name="Lamb-Oseen",
    swirl=(1 - sp.exp(-_S)) / X,
    source=(
        "H. Lamb, Hydrodynamics, 6th ed., Cambridge University Press, 1932, art. 334a; C. W. Oseen, Ark. Mat. Astron. "
        "Fys. 7 (1911)."
    ),
    # SymPy's integral takes seconds and ends in exp_polar, which NumPy cannot evaluate.
    stated={
        "pressure_drop": (1 - sp.exp(-_S)) ** 2 / (2 * _S) + sp.expint(1, _S) - sp.expint(1, 2 * _S),
        "centre": sp.log(2),
    },
    published_peak=(_LAMB_OSEEN_PEAK, sp.Float("0.71533") / _LAMB_OSEEN_PEAK),
    published_pressure_constant=sp.Float("1.702"),
    published_source=(
        "W. J. Devenport et al., J. Fluid Mech. 312 (1996) 67-106: α = 1.25643, v_peak = 0.715 Γ/(2π r_peak) "
        "(quoted second-hand); K = 1.702 (derived)."
    ),
    published_digits=4,
    motion="growing",
    limits="A laminar core that grows by diffusion. Its core radius is where the vorticity has fallen to 1/e.",
)

TAYLOR = VortexModel(
    key="taylor",
    name="Taylor",
    swirl=X * sp.exp(-_S),
    source="G. I. Taylor, On the dissipation of eddies, Aeronautical Research Committee, R&M 598, 1918.",
    strength="swirl_scale",
    published_peak=(1 / sp.sqrt(2), 1 / sp.sqrt(2 * sp.E)),
    published_pressure_constant=sp.E / 2,
    published_source="Closed form (derived).",
    motion="growing",
    decay=3,
    limits="A shielded eddy without circulation far away: its vorticity changes sign at the core radius.",
)

BURGERS = VortexModel(
    key="burgers",
    name="Burgers",
    swirl=(1 - sp.exp(-_S)) / X,
    source="J. M. Burgers, Adv. Appl. Mech. 1 (1948) 171-199.",
    stated=LAMB_OSEEN.stated,
    published_peak=LAMB_OSEEN.published_peak,
    published_pressure_constant=LAMB_OSEEN.published_pressure_constant,
    published_source=LAMB_OSEEN.published_source,
    published_digits=4,
    same_profile_as="lamb-oseen",
    motion="strained",
    limits=(
        "Steady under the strain u_r = -a r/2, u_z = a z with r_c² = 4ν/a. The pressure drop is the swirl's part; the "
        "strain adds -ρa²(r²/8 + z²/2) to the pressure relative to the origin."
    ),
)


class _Catalogue(Mapping[str, VortexModel]):
    """Models by key; a key that is none is answered with the closest one."""

    def __init__(self, models: Iterable[VortexModel]) -> None:
        self._by_key = {model.key: model for model in models}

    def __getitem__(self, key: str) -> VortexModel:
        if key in self._by_key:
            return self._by_key[key]
        raise KeyError(_no_model(key))

    def __contains__(self, key: object) -> bool:
        return key in self._by_key

    def __iter__(self) -> Iterator[str]:
        return iter(self._by_key)

    def __len__(self) -> int:
        return len(self._by_key)

    def __repr__(self) -> str:
        return f"<Models: {', '.join(self)}>"


MODELS: Mapping[str, VortexModel] = _Catalogue((FREE, FORCED, RANKINE, KAUFMANN, VATISTAS, LAMB_OSEEN, TAYLOR, BURGERS))
"""Every published model by its key."""

_ALSO_CALLED = {
    "scully": "kaufmann",
    "burnhamhallock": "kaufmann",
    "lamb": "lamb-oseen",
    "oseen": "lamb-oseen",
    "potential": "free",
    "solidbody": "forced",
    "solidbodyrotation": "forced",
}


def model_named(name: str | VortexModel) -> VortexModel:
    """Look a model up by its key or its name, however it is spelt.

    Parameters
    ----------
    name : str or VortexModel
        "lamb oseen", "Lamb-Oseen" and "lamb-oseen" are the same; a model is handed back.

    Returns
    -------
    VortexModel

    Raises
    ------
    ValueError
        If there is none of that name; the message names the closest.

    Examples
    --------
    >>> model_named("Lamb Oseen").key
    'lamb-oseen'
    >>> model_named("Rankin")
    Traceback (most recent call last):
        ...
    ValueError: No model named 'Rankin'; did you mean 'rankine'? Known models: free, forced, rankine, ...
    """
    if isinstance(name, VortexModel):
        return name
    if isinstance(name, str):
        key = name if name in MODELS else _known_names().get(_plain(name))
        if key is not None:
            return MODELS[key]
    raise ValueError(_no_model(name))


def _no_model(name: object) -> str:
    if not isinstance(name, str):
        return f"A model is named by text, got {name!r:.60}. Known models: {', '.join(MODELS)}."
    known = _known_names()
    close = difflib.get_close_matches(_plain(name), known, n=1)
    hint = f"; did you mean '{known[close[0]]}'?" if close else "."
    return f"No model named {name!r:.60}{hint} Known models: {', '.join(MODELS)}."


def _known_names() -> dict[str, str]:
    return {_plain(key): key for key in MODELS} | _ALSO_CALLED


def _plain(name: str) -> str:
    return re.sub(r"(vortex|[^a-z0-9])", "", name.lower())
