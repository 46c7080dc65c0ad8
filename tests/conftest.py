"""What holds for every test: Qt without a screen unless one was given, property tests that repeat."""

import os

from hypothesis import settings

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

# the same examples on every machine and in every order; a first call may compile, so no time limit for one example
settings.register_profile("trundle", derandomize=True, deadline=None, database=None)
settings.load_profile("trundle")
