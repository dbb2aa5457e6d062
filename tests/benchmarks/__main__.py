"""All benchmarks, one after the other: ``python -m tests.benchmarks``."""

from __future__ import annotations

from tests.benchmarks import outside_check, random_mixtures, speed

print("# Speed")
speed.main([])
print("\n# Outside check")
outside_check.main([])
print("\n# Random mixtures")
random_mixtures.main([])
