"""How many examples tests over random inputs take, and whether they are the same in every run.

``ci``    the default: the same examples in every run, few enough for every change
``long``  on demand: ``EVENLOAD_PROPERTIES=long``: other examples in every run, ``FACTORS["long"]`` times as many; what
          fails is kept in ``.hypothesis`` and tried first by the next long run

Tests state their number with ``examples(count)`` or take that of the profile.
"""

from __future__ import annotations

import os

from hypothesis import HealthCheck, Phase, settings

__all__ = ["FACTORS", "PROFILE", "costly", "examples", "profile_named"]

#: profile -> times as many examples
FACTORS = {"ci": 1, "long": 20}
VARIABLE = "EVENLOAD_PROPERTIES"


def profile_named(name: str) -> str:
    """Return the name of a profile, or say which there are."""
    if name not in FACTORS:
        message = f"{VARIABLE} is {name!r}; allowed: {', '.join(FACTORS)}"
        raise ValueError(message)
    return name


PROFILE = profile_named(os.environ.get(VARIABLE, "ci"))


def examples(count: int) -> int:
    """Return the number of examples in the profile in use of a test that takes ``count`` in every run."""
    return count * FACTORS[PROFILE]


settings.register_profile(
    "ci", deadline=None, max_examples=examples(60), derandomize=True, suppress_health_check=[HealthCheck.too_slow]
)
settings.register_profile(
    "long", deadline=None, max_examples=examples(60), print_blob=True, suppress_health_check=[HealthCheck.too_slow]
)
settings.load_profile(PROFILE)


def costly(count: int = 8) -> settings:
    """Return settings of a test that compares whole studies: few examples, and a failing one is not made simpler.

    Making a failing comparison simpler takes minutes.
    """
    return settings(
        max_examples=examples(count),
        suppress_health_check=list(HealthCheck),
        phases=(Phase.explicit, Phase.reuse, Phase.generate),
    )
