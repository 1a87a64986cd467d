"""``campaign upgrade``."""

from __future__ import annotations

from campaign.commands import common
from campaign.commands.common import DbOption, JsonOption, QuietOption


def upgrade(db: DbOption = None, json: JsonOption = False, quiet: QuietOption = False) -> None:
    """Bring an older database up to date, after a snapshot."""
    from campaign.studies import begin as study

    common.report(study.upgrade_campaign(common.database(db)), json=json, quiet=quiet)
