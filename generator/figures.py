"""Figures: what each must show as plain numbers, then SVG text, kept by content hash.

The only module that knows matplotlib, which is imported when a figure has to be drawn and not
before: a build in which every figure is kept never loads it.
"""

from __future__ import annotations

import statistics
from collections.abc import Callable, Iterator, Mapping, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from functools import lru_cache
from importlib.metadata import version
from itertools import batched, chain
from multiprocessing import get_context
from pathlib import Path
