"""Profiles of the tests over random inputs: the one in use is loaded, others are refused in words."""

from __future__ import annotations

import pytest
from hypothesis import settings

from tests.profiles import FACTORS, PROFILE, costly, examples, profile_named


def test_the_profile_in_use_is_loaded_before_any_test():
    assert settings.default.deadline is None
    assert settings.default.max_examples == examples(60)
    assert settings.default.derandomize == costly().derandomize == (PROFILE == "ci")
    assert costly(5).max_examples == examples(5) == 5 * FACTORS[PROFILE]


def test_an_unknown_profile_is_refused_with_those_there_are():
    assert profile_named("long") == "long"
    with pytest.raises(ValueError, match="EVENLOAD_PROPERTIES is 'fast'; allowed: ci, long"):
        profile_named("fast")
