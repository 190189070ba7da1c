"""Compiled templates, kept: otherwise half of what a small edit costs."""

from __future__ import annotations

from jinja2.bccache import Bucket, BytecodeCache

from generator.cache import Cache

_KIND = "template"


class Compiled(BytecodeCache):
    """What Jinja makes of templates; Jinja looks whether the source is still the same."""

    def __init__(self, cache: Cache) -> None:
        self._cache = cache

    def load_bytecode(self, bucket: Bucket) -> None:
        """Take a compiled template from the cache."""
        kept = self._cache.get(_KIND, bucket.key)
        if kept is not None:
            bucket.bytecode_from_string(kept)

    def dump_bytecode(self, bucket: Bucket) -> None:
        """Keep a template that has just been compiled."""
        self._cache.put(_KIND, bucket.key, bucket.bytecode_to_string())
