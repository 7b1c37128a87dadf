"""What all tests share: brokers of their own, and the reason when there is none."""

from collections.abc import Iterator

import pytest
from hypothesis import settings

from gateway.testing import Mosquitto, mosquitto_here

# The same examples every time, and no example is judged by how long it took. `--hypothesis-profile=search` seeks anew.
settings.register_profile("steady", derandomize=True, deadline=None)
settings.register_profile("search", max_examples=2_000, deadline=None)
settings.load_profile("steady")


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    """Skip, saying why, what only a mosquitto can show where there is none."""
    if mosquitto_here():
        return
    skip = pytest.mark.skip(reason="mosquitto is not on this machine (apt-get install mosquitto)")
    for item in items:
        if "mosquitto" in item.keywords:
            item.add_marker(skip)


@pytest.fixture
def mosquitto() -> Iterator[Mosquitto]:
    """Run a mosquitto of the test's own. Mark the test with `mosquitto`."""
    with Mosquitto() as broker:
        yield broker
