"""Examples drawn by hypothesis are the same in every run, so that a change alone can turn a test red.

``--hypothesis-profile=wide`` draws others, to look for more.
"""

from __future__ import annotations

from hypothesis import settings

settings.register_profile("steady", derandomize=True)
settings.register_profile("wide", derandomize=False)
settings.load_profile("steady")
