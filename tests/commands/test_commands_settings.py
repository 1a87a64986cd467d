"""Option over environment over default, read only when asked."""

import os
import subprocess
import sys
from pathlib import Path

from campaign.settings import database_location, observer_name, traceback_wanted

ROOT = Path(__file__).resolve().parents[2]


def test_the_database_is_where_the_option_says_then_the_environment():
    assert database_location("here.db", {"CAMPAIGN_DB": "there.db"}) == "here.db"
    assert database_location(None, {"CAMPAIGN_DB": "postgresql://h/d"}) == "postgresql://h/d"


def test_the_database_is_in_the_users_data_folder_by_default(monkeypatch):
    monkeypatch.setenv("XDG_DATA_HOME", "/some/where")
    assert database_location(None, {}) == "/some/where/campaign/campaign.db"
    assert database_location("", {"CAMPAIGN_DB": ""}) == "/some/where/campaign/campaign.db"


def test_the_observer_is_the_option_then_the_environment_then_the_login_name():
    environ = {"CAMPAIGN_OBSERVER": "Vane", "USER": "login"}
    assert observer_name("Orrel", environ) == "Orrel"
    assert observer_name(None, environ) == "Vane"
    assert observer_name(None, {"USER": "login"}) == "login"
    assert observer_name(None, {}) != ""


def test_a_machine_that_knows_no_name_is_no_error(monkeypatch):
    monkeypatch.setattr("os.getuid", lambda: 2_000_000_123)
    assert observer_name(None, {}) == "unknown"


def test_a_traceback_is_shown_only_when_asked_for():
    assert not traceback_wanted(False, {})
    assert not traceback_wanted(False, {"CAMPAIGN_TRACEBACK": "0"})
    assert traceback_wanted(True, {})
    assert traceback_wanted(False, {"CAMPAIGN_TRACEBACK": "1"})


def test_nothing_is_read_at_import():
    code = (
        "import os\n"
        "class Closed(dict):\n"
        "    def __getitem__(self, key): raise AssertionError(key)\n"
        "    get = __contains__ = __getitem__\n"
        "os.environ = Closed()\n"
        "import campaign.settings\n"
        "import sys; print('platformdirs' in sys.modules)"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], env={"PYTHONPATH": str(ROOT), "PATH": os.environ["PATH"]},
        capture_output=True, text=True, check=True,
    )  # fmt: skip
    assert done.stdout == "False\n"
