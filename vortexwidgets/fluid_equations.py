"""Published equations for water and sea water where the property library departs from them or has none."""

from __future__ import annotations

import math

ZERO_CELSIUS = 273.15
"""[K] 0 °C, exact."""

STANDARD_ATMOSPHERE = 101325.0
"""[Pa] exact."""

_CRITICAL_TEMPERATURE = 647.096  # [K] of water, IAPWS R2-83(1992)
_REFERENCE_SALINITY = (
    35.16504 / 35.0
)  # g/kg in one unit of practical salinity: F. J. Millero et al., Deep-Sea Res. I 55 (2008)
_T68_OF_T90 = 1.00024  # P. M. Saunders, WOCE Newsletter 10 (1990)


def water_surface_tension(temperature: float) -> float:
    """Surface tension of ordinary water against its vapour. [N/m]

    Parameters
    ----------
    temperature : float
        273.16 to 647.096. [K]

    Returns
    -------
    float

    References
    ----------
    .. [1] IAPWS R1-76(2014), Revised release on surface tension of ordinary water substance.

    Examples
    --------
    The table of the release prints 72.74 mN/m at 20 °C (from memory).

    >>> round(1e3 * water_surface_tension(293.15), 2)
    72.74
    """
    below = 1.0 - temperature / _CRITICAL_TEMPERATURE
    return float(0.2358 * below**1.256 * (1.0 - 0.625 * below))


def sea_water_surface_tension(temperature: float, salinity: float) -> float:
    """Surface tension of sea water against air. [N/m]

    Parameters
    ----------
    temperature : float
        [K]
    salinity : float
        Absolute, to 131. [g/kg]

    Returns
    -------
    float

    References
    ----------
    .. [1] IAPWS G14-19, Guideline on the surface tension of seawater; K. G. Nayar, D. Panchanathan, G. H. McKinley and
       J. H. Lienhard V, J. Phys. Chem. Ref. Data 43 (2014) 043103, doi:10.1063/1.4899037.
    """
    celsius = temperature - ZERO_CELSIUS
    return water_surface_tension(temperature) * (1.0 + 3.766e-4 * salinity + 2.347e-6 * salinity * celsius)


def sea_water_vapour_pressure_ratio(salinity: float) -> float:
    """Vapour pressure of sea water divided by that of pure water.

    Parameters
    ----------
    salinity : float
        Absolute, to 160. [g/kg]

    Returns
    -------
    float

    References
    ----------
    .. [1] K. G. Nayar, M. H. Sharqawy, L. D. Banchik and J. H. Lienhard V, Desalination 390 (2016) 1-24,
       doi:10.1016/j.desal.2016.02.024.
    """
    return math.exp(-4.5818e-4 * salinity - 2.0443e-6 * salinity**2)


def sea_water_viscosity_ratio(temperature: float, salinity: float) -> float:
    """Dynamic viscosity of sea water divided by that of pure water.

    Parameters
    ----------
    temperature : float
        273.15 to 453.15. [K]
    salinity : float
        Absolute, to 150. [g/kg]

    Returns
    -------
    float

    References
    ----------
    .. [1] M. H. Sharqawy, J. H. Lienhard V and S. M. Zubair, Desalination and Water Treatment 16 (2010) 354-380,
       eq. 22, doi:10.5004/dwt.2010.1079.
    """
    celsius, fraction = temperature - ZERO_CELSIUS, 1e-3 * salinity
    linear = 1.541 + 1.998e-2 * celsius - 9.52e-5 * celsius**2
    square = 7.974 - 7.561e-2 * celsius + 4.724e-4 * celsius**2
    return 1.0 + linear * fraction + square * fraction**2


def sea_water_density(temperature: float, salinity: float, pressure: float) -> float:
    """Density of sea water, EOS-80. [kg/m³]

    Parameters
    ----------
    temperature : float
        -2 °C to 40 °C, on ITS-90. [K]
    salinity : float
        Absolute, to 42. [g/kg]
    pressure : float
        Absolute, to 1e8. [Pa]

    Returns
    -------
    float

    Notes
    -----
    The one-atmosphere equation and the secant bulk modulus, with practical salinity and t68 made from absolute salinity
    and t90. Their standard deviations are 0.004 kg/m³ at one atmosphere and 0.009 kg/m³ under pressure.

    References
    ----------
    .. [1] N. P. Fofonoff and R. C. Millard, Algorithms for computation of fundamental properties of seawater, Unesco
       Technical Papers in Marine Science 44 (1983), p. 15-24.

    Examples
    --------
    The check value of [1]_, p. 19: 1027.67547 kg/m³ for practical salinity 35 at 5 °C (t68) and one atmosphere.

    >>> round(sea_water_density(273.15 + 5.0 / 1.00024, 35.16504, 101325.0), 5)
    1027.67547
    """
    t = _T68_OF_T90 * (temperature - ZERO_CELSIUS)
    s = salinity / _REFERENCE_SALINITY
    root = s * math.sqrt(s)
    bar = 1e-5 * (pressure - STANDARD_ATMOSPHERE)
    density = (
        _polynomial(t, 999.842594, 6.793952e-2, -9.095290e-3, 1.001685e-4, -1.120083e-6, 6.536332e-9)
        + s * _polynomial(t, 0.824493, -4.0899e-3, 7.6438e-5, -8.2467e-7, 5.3875e-9)
        + root * _polynomial(t, -5.72466e-3, 1.0227e-4, -1.6546e-6)
        + 4.8314e-4 * s**2
    )
    modulus = (
        _polynomial(t, 19652.21, 148.4206, -2.327105, 1.360477e-2, -5.155288e-5)
        + s * _polynomial(t, 54.6746, -0.603459, 1.09987e-2, -6.1670e-5)
        + root * _polynomial(t, 7.944e-2, 1.6483e-2, -5.3009e-4)
    )
    first = (
        _polynomial(t, 3.239908, 1.43713e-3, 1.16092e-4, -5.77905e-7)
        + s * _polynomial(t, 2.2838e-3, -1.0981e-5, -1.6078e-6)
        + 1.91075e-4 * root
    )
    second = _polynomial(t, 8.50935e-5, -6.12293e-6, 5.2787e-8) + s * _polynomial(t, -9.9348e-7, 2.0816e-8, 9.1697e-10)
    return density / (1.0 - bar / (modulus + first * bar + second * bar**2))


def _polynomial(x: float, *coefficients: float) -> float:
    """Evaluate a polynomial, constant term first."""
    result = 0.0
    for coefficient in reversed(coefficients):
        result = result * x + coefficient
    return result
