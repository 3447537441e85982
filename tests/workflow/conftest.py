"""Fixtures of the workflow tests: one finished campaign, and fresh ones."""

import pytest
from scission.execution.layout import PROJECT
from small_campaign import Campaign


@pytest.fixture
def campaign(tmp_path):
    """A campaign that never ran."""
    return Campaign(tmp_path)


@pytest.fixture(scope="session")
def finished(tmp_path_factory):
    """A campaign that has been run once, undisturbed; not to be changed."""
    campaign = Campaign(tmp_path_factory.mktemp("finished"))
    campaign.process = campaign.run()
    return campaign


@pytest.fixture
def project():
    """The project's folder."""
    return PROJECT
