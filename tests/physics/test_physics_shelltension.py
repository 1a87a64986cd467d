"""The reasons that are given for high tensions."""

from __future__ import annotations

from campaign.physics.shellrelations import ShellInput, solve_shell_relations
from campaign.physics.shelltension import likely_reasons
from campaign.physics.shellunits import motion_mas_yr


def stated(quantity, value, relative, label="given", compare_only=False):
    return ShellInput(quantity, value, value * relative, value * relative, label, compare_only)


def reasons_of(inputs, quantity, **context):
    solution = solve_shell_relations(inputs, draws=50)
    found = likely_reasons(solution.tensions, **context)
    return [
        reasons
        for each, reasons in zip(solution.tensions, found, strict=True)
        if each.quantity == quantity and each.determined_from != each.against
    ]


def test_a_doubled_spacing_is_a_wrong_cycle_count():
    (reasons,) = reasons_of(
        [
            stated("spacing_arcsec", 1.6, 0.01),
            stated("proper_motion_mas_yr", 80.0, 0.02),
            stated("period_yr", 10.0, 0.01, "orbit"),
        ],
        "period_yr",
    )
    assert reasons[0].startswith("wrong cycle count")
    assert "2/1" in reasons[0] and "every second shell" in reasons[0]
    assert not any("distance" in reason for reason in reasons)


def test_one_shell_missing_among_six_steps_is_a_wrong_cycle_count():
    # Six steps counted where there are seven: the spacing, and the period with it, is 7/6 too large.
    (reasons,) = reasons_of(
        [
            stated("spacing_arcsec", 0.8 * 7 / 6, 0.01),
            stated("proper_motion_mas_yr", 80.0, 0.01),
            stated("period_yr", 10.0, 0.01, "orbit"),
        ],
        "period_yr",
        shells=6,
    )
    assert "7 steps for 6" in reasons[0]


def test_a_motion_that_is_too_slow_may_be_projected():
    true = float(motion_mas_yr(2000.0, 2000.0))
    inputs = [
        stated("proper_motion_mas_yr", 0.7 * true, 0.02),
        stated("speed_kms", 2000.0, 0.03, "wind", True),
        stated("distance_pc", 2000.0, 0.03),
    ]
    (reasons,) = reasons_of(inputs, "speed_kms", feature="plume")
    assert reasons[0].startswith("projection") and "plume" in reasons[0]
    assert any("terminal speed of a wind" in reason for reason in reasons)
    assert any(reason.startswith("distance") for reason in reasons)
    # A limb shows the true motion.
    (reasons,) = reasons_of(inputs, "speed_kms", feature="limb")
    assert not any("projection" in reason for reason in reasons)


def test_a_motion_that_is_too_fast_is_no_projection():
    true = float(motion_mas_yr(2000.0, 2000.0))
    (reasons,) = reasons_of(
        [
            stated("proper_motion_mas_yr", 1.4 * true, 0.02),
            stated("speed_kms", 2000.0, 0.03, "given", True),
            stated("distance_pc", 2000.0, 0.03),
        ],
        "speed_kms",
    )
    assert not any("projection" in reason for reason in reasons)
    assert reasons[0].startswith("acceleration")


def test_a_distance_is_suspected_when_the_period_without_it_agrees():
    true = float(motion_mas_yr(2000.0, 2000.0))
    reasons = reasons_of(
        [
            stated("spacing_arcsec", true * 10.0 / 1000.0, 0.01),
            stated("proper_motion_mas_yr", true, 0.02),
            stated("period_yr", 10.0, 0.01, "orbit"),
            stated("speed_kms", 2000.0, 0.03),
            stated("distance_pc", 2600.0, 0.02, "catalogue"),
        ],
        "distance_pc",
    )
    assert reasons and all(any("without a distance agrees" in text for text in each) for each in reasons)


def test_acceleration_that_was_found_is_named_as_found():
    (reasons,) = reasons_of(
        [
            stated("spacing_arcsec", 1.0, 0.01),
            stated("proper_motion_mas_yr", 80.0, 0.02),
            stated("period_yr", 10.0, 0.01, "orbit"),
        ],
        "period_yr",
        verdict="accelerated",
    )
    assert any("the radii show it" in reason for reason in reasons)


def test_two_sources_of_one_value_are_simply_at_odds():
    solution = solve_shell_relations(
        [stated("distance_pc", 2000.0, 0.02, "typed"), stated("distance_pc", 2600.0, 0.02, "catalogue")]
    )
    ((reason,),) = likely_reasons(solution.tensions)
    assert "two sources state the distance differently" in reason


def test_what_agrees_asks_for_no_reason():
    (reasons,) = reasons_of(
        [
            stated("spacing_arcsec", 0.81, 0.02),
            stated("proper_motion_mas_yr", 80.0, 0.02),
            stated("period_yr", 10.0, 0.01, "orbit"),
        ],
        "period_yr",
    )
    assert reasons == ()
