"""No time limit per generated example: other work may share the machine."""

from hypothesis import settings

settings.register_profile("formats", deadline=None)
settings.load_profile("formats")
