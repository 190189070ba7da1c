"""The accuracy the methods page states, worked out again from the numbers themselves."""

import math
import re
from pathlib import Path

import numpy as np
import pytest

from generator import accuracy, modelfigures
from generator.cache import Cache
from generator.metrics import Handbook


@pytest.fixture(scope="module")
def found(handbook: Handbook) -> dict[str, accuracy.Comparison]:
    return {c.key: c for c in accuracy.comparisons(handbook)}


def test_the_three_models_are_compared(found: dict[str, accuracy.Comparison]) -> None:
    assert list(found) == ["onsager", "refraction", "moments"]
    assert all(
        math.isfinite(x) for c in found.values() for k in c.clouds for p in k.points for x in p
    )


def test_refraction_agrees_within_about_one_percent(found: dict[str, accuracy.Comparison]) -> None:
    """On published liquids the additive refraction meets the measured one within about 1 %."""
    points = found["refraction"].clouds[0].points
    middle, spread = accuracy.deviation(points)
    assert len(points) > 180
    assert abs(middle) < 0.01
    assert spread < 0.015
    assert f"robust spread of {100 * spread:.1f} %" in found["refraction"].words


def test_onsager_holds_for_liquids_that_do_not_associate(
    found: dict[str, accuracy.Comparison],
) -> None:
    plain, associated = found["onsager"].clouds
    middle, _ = accuracy.deviation(plain.points)
    assert abs(middle) < 0.10
    # Parallel dipoles raise the permittivity of most associated liquids above the equation.
    assert accuracy.deviation(associated.points)[0] < -0.3


def test_moments_are_those_of_left_out_molecules(found: dict[str, accuracy.Comparison]) -> None:
    points = np.array(found["moments"].clouds[0].points)
    rmse = float(np.sqrt(np.mean((points[:, 1] - points[:, 0]) ** 2)))
    assert f"root mean square error {rmse:.2f} D" in found["moments"].words


def test_deviation() -> None:
    assert accuracy.deviation([(1.0, 1.1), (2.0, 2.2), (4.0, 4.4)]) == pytest.approx((0.1, 0.0))
    middle, spread = accuracy.deviation([(1.0, 0.9), (1.0, 1.0), (1.0, 1.2)])
    assert middle == pytest.approx(0.0)
    assert spread == pytest.approx(0.14826)


def test_figures_hold_every_point_and_come_out_the_same(
    found: dict[str, accuracy.Comparison], tmp_path: Path
) -> None:
    shown = found["onsager"]
    cache = Cache(tmp_path)
    first = modelfigures.draw([shown], cache)["accuracy:onsager"]
    assert first == modelfigures.draw([shown], Cache(None))["accuracy:onsager"]
    assert first == modelfigures.draw([shown], cache)["accuracy:onsager"]
    points = sum(len(cloud.points) for cloud in shown.clouds)
    # Every point and one mark for each cloud in the legend.
    assert len(re.findall(r"translate\(", first)) == points + len(shown.clouds)
    assert "predicted against measured" in first
    assert " id=" not in first
