"""Figures: they show the numbers they are given, the same bytes every time, on any page."""

from __future__ import annotations

import re
import subprocess
import sys
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from xml.etree import ElementTree

import pytest

from generator import figures
from generator.cache import Cache
from generator.figures import FigureInput, Figures, alt_text, figure_input
from generator.metrics import Handbook
from generator.pictures import COLOURS, Line, Point, polarity_scale, ribbon

ROOT = Path(__file__).resolve().parents[2]
STYLE = (ROOT / "site_src" / "pages" / "assets" / "handbook.css").read_text(encoding="utf-8")
SVG = "{http://www.w3.org/2000/svg}"
# A made-up liquid: ε falls by a straight line from 40 at 0 °C to 20 at 50 °C.
LIQUID = FigureInput(
    slug="made-up",
    name="Made-up & <odd>",
    smiles="CC(C)=O",
    chosen=Point(298.15, 30.0, 0.5, ""),
    kirkwood=(29 / 61, 0.001),
    trend="falls",
    liquid=(263.15, 333.15),
    points=(Point(293.15, 32.0, 0.4, "one"), Point(303.15, 28.1, 0.4, "two")),
    lines=(
        Line("one", True, (273.15, 298.15, 323.15), (40.0, 30.0, 20.0)),
        Line("one", False, (323.15, 333.15), (20.0, 16.0)),
    ),
)
BARE = FigureInput("bare", "Bare", "C", None, None, "not known", (None, None), (), ())


def draw_all(inputs: Sequence[FigureInput], cache: Cache) -> dict[str, str]:
    """Every figure of some substances."""
    made = Figures({shown.slug: shown for shown in inputs}, cache)
    made.prepare([shown.slug for shown in inputs])
    return dict(made)


@pytest.fixture(scope="module")
def drawn() -> dict[str, str]:
    return draw_all([LIQUID, BARE], Cache(None))


def paths(svg: str, colour: str) -> list[ElementTree.Element]:
    return [p for p in ElementTree.fromstring(svg).iter() if f"s-{colour}" in p.get("class", "")]


def corners(path: ElementTree.Element) -> list[tuple[float, float]]:
    found = re.findall(r"(-?[\d.]+)[ ,](-?[\d.]+)", path.get("d") or path.get("points") or "")
    return [(float(x), float(y)) for x, y in found]


def scale_of(svg: str, axis: str) -> tuple[float, float]:
    """Offset and step of an axis [number, number per px], read from its labels."""
    side = "middle" if axis == "x" else "end"
    ticks = [
        (float((text.text or "").replace("−", "-")), float(text.get(axis, "")))
        for text in ElementTree.fromstring(svg).iter(f"{SVG}text")
        if re.fullmatch(r"−?[\d.]+", text.text or "") and text.get("text-anchor") == side
    ]
    (n0, p0), (n1, p1) = ticks[0], ticks[-1]
    step = (n1 - n0) / (p1 - p0)
    return n0 - step * p0, step


def test_curve_and_points_stand_where_their_numbers_say(drawn: dict[str, str]) -> None:
    svg = drawn["made-up"]
    (x0, dx), (_, dy) = scale_of(svg, "x"), scale_of(svg, "y")
    solid = next(p for p in paths(svg, "accent") if len(corners(p)) == 3)
    found = corners(solid)
    assert [x0 + dx * x for x, _ in found] == pytest.approx([0, 25, 50], abs=0.1)
    # Labels of the upright axis stand beside their lines: only differences can be read off.
    assert [dy * (y - found[0][1]) for _, y in found] == pytest.approx([0, -10, -20], abs=0.1)
    assert solid.get("stroke-dasharray") is None
    moved = re.findall(r'translate\(([\d.]+) ([\d.]+)\)" class="s-warm', svg)
    at = {round(x0 + dx * float(x), 1) for x, _ in moved}
    assert {20.0, 30.0} <= at


def test_extrapolated_part_is_broken(drawn: dict[str, str]) -> None:
    (x0, dx) = scale_of(drawn["made-up"], "x")
    ends = [
        x0 + dx * corners(p)[-1][0] for p in paths(drawn["made-up"], "accent")
        if p.get("stroke-dasharray") and len(corners(p)) == 2
    ]  # fmt: skip
    assert any(end == pytest.approx(60, abs=0.1) for end in ends)


def test_alternative_text_carries_the_numbers(drawn: dict[str, str]) -> None:
    text = alt_text(LIQUID)
    assert text == (
        "Relative permittivity of Made-up & <odd> against temperature: 30.00 ± 0.50 at 25 °C. "
        "It falls on warming, from 40.00 at 0 °C to 20.00 at 50 °C. Drawn broken, as "
        "extrapolated, up to 60 °C. 2 published points and 1 curve from 2 sources. "
        "Liquid range: −10 to 60 °C."
    )
    assert ElementTree.fromstring(drawn["made-up"]).get("aria-label") == text


def test_small_pictures_carry_their_numbers(drawn: dict[str, str]) -> None:
    scale = ElementTree.fromstring(drawn["made-up:scale"])
    assert "Kirkwood function of Made-up & <odd> 0.4754 ± 0.0010" in scale.get("aria-label", "")
    ribbon_label = ElementTree.fromstring(drawn["made-up:ribbon"]).get("aria-label", "")
    for part in ("−10 to 60 °C", "40.00 at 0 °C", "20.00 at 50 °C", "30.00 at the reference of 25"):
        assert part in ribbon_label


def test_nothing_known_draws_nothing_but_the_structure(drawn: dict[str, str]) -> None:
    assert {key for key in drawn if key.startswith("bare")} == {"bare:structure"}
    assert set(drawn) == {
        "made-up", "made-up:scale", "made-up:ribbon", "made-up:structure", "bare:structure",
    }  # fmt: skip


def test_mark_and_width_stand_on_the_scale() -> None:
    svg = polarity_scale(0.25, 0.05, (0.1, 0.2, 0.3), "label")
    needle, head = paths(svg, "accent")[0], re.search(r'd="M([\d.]+) 8l', svg)
    assert corners(needle)[0][0] == 100  # the middle of 5 to 195
    assert head is not None
    assert head[1] == "100"
    band = re.search(r'class="f-accent"[^>]*d="M([\d.]+) 6H([\d.]+)', svg)
    assert band is not None
    assert float(band[2]) - float(band[1]) == pytest.approx(2 * 0.05 / 0.5 * 190, abs=0.11)
    assert "M43 9H119" in svg  # the middle half of the handbook: 0.1 to 0.3
    beyond = polarity_scale(0.499, 0.1, (), "label")
    assert "H195V22" in beyond


def test_ribbon_spans_the_liquid_range_and_ticks_the_reference() -> None:
    svg = ribbon((263.15, 363.15), (313.15, 5.0), LIQUID.lines, LIQUID.points, ("", "", ""), "l")
    tick = paths(svg, "ink")[0]
    assert corners(tick)[0][0] == 100
    solid, broken = paths(svg, "accent")
    assert corners(solid)[0][0] == pytest.approx(5 + 0.1 * 190)
    assert solid.get("stroke-dasharray") is None
    assert broken.get("stroke-dasharray")
    # ε = 40 at the top, ε = 1 on the foot
    assert corners(solid)[0][1] < corners(solid)[-1][1] < 31


def test_ribbon_keeps_to_the_liquid_range() -> None:
    svg = ribbon((283.15, 303.15), (298.15, 30.0), LIQUID.lines, LIQUID.points, ("", "", ""), "l")
    (solid,) = paths(svg, "accent")
    places = [x for x, _ in corners(solid)]
    assert (places[0], places[-1]) == (5.0, 195.0)


@pytest.mark.parametrize(
    "changed",
    [
        {"liquid": (None, None)},
        {"lines": ()},
        {"lines": (), "points": ()},
        {"points": (), "chosen": None},
        {"chosen": Point(400.0, 1.5, 0.1, "")},
    ],
)
def test_gaps_in_the_data_are_no_trouble(changed: dict[str, object]) -> None:
    made = draw_all([replace(LIQUID, **changed)], Cache(None))  # type: ignore[arg-type]
    for svg in made.values():
        assert ElementTree.fromstring(svg).get("role") == "img"
        assert "nan" not in svg


def test_one_drawing_serves_light_dark_and_many_on_a_page(drawn: dict[str, str]) -> None:
    for key, svg in drawn.items():
        assert " id=" not in svg, key
        assert "url(" not in svg, key
        assert "<style" not in svg, key
        assert "DejaVu" not in svg, key
        assert "<metadata" not in svg, key
        if key.endswith(":structure"):
            continue
        for tag in re.findall(r"<(?:path|text|circle|polyline)[^>]*>", svg):
            for kind in ("stroke", "fill"):
                colour = re.search(rf' {kind}="(#\w+)"', tag)
                if colour is None:
                    continue
                name = next(n for n, c in COLOURS.items() if c == colour[1])
                assert f"{kind[0]}-{name}" in tag, (key, tag)
                assert f"svg .{kind[0]}-{name} {{ {kind}: var(" in STYLE, (key, name)
    assert ">Relative permittivity ε</text>" in drawn["made-up"]


def test_sources_differ_by_shape_and_curves_by_line_style() -> None:
    second = Line("two", True, (273.15, 323.15), (41.0, 21.0))
    svg = draw_all([replace(LIQUID, lines=(*LIQUID.lines, second))], Cache(None))["made-up"]
    markers = re.findall(r'<path d="([^"]+)" transform="translate[^>]*class="s-warm f-warm"', svg)
    assert len(set(markers)) == 2
    dashes = {p.get("stroke-dasharray") for c in ("accent", "warm") for p in paths(svg, c)}
    assert len(dashes) == 3  # whole, dots and dashes, extrapolated


def test_figures_are_the_same_bytes_in_any_order_and_process(drawn: dict[str, str]) -> None:
    others = [
        replace(LIQUID, slug=f"other-{i}", smiles="C" * (i + 1), chosen=Point(298.15, i + 9, 1, ""))
        for i in range(2 * figures._ALONE)
    ]
    apart = draw_all([*others, LIQUID], Cache(None))  # enough to start other processes
    for key in ("made-up", "made-up:structure"):
        assert apart[key] == drawn[key]
    again = figures._curve(others[0]), figures._curve(LIQUID)
    assert again == (apart["other-0"], drawn["made-up"])


def test_kept_figures_need_no_matplotlib_and_damaged_ones_are_drawn_again(tmp_path: Path) -> None:
    first = draw_all([LIQUID], Cache(tmp_path))
    script = (
        "import sys\n"
        "from pathlib import Path\n"
        "from generator.cache import Cache\n"
        "from generator.figures import FigureInput, Figures\n"
        "from generator.pictures import Line, Point\n"
        f"made = Figures({{'made-up': {LIQUID!r}}}, Cache(Path({str(tmp_path)!r})))\n"
        "made.prepare(['made-up'])\n"
        "assert 'matplotlib' not in sys.modules and 'rdkit' not in sys.modules\n"
        "sys.stdout.buffer.write(made['made-up'].encode())\n"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, check=True)
    assert done.stdout.decode() == first["made-up"]
    for entry in tmp_path.rglob("*"):
        if entry.is_file():
            entry.write_bytes(entry.read_bytes()[:-1] + b"?")
    assert draw_all([LIQUID], Cache(tmp_path)) == first


def test_a_changed_number_draws_anew(tmp_path: Path) -> None:
    cache = Cache(tmp_path)
    first = draw_all([LIQUID], cache)
    moved = draw_all([replace(LIQUID, chosen=Point(298.15, 31.0, 0.5, ""))], cache)
    assert moved["made-up"] != first["made-up"]
    assert moved["made-up:structure"] == first["made-up:structure"]


def test_inputs_hold_what_the_handbook_knows(handbook: Handbook) -> None:
    for slug in handbook.dataset.solvents:
        shown = figure_input(handbook, slug)
        value = handbook.at(slug, "relative_permittivity")
        assert (shown.chosen is None) == (value is None)
        if value is not None and shown.chosen is not None:
            assert shown.chosen.value == value.value
        low, high = shown.liquid
        curves = handbook.dataset.correlations_of(slug, "relative_permittivity")
        for line in shown.lines:
            ends = (line.temperatures[0], line.temperatures[-1])
            if line.solid and line.source:
                assert ends in {(c.t_min, c.t_max) for c in curves}
            elif not line.solid:  # no more than numbers are given for, and only of the liquid
                assert ends[1] - ends[0] <= 10 + 1e-9
                assert low is None or ends[0] >= low
                assert high is None or ends[1] <= high
        points = handbook.dataset.measurements_of(slug, "relative_permittivity")
        assert len(shown.points) == len(points)
        assert all(p.uncertainty > 0 for p in shown.points)
        assert hash(shown) == hash(figure_input(handbook, slug))
