from __future__ import annotations

import pytest


@pytest.fixture(scope="session")
def shared_cache(tmp_path_factory):
    return tmp_path_factory.mktemp("cache")


@pytest.fixture(autouse=True)
def own_cache(shared_cache, monkeypatch):
    """What FFTW learns is kept between these tests, and out of the user's cache."""
    monkeypatch.setenv("WAVEJOB_CACHE", str(shared_cache))
