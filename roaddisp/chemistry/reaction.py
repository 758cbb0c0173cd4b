"""NO2 where the time to react limits it."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from roaddisp.chemistry.checks import checked
from roaddisp.constants import BOLTZMANN, STANDARD_PRESSURE
from roaddisp.model import FloatArray

_PRE_EXPONENTIAL = 3.0e-12  # cm3/molecule/s
_ACTIVATION_TEMPERATURE = 1500.0  # K
_CUBIC_CENTIMETRES = 1e6  # in a cubic metre
_PER_PPB = 1e-9


def reaction_limited_no2(
    nox: npt.ArrayLike,
    o3: npt.ArrayLike,
    no2_background: npt.ArrayLike,
    primary_fraction: npt.ArrayLike,
    *,
    travel_time: npt.ArrayLike,
    temperature: npt.ArrayLike,
    photolysis: npt.ArrayLike,
    no_background: npt.ArrayLike = 0,
    pressure: npt.ArrayLike = STANDARD_PRESSURE,
) -> float | FloatArray:
    """Total NO2 after the air has reacted for the time of travel.

    Parameters
    ----------
    nox : (...) [ppb]
        What the roads add.
    o3, no2_background : (...) [ppb]
    primary_fraction : (...)
        NO2 over NOx as emitted, by volume.
    travel_time : (...) [s]
        From road to receptor; inf gives the photostationary state.
    temperature : (...) [K]
    photolysis : (...) [1/s]
        Rate of NO2 + light; 0 at night.
    no_background : (...) [ppb]
    pressure : (...) [Pa]

    Returns
    -------
    (...) [ppb]
        Road and background; float where every argument is a scalar, NaN where
        one is NaN.

    Raises
    ------
    ValueError
        Where an argument is negative, the fraction above 1, temperature or
        pressure not above 0, or any but the time infinite.

    Notes
    -----
    Road air and background are mixed first and then react by NO + O3 -> NO2 and
    its reverse in light, in closed form (`no2_after`). At a receptor the air has
    in truth been diluting all the while, so the result is an estimate between
    the primary NO2 and the ozone-limited one. In light, background NO2 that its
    own NO and ozone do not sustain is photolysed too: give ``no_background``.

    Rate constant: Burkholder et al. 2019, JPL Publication 19-5 (from memory).

    Examples
    --------
    >>> round(
    ...     reaction_limited_no2(
    ...         80.0, 30.0, 12.0, 0.1, travel_time=60.0, temperature=288.0, photolysis=0.0
    ...     ),
    ...     2,
    ... )
    42.86
    """
    nox_, o3_, background, fraction, light, no = checked(
        nox=nox,
        o3=o3,
        no2_background=no2_background,
        primary_fraction=primary_fraction,
        photolysis=photolysis,
        no_background=no_background,
    )
    time = np.asarray(travel_time, dtype=np.float64)
    if np.any(time < 0):
        raise ValueError(f"travel_time is {time[time < 0].flat[0]:g} s; allowed: 0 and more")
    rate = nitric_oxide_ozone_rate(temperature, pressure=pressure)
    start = fraction * nox_ + background
    no2 = no2_after(
        time,
        nox=nox_ + background + no,
        oxidant=o3_ + start,
        no2=start,
        rate=np.asarray(rate),
        photolysis=light,
    )
    return float(no2) if no2.ndim == 0 else no2


def nitric_oxide_ozone_rate(
    temperature: npt.ArrayLike, *, pressure: npt.ArrayLike = STANDARD_PRESSURE
) -> float | FloatArray:
    """Rate constant of NO + O3.

    Parameters
    ----------
    temperature : (...) [K]
    pressure : (...) [Pa]

    Returns
    -------
    (...) [1/(ppb s)]

    Raises
    ------
    ValueError
        Where temperature or pressure is not above 0 and finite.

    Notes
    -----
    3.0e-12 exp(-1500/T) cm3/molecule/s times the molecules of air in a cm3.

    References
    ----------
    Burkholder et al. 2019, JPL Publication 19-5 (from memory).

    Examples
    --------
    >>> round(nitric_oxide_ozone_rate(298.15), 7)
    0.0004824
    """
    kelvin = np.asarray(temperature, dtype=np.float64)
    pascal = np.asarray(pressure, dtype=np.float64)
    for name, values, unit in (("temperature", kelvin, "K"), ("pressure", pascal, "Pa")):
        bad = (values <= 0) | np.isinf(values)
        if np.any(bad):
            raise ValueError(f"{name} is {values[bad].flat[0]:g} {unit}; allowed: above 0, finite")
    air = pascal / (BOLTZMANN * kelvin) / _CUBIC_CENTIMETRES
    rate: FloatArray = _PRE_EXPONENTIAL * np.exp(-_ACTIVATION_TEMPERATURE / kelvin) * air * _PER_PPB
    return float(rate) if rate.ndim == 0 else rate


def no2_after(
    time: float | FloatArray,
    *,
    nox: float | FloatArray,
    oxidant: float | FloatArray,
    no2: float | FloatArray,
    rate: float | FloatArray,
    photolysis: float | FloatArray,
) -> FloatArray:
    """NO2 of a closed parcel after some time.

    Parameters
    ----------
    time : (...) [s], may be inf
    nox : (...) [ppb]
        NO + NO2, conserved.
    oxidant : (...) [ppb]
        O3 + NO2, conserved.
    no2 : (...) [ppb]
        At time 0; not above ``nox`` or ``oxidant``.
    rate : (...) [1/(ppb s)]
        Of NO + O3.
    photolysis : (...) [1/s]

    Returns
    -------
    (...) [ppb]

    Notes
    -----
    ``y' = k (A - y)(B - y) - J y`` has two steady states ``y1 <= y2``, roots of
    ``y^2 - S y + A B`` with ``S = A + B + J/k``. With ``w = y - y1`` and
    ``D = y2 - y1``, ``w' = k w (w - D)``, so
    ``w(t) = w0 exp(-k D t) / (1 - w0 (1 - exp(-k D t)) / D)``; the last fraction
    goes to ``k t`` as D goes to 0. D^2 and y1 are written without differences of
    near equals.

    References
    ----------
    Leighton 1961, Photochemistry of Air Pollution, for the two reactions; the
    solution is algebra.

    Examples
    --------
    >>> import numpy as np
    >>> start = {"nox": 100.0, "oxidant": 48.0, "no2": 18.0}
    >>> round(float(no2_after(30.0, **start, rate=4.43e-4, photolysis=0.0)), 4)
    36.3287
    """
    light = photolysis / rate
    distance = np.sqrt((nox - oxidant) ** 2 + light * (2 * (nox + oxidant) + light))
    total = nox + oxidant + light
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        steady = np.where(total > 0, 2 * nox * oxidant / (total + distance), 0.0 * total)
        exponent = rate * distance * time
        decayed = np.exp(-exponent)
        passed = np.where(exponent > 0, -np.expm1(-exponent) / distance, rate * time)
        gap = no2 - steady
        later = steady + gap * decayed / (1 - gap * passed)
    return np.where(np.isinf(time), steady, later)
