from __future__ import annotations

import pytest

from campaign.studies.sample import sample_package


@pytest.fixture(scope="session")
def package():
    return sample_package()


@pytest.fixture(scope="session")
def sample(package):
    return package.make_sample()


@pytest.fixture(scope="session")
def observations(sample):
    return sample.observations()
