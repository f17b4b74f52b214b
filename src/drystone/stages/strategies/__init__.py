"""Strategies: each one small file with a ``fill`` function, and one line in the registry.

The registry holds module names, not modules, so that a step depends on the code of its own
strategy only.
"""

from __future__ import annotations

from drystone.words import strategies

REGISTRY: dict[str, str] = {
    strategies.COMPLETE_CASES: "drystone.stages.strategies.complete_cases",
    strategies.MISSING_CASES: "drystone.stages.strategies.missing_cases",
    strategies.ALL_CASES: "drystone.stages.strategies.all_cases",
}
