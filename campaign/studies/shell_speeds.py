"""Whether shells keep their speed, or starlight has accelerated them: what the radii of a group can say."""

from __future__ import annotations

import numpy as np

from campaign.errors import InputRefused
from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.shells import ShellAcceleration
from campaign.physics.constants import KMS_PER_AU_YR
from campaign.physics.shellacceleration import AccelerationFit, fit_acceleration
from campaign.physics.shelltrack import SpeedModel
from campaign.physics.shellvalues import Sided
from campaign.studies.shell_ephemeris import ShellEphemeris
from campaign.studies.shell_fitting import GroupFit, sided
from campaign.studies.shell_images import years_of
from campaign.studies.shell_relations import none_if_nan

CRITERION = "AIC"
# Fewer radii than this say nothing of a change of speed.
_LEAST_RADII = 4


def acceleration_of(
    found: GroupFit,
    period: Measured | None,
    distance_pc: float | None,
    launch_radius: Sided | None,
    launch_time: Sided | None,
) -> ShellAcceleration | None:
    """Constant speed against acceleration near the star.

    Parameters
    ----------
    found : GroupFit
        Counted radii, arcsec.
    period : Measured or None
        Julian years.
    distance_pc : float or None
        To turn motions into speeds, pc.
    launch_radius : Sided or None
        Where dust condenses, arcsec.
    launch_time : Sided or None
        When the youngest cycle of the group was launched, Julian year.

    Returns
    -------
    ShellAcceleration or None
        None where there are too few radii, or errors are unknown.

    Notes
    -----
    Accuracy and source: see ``campaign.physics.shellacceleration``.
    """
    group, used = found.group, found.used
    if int(used.sum()) < _LEAST_RADII or not group.errors.known:
        return None
    several = group.images > 1 and group.dated
    known = None if period is None or not period.error_known else sided(period)
    if not several and known is None:
        # One image and no period: everything is per period.
        known, distance_pc, launch_time = Sided(1.0, 0.0, 0.0), None, None
    innermost = float(group.radius_arcsec[used].min())
    if launch_radius is not None and launch_radius.value >= innermost:
        launch_radius = None
    try:
        fit = fit_acceleration(
            group.time_yr[used], found.cycle[used], group.radius_arcsec[used], group.errors.only(used), known,
            launch_radius, launch_time,
        )  # fmt: skip
    except InputRefused:
        return None
    return _told(fit, found, distance_pc, in_years=several or period is not None)


def launch_radius_of(record: SystemRecord, distance: Measured | None) -> Sided | None:
    """Where the dust of a system condenses, on the sky.

    Parameters
    ----------
    record : SystemRecord
        For the condensation distance of its dust rule, au.
    distance : Measured or None
        Distance, pc.

    Returns
    -------
    Sided or None
        arcsec; None where one is not known, or not its error.

    Notes
    -----
    Accuracy: first order. Source: 1 au at 1 pc is 1 arcsec.
    """
    condensed = None if record.rule is None else record.rule.condensation_distance_au
    if condensed is None or distance is None or condensed.sigma is None or distance.sigma is None:
        return None
    value = condensed.value / distance.value
    sigma = value * float(np.hypot(condensed.sigma / condensed.value, distance.sigma / distance.value))
    return Sided(value, sigma, sigma)


def launch_time_of(ephemeris: ShellEphemeris | None, cycle: int | None) -> Sided | None:
    """When a cycle was launched, half the width of its window counted as error.

    Parameters
    ----------
    ephemeris : ShellEphemeris or None
        Launches of the system's cycles.
    cycle : int or None
        The system's own cycle (dimensionless).

    Returns
    -------
    Sided or None
        Julian year, yr.

    Notes
    -----
    Accuracy: draws. Source: DEVELOPERS.md (Shells).
    """
    launch = None if ephemeris is None or cycle is None else ephemeris.launch(cycle)
    if launch is None or launch.sigma_d is None or not np.isfinite(launch.median_d):
        return None
    sigma = launch.sigma_d / 365.25
    return Sided(years_of(launch.median_d), sigma, sigma)


def _told(
    fit: AccelerationFit, found: GroupFit, distance_pc: float | None, *, in_years: bool
) -> ShellAcceleration:
    group, used = found.group, found.used
    # The oldest shell of the latest image.
    latest = group.image[used] == group.image[used].max()
    place = int(np.argmax(np.where(latest, group.radius_arcsec[used], -1.0)))
    model = fit.accelerated

    def age(one: SpeedModel) -> tuple[float | None, float | None]:
        if not in_years:
            return None, None
        return none_if_nan(float(one.ages_yr[place])), none_if_nan(float(one.age_sigmas_yr[place]))

    def motion(pair: tuple[float, float]) -> tuple[float | None, float | None]:
        return none_if_nan(1000.0 * pair[0]), none_if_nan(1000.0 * pair[1])

    def speed(pair: tuple[float, float]) -> float | None:
        return None if distance_pc is None else none_if_nan(KMS_PER_AU_YR * pair[0] * distance_pc)

    constant, accelerated = age(fit.constant), age(model)
    launch, terminal = motion(model.launch_motion_arcsec_yr), motion(model.terminal_motion_arcsec_yr)
    return ShellAcceleration(
        verdict=fit.verdict,
        criterion=CRITERION,
        criterion_difference=fit.criterion_difference,
        statement=fit.statement,
        age_constant_yr=constant[0],
        age_constant_sigma_yr=constant[1],
        age_accelerated_yr=accelerated[0],
        age_accelerated_sigma_yr=accelerated[1],
        launch_radius_arcsec=none_if_nan(model.launch_radius_arcsec[0]),
        launch_radius_sigma_arcsec=none_if_nan(model.launch_radius_arcsec[1]),
        launch_motion_mas_yr=launch[0] if in_years else None,
        launch_motion_sigma_mas_yr=launch[1] if in_years else None,
        terminal_motion_mas_yr=terminal[0] if in_years else None,
        terminal_motion_sigma_mas_yr=terminal[1] if in_years else None,
        launch_speed_kms=speed(model.launch_motion_arcsec_yr) if in_years else None,
        terminal_speed_kms=speed(model.terminal_motion_arcsec_yr) if in_years else None,
    )
