from __future__ import annotations

import pytest


@pytest.fixture(autouse=True)
def own_cache(tmp_path, monkeypatch):
    """No test reads or writes the user's cache."""
    monkeypatch.setenv("WAVEJOB_CACHE", str(tmp_path / "cache"))
