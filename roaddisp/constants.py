"""Numbers that are neither the user's nor a table's, each with unit and source."""

from __future__ import annotations

from typing import Final

# Speeds, lengths, angles
KNOT: Final = 0.514444
"""m/s in one knot (exactly 1852/3600; six decimals as in the handbooks)."""

MILE: Final = 1609.344
"""m in one international mile (exact)."""

FOOT: Final = 0.3048
"""m in one international foot (exact)."""

HOUR: Final = 3600.0
"""s in one hour."""

# Gases
GAS_CONSTANT: Final = 8.314462618
"""J/(mol K), CODATA 2018 (exact since the SI of 2019)."""

AVOGADRO: Final = 6.02214076e23
"""1/mol, exact in the SI of 2019."""

BOLTZMANN: Final = 1.380649e-23
"""J/K, exact in the SI of 2019."""

MOLAR_MASS_NO2: Final = 46.0055
"""g/mol; also the basis of NOx mass, which is always NO2-equivalent."""

MOLAR_MASS_NO: Final = 30.0061
"""g/mol."""

MOLAR_MASS_O3: Final = 47.9982
"""g/mol."""

STANDARD_PRESSURE: Final = 101325.0
"""Pa."""

NO2_UGM3_PER_PPB: Final = {"25 C": 1.8804, "20 C": 1.9125}
"""ug/m3 of NO2 in one ppb at the reference states a study may choose.

``M P / (R T)`` at 298.15 K and 293.15 K, both 101.325 kPa, to four decimals as
agencies print them (25 C: 40 CFR 50.3; 20 C: UK reporting sheets, from memory).
"""

# Roads
LANE_WIDTH: Final = 3.6
"""m; the 12 ft lane of road design, taken where a road gives lanes and no width."""

DEFAULT_ROAD_WIDTH: Final = 7.2
"""m; two lanes, taken where a road gives neither width nor lanes."""

RELEASE_HEIGHT: Final = {"light": 1.3, "heavy": 3.4}
"""m above the road: half the top of a plume 1.7 vehicle heights deep.

US EPA guidance for quantitative PM hot-spot analyses, Appendix J (values from
memory, printed to one decimal).
"""

INITIAL_SIGMA_Z: Final = {"light": 1.2, "heavy": 3.2}
"""m: the same plume top over 2.15 (same source, from memory)."""

# Wind
LOWEST_PLUME_WIND_HEIGHT: Final = 2.0
"""m; the power law is not followed below this height (a choice of this project)."""

LEAST_MEASURED_WIND: Final = 1.0
"""m/s; a steady-state plume takes no wind below it (EPA-454/R-99-005 sec. 6.2.3)."""

CALM_PLUME_WIND: Final = 1.0
"""m/s at the plume in a calm hour run in the worst direction (same section)."""

CALM_DIRECTION_STEP: Final = 2.0
"""deg between the directions tried in a calm hour."""

SIGNIFICANT_SPEED_WITHOUT_DIRECTION: Final = 1.0
"""m/s; below it a missing direction means calm, from it on a missing hour."""
