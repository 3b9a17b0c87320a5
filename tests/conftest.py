"""Shared by all tests: lets asserts in the helper modules explain themselves."""

import os

import pytest
from hypothesis import settings

pytest.register_assert_rewrite("broken", "staging")

# The same examples in every run: what fails here fails for everybody.  `HYPOTHESIS_PROFILE=wide`
# looks for new ones.
settings.register_profile("steady", derandomize=True, database=None)
settings.register_profile("wide")
settings.load_profile(os.environ.get("HYPOTHESIS_PROFILE", "steady"))
