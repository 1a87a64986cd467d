"""Constants, each with its unit in its name. Values set by resolution are exact."""

from __future__ import annotations

import math

DAY_S = 86_400.0
# Julian year, IAU style manual.
JULIAN_YEAR_D = 365.25
# Besselian (tropical at B1900.0) year of Lieske 1979, A&A 73, 282.
BESSELIAN_YEAR_D = 365.242198781
# IAU 2012 Resolution B2.
AU_KM = 149_597_870.7
# SI.
SPEED_OF_LIGHT_KMS = 299_792.458
# IAU 2015 Resolution B3, nominal values.
GM_SUN_KM3_S2 = 1.3271244e11
SOLAR_RADIUS_KM = 695_700.0
SOLAR_LUMINOSITY_W = 3.828e26
# GM of the Sun over G of CODATA 2018: the only way to kilograms, good to 2e-5.
SOLAR_MASS_KG = GM_SUN_KM3_S2 * 1e9 / 6.67430e-11
# SI 2019, exact.
PLANCK_J_S = 6.62607015e-34
BOLTZMANN_J_K = 1.380649e-23
LIGHT_M_S = 1000.0 * SPEED_OF_LIGHT_KMS
# Stefan's constant from the exact ones, W m^-2 K^-4.
STEFAN_BOLTZMANN = 2.0 * math.pi**5 * BOLTZMANN_J_K**4 / (15.0 * PLANCK_J_S**3 * LIGHT_M_S**2)
# IAU 2015 Resolution B2.
PARSEC_AU = 648_000.0 / math.pi

KMS_PER_AU_YR = AU_KM / (JULIAN_YEAR_D * DAY_S)
LIGHT_TIME_AU_S = AU_KM / SPEED_OF_LIGHT_KMS
LIGHT_TIME_AU_D = LIGHT_TIME_AU_S / DAY_S

# Zero points of the day counts.
MJD_ZERO_JD = 2_400_000.5
MJD_J2000 = 51_544.5

# SI 2019, exact; proton mass of CODATA 2022.
ELECTRON_VOLT_J = 1.602176634e-19
PROTON_MASS_KG = 1.67262192595e-27
