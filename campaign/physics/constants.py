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
# IAU 2015 Resolution B2.
PARSEC_AU = 648_000.0 / math.pi

KMS_PER_AU_YR = AU_KM / (JULIAN_YEAR_D * DAY_S)
LIGHT_TIME_AU_S = AU_KM / SPEED_OF_LIGHT_KMS
LIGHT_TIME_AU_D = LIGHT_TIME_AU_S / DAY_S

# Zero points of the day counts.
MJD_ZERO_JD = 2_400_000.5
MJD_J2000 = 51_544.5
