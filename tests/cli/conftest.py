"""Invented ledgers in place of a real audit, so that the command line is tested by itself."""

import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parents[1] / "report"))  # the invented ledgers live beside the reports' tests


@pytest.fixture
def asked(monkeypatch) -> dict:
    """What the command asked of `haloledger.audit.audit`; the answer is invented, two bursts and one refused row."""
    from synthetic import ledgers

    import haloledger.audit  # noqa: F401  # the module, also where the package has a function of that name

    call: dict = {}

    def invented(**given):
        call.update(given)
        return call.get("answer") or ledgers()

    monkeypatch.setattr(sys.modules["haloledger.audit"], "audit", invented)
    return call
