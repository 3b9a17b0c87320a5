"""Shared by all tests: lets asserts in the helper modules explain themselves."""

import pytest

pytest.register_assert_rewrite("broken")
