"""Compiled loops: arrays and scalars in, arrays out; they know nothing of physics objects."""

from .cache import prepare as _prepare

_prepare()
