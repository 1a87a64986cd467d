"""An alarm as the user meets it: ``log`` and ``load`` say it at once, ``upcoming`` until it is decided."""

from __future__ import annotations

import json

import pytest


@pytest.fixture
def run(kept):
    """The program on Lantern 3; the result of a command that went well."""

    def go(*words):
        done = kept(*words)
        assert done.status == 0, done.err
        return done

    return go


@pytest.fixture
def quiet_nights(run, tmp_path):
    """Thirty quiet nights in K, loaded from a table."""
    table = tmp_path / "quiet.csv"
    lines = ["mjd_utc,mag,error"]
    lines += [f"{62_600 + 10 * i}.2,{7.5 + 0.02 * (-1) ** i:.2f},0.02" for i in range(30)]
    table.write_text("\n".join(lines) + "\n")
    loaded = run("load", str(table), "--system", "Lantern 3", "--constant", "band=K", "--json")
    assert json.loads(loaded.out)["data"]["suspected"] == []
    return tmp_path


def test_log_says_at_once_since_when_and_how_to_decide(run, quiet_nights):
    done = run("log", "photometry", "Lantern 3", "K=7.00±0.02", "--at", "MJD 62905.2")
    assert "onset suspected since 2031-02-08" in done.out
    assert "confirm it with: campaign episodes add 'Lantern 3' --onset" in done.out
    assert "or reject it with: campaign amend N --quality bad" in done.out


def test_load_says_it_too_and_programs_can_act_on_it(run, quiet_nights):
    table = quiet_nights / "new.csv"
    table.write_text("mjd_utc,mag,error\n62905.2,7.00,0.02\n62912.2,6.80,0.02\n62920.2,6.60,0.02\n")
    words = ("load", str(table), "--system", "Lantern 3", "--constant", "band=K")
    (found,) = json.loads(run(*words, "--json").out)["data"]["suspected"]
    assert (found["system"], found["points"], found["bands"]) == ("Lantern 3", 3, ["K"])
    assert found["since_utc"].startswith("2031-02-08")
    assert found["confirm"] == "campaign episodes find 'Lantern 3' --propose"
    # The same again brings nothing new, and no second alarm.
    assert json.loads(run(*words, "--json").out)["data"]["suspected"] == []


def test_the_system_stands_as_suspected_until_that_is_decided(run, quiet_nights):
    run("log", "photometry", "Lantern 3", "K=7.00±0.02", "--at", "MJD 62905.2")

    def suspected():
        told = json.loads(run("upcoming", "--as-of", "MJD 62960", "--json").out)
        return [one["system"] for one in told["data"]["suspected"]]

    assert suspected() == ["Lantern 3"]
    assert "Lantern 3: onset suspected since 2031-02-08" in run("upcoming", "--as-of", "MJD 62960").out
    run("episodes", "add", "Lantern 3", "--onset", "2031-02-05±3 d", "--band", "K")
    assert suspected() == []
