"""Pages: what they say agrees with the numbers, every link leads somewhere, nothing is fetched."""

from __future__ import annotations

import dataclasses
import itertools
import json
import posixpath
import re
from html.parser import HTMLParser
from pathlib import Path
from urllib.parse import unquote, urlsplit

import pytest
from jinja2 import Environment, FileSystemLoader, nodes

from generator import pages
from generator.catalogue import catalogue, sorting_name
from generator.contexts import CAUTION, Datasheet, Foot
from generator.datasheet import COMPARED, datasheet
from generator.errors import Problem
from generator.metrics import Handbook, compute
from generator.pages import Page, headings, render_all
from generator.polarity_map import Axis, Point, polarity_map
from generator.quantities import QUANTITIES
from generator.structures import molecule
from generator.wording import split_value

ROOT = Path(__file__).resolve().parents[2]
TEMPLATES = ROOT / "generator" / "templates"
FINDING = Problem(
    "measurements.csv", 2, "value", "sources-disagree", "-3.5 degC <here>", "about -2 degC",
    "look it up", severity="suspect",
)  # fmt: skip
OVERVIEWS = {
    "index.md", "changes.md", "review.md", "methods.md", "sources.md", "data-dictionary.md",
    "downloads.md",
    "compare.md",
    "tables/reference.md", "tables/permittivity.md", "tables/temperature-coefficients.md",
    "tables/association.md", "tables/isomers.md",
}  # fmt: skip
# Where the rest of the build puts files that pages lead to.
ELSEWHERE = ("downloads/",)


@pytest.fixture(scope="module")
def made(handbook: Handbook) -> tuple[Page, ...]:
    figures = {"water": "<svg><title>curve of water</title></svg>"}
    return render_all(catalogue(handbook, (FINDING,)), handbook.settings, figures)


@pytest.fixture(scope="module")
def by_path(made: tuple[Page, ...]) -> dict[str, Page]:
    return {page.path: page for page in made}


def sheet_of(handbook: Handbook, slug: str, *findings: Problem) -> Datasheet:
    return datasheet(catalogue(handbook, findings), slug, {}, Foot("Laboratory", "rev"))


def text_of(page: Page) -> str:
    return " ".join(re.sub(r"<[^>]+>", " ", page.html).split())


class _Scan(HTMLParser):
    """Ids, links and everything that would make a browser fetch something."""

    def __init__(self, body: str) -> None:
        super().__init__()
        self.ids: list[str] = []
        self.links: list[str] = []
        self.fetched: list[str] = []
        self.open: list[str] = []
        self.wrong: list[str] = []
        self.tags: dict[str, int] = {}
        self.feed(body)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags[tag] = self.tags.get(tag, 0) + 1
        given = dict(attrs)
        if given.get("id"):
            self.ids.append(str(given["id"]))
        if tag == "a" and given.get("href"):
            self.links.append(str(given["href"]))
        if tag in {"script", "img", "link", "iframe", "use", "image", "style"}:
            address = given.get("src") or given.get("href") or given.get("xlink:href")
            if address:
                self.fetched.append(address)
        if tag not in {"br", "img", "input", "meta", "link", "hr", "wbr"}:
            self.open.append(tag)

    def handle_endtag(self, tag: str) -> None:
        if not self.open or self.open[-1] != tag:
            self.wrong.append(f"</{tag}> closes {self.open[-3:]}")
        else:
            self.open.pop()


@pytest.fixture(scope="module")
def scanned(made: tuple[Page, ...]) -> dict[str, _Scan]:
    return {page.path: _Scan(page.html) for page in made}


def test_every_substance_and_every_overview_has_a_page(
    by_path: dict[str, Page], made: tuple[Page, ...], handbook: Handbook
) -> None:
    sheets = {f"solvents/{slug}.md" for slug in handbook.dataset.solvents}
    assert set(by_path) == sheets | OVERVIEWS
    assert len(made) == len(by_path)


def test_markup_is_balanced_with_one_h1_and_no_id_twice(scanned: dict[str, _Scan]) -> None:
    for path, scan in scanned.items():
        assert not scan.wrong, (path, scan.wrong[:3])
        assert not scan.open, (path, scan.open)
        assert scan.tags["h1"] == 1, path
        assert len(scan.ids) == len(set(scan.ids)), path


def test_every_link_is_relative_and_leads_somewhere(scanned: dict[str, _Scan]) -> None:
    for path, scan in scanned.items():
        for link in scan.links:
            parts = urlsplit(link)
            if parts.scheme:
                assert link.startswith("https://doi.org/"), (path, link)
                continue
            assert not link.startswith("/"), (path, link)
            target = posixpath.normpath(posixpath.join(posixpath.dirname(path), parts.path))
            target = path if not parts.path else target
            if target.startswith(ELSEWHERE):
                continue
            source = target.removesuffix(".html") + ".md" if target != path else path
            assert source in scanned, (path, link)
            if target == "compare.html" and parts.fragment:  # its fragment names substances
                sheets = {f"solvents/{slug}.md" for slug in parts.fragment.split("+")}
                assert sheets <= set(scanned), (path, link)
                assert len(sheets) <= COMPARED, (path, link)
            elif parts.fragment:
                assert unquote(parts.fragment) in scanned[source].ids, (path, link)


def test_no_page_fetches_anything(scanned: dict[str, _Scan]) -> None:
    fetched = {path: scan.fetched for path, scan in scanned.items() if scan.fetched}
    assert not fetched


def test_styles_and_scripts_fetch_nothing() -> None:
    files = [*(ROOT / "site_src").rglob("*.css"), *(ROOT / "site_src").rglob("*.js")]
    assert files
    for file in files:
        text = file.read_text(encoding="utf-8")
        assert not re.search(
            r"https?://(?!www\.w3\.org)|@import|url\(|fetch\(|new XMLHttp", text
        ), file


def test_contents_match_the_headings(by_path: dict[str, Page], scanned: dict[str, _Scan]) -> None:
    for path, page in by_path.items():
        assert page.toc[0][0] == 1
        assert {anchor for _, anchor, _ in page.toc} <= set(scanned[path].ids)
        assert all(text for _, _, text in page.toc)
    assert (3, "kirkwood-function", "Kirkwood function") in by_path["methods.md"].toc


def test_first_screen_gives_the_numbers_of_the_handbook(
    by_path: dict[str, Page], handbook: Handbook
) -> None:
    for slug, solvent in handbook.dataset.solvents.items():
        text = text_of(by_path[f"solvents/{slug}.md"])
        assert f"{solvent.cas}" in by_path[f"solvents/{slug}.md"].title
        value = handbook.at(slug, "relative_permittivity")
        if value is not None:
            digits, own = split_value(value.value, value.uncertainty, 2)
            assert f"{digits} ± {own}" in text, slug
    water = text_of(by_path["solvents/water.md"])
    assert "Is it polar? Polar" in water
    assert "Falls on warming" in water


def test_metric_table_holds_every_listed_value(
    by_path: dict[str, Page], handbook: Handbook
) -> None:
    body = by_path["solvents/acetonitrile.md"].html
    shown = re.findall(r'data-v="([^"]+)"', body)
    for quantity in QUANTITIES.values():
        if not quantity.needs_temperature:
            continue
        for value in handbook.series("acetonitrile", quantity.key):
            if value is not None:
                assert f"{value.value:.7g}" in shown, quantity.key


def test_marks_of_numbers_are_explained_on_the_page(made: tuple[Page, ...]) -> None:
    for page in made:
        bare, legends = re.subn(r'<p class="legend">.*?</p>', "", page.html)
        used = set("".join(re.findall(r'<sup class="mark">(\w+)</sup>', bare)))
        legend = "".join(re.findall(r'<p class="legend">.*?</p>', page.html))
        explained = set(re.findall(r'<sup class="mark">(\w)</sup>', legend))
        assert used <= explained, page.path
        assert legends or not used, page.path
    assert used  # the last page is a datasheet


def test_every_row_of_the_tables_is_shown_with_what_became_of_it(
    by_path: dict[str, Page], handbook: Handbook
) -> None:
    dataset = handbook.dataset
    for row in dataset.measurements:
        if row.solvent in dataset.solvents:
            assert (
                f"measurements.csv, line {row.line}<" in by_path[f"solvents/{row.solvent}.md"].html
            )
    excluded = [c for c in dataset.corrections if c.action == "exclude"]
    assert excluded
    for correction in excluded:
        sheet = sheet_of(handbook, correction.solvent)
        rows = [row for group in sheet.measured for row in group.rows]
        left_out = [r for r in rows if r.status == "left out" and r.reason == correction.reason]
        curves = [c for c in sheet.curves if c.status == f"left out: {correction.reason}"]
        assert left_out or curves, correction


def test_a_finding_stands_on_its_sheet_and_in_the_list(
    by_path: dict[str, Page], handbook: Handbook
) -> None:
    owner = next(m.solvent for m in handbook.dataset.measurements if m.line == FINDING.line)
    body = by_path[f"solvents/{owner}.md"].html
    assert "−3.5 °C &lt;here&gt; (expected: about −2 °C)" in body
    assert f'href="../review.html#finding-{owner}-1"' in body
    review = by_path["review.md"].html
    assert f'id="finding-{owner}-1"' in review
    assert f'href="solvents/{owner}.html"' in review


def test_finder_index_is_complete_and_safe(by_path: dict[str, Page], handbook: Handbook) -> None:
    found = re.search(r'id="finder-index">(.*?)</script>', by_path["index.md"].html, re.DOTALL)
    assert found is not None
    assert "<" not in found[1]
    names, *rows = json.loads(found[1])
    entries = [dict(zip(names, row, strict=True)) for row in rows]
    assert {e["c"] for e in entries} == {s.cas for s in handbook.dataset.solvents.values()}
    assert {f"solvents/{e['u']}.md" for e in entries} <= set(by_path)
    families = set(re.findall(r'<option value="(family-[^"]+)"', by_path["index.md"].html))
    assert {e["g"] for e in entries} == families


def test_search_text_has_plain_formula_cas_and_synonyms(by_path: dict[str, Page]) -> None:
    page = by_path["solvents/dimethyl-sulfoxide.md"]
    assert page.search_title == "Dimethyl sulfoxide 67-68-5"
    for wanted in ("67-68-5", "C2H6OS", "DMSO", "IAZDPXIOMUYVGZ-UHFFFAOYSA-N"):
        assert wanted in page.search_text
    assert "<" not in page.search_text


def test_every_page_carries_caution_and_revision(
    made: tuple[Page, ...], handbook: Handbook
) -> None:
    for page in made:
        assert CAUTION.replace("'", "&#39;") in page.html, page.path
        slug = page.path.removeprefix("solvents/").removesuffix(".md")
        revision = handbook.dataset.revisions.get(slug, handbook.dataset.revision)
        assert f"<code>{revision[:8]}</code>" in page.html, page.path
        assert "Uncontrolled when printed." in page.html, page.path


def test_hand_written_pages_get_the_same_caution() -> None:
    theme = (ROOT / "site_src" / "theme" / "main.html").read_text(encoding="utf-8")
    assert CAUTION in theme
    assert "Uncontrolled when printed." in theme


def test_figure_is_shown_with_words_for_those_who_do_not_see_it(by_path: dict[str, Page]) -> None:
    water = by_path["solvents/water.md"].html
    assert "curve of water" in water
    assert "Relative permittivity of Water against temperature: 87" in text_of(
        by_path["solvents/water.md"]
    )


def test_pages_are_the_same_every_time(made: tuple[Page, ...], handbook: Handbook) -> None:
    figures = {"water": "<svg><title>curve of water</title></svg>"}
    assert render_all(catalogue(handbook, (FINDING,)), handbook.settings, figures) == made


def test_isomers_stand_side_by_side(by_path: dict[str, Page]) -> None:
    text = text_of(by_path["tables/isomers.md"])
    for pair in ("cis-1,2-Dichloroethylene, trans-1,2-Dichloroethylene", "o-Xylene, p-Xylene"):
        assert pair in text
    assert "../tables/isomers.html#isomers-" in by_path["solvents/o-xylene.md"].html


def test_a_name_with_markup_in_it_is_only_text(handbook: Handbook) -> None:
    name = 'Evil <script>alert("1")</script> & co'
    dataset = handbook.dataset
    solvents = dict(itertools.islice(dataset.solvents.items(), 12))
    solvents["water"] = dataclasses.replace(
        solvents["water"], name=name, synonyms=("</script><b>",), note="<i>"
    )
    changed = compute(dataclasses.replace(dataset, solvents=solvents), handbook.settings)
    for page in render_all(catalogue(changed, ()), handbook.settings, {}):
        assert "<script>alert" not in page.html, page.path
        assert "</script><b>" not in page.html, page.path
        assert not _Scan(page.html).wrong, page.path


def test_a_substance_without_data_still_has_a_sheet(handbook: Handbook) -> None:
    class Empty:
        """A handbook in which nothing is known of any substance but its identity."""

        def __getattr__(self, name: str) -> object:
            return getattr(handbook, name)

        def at(self, solvent: str, key: str, temperature: float | None = None) -> None:
            return None

        def series(self, solvent: str, key: str) -> tuple[None, ...]:
            return tuple(None for _ in handbook.temperatures)

        def expected_trend(self, solvent: str) -> None:
            return None

        def is_polar(self, solvent: str) -> str:
            return "not known"

    book = dataclasses.replace(catalogue(handbook, ()), handbook=Empty())  # type: ignore[arg-type]
    sheet = datasheet(book, "acetone", {}, Foot("Laboratory", "rev"))
    body = pages._datasheet_page(sheet).html
    assert "not known" in body
    assert "No permittivity on record for the liquid." in body
    assert not _Scan(body).wrong


# What the datasheet template may see. A change here is a change of the template's contract.
DATASHEET_KEYS = [
    "slug", "name", "cas", "family", "family_link", "formula", "formula_plain", "molar_mass",
    "synonyms", "smiles", "inchi", "inchikey", "note", "structure", "reference",
    "own_reference", "own_reference_c", "permittivity", "polar_key", "polar", "polar_reason",
    "trend", "notices", "scale", "ribbon", "figure", "figure_text", "control", "liquid_range",
    "key_values", "value_marks", "temperatures", "reference_column", "metrics",
    "metric_columns", "metric_marks", "ways", "measured", "curves", "handling", "containers",
    "isomers", "isomers_href", "swaps", "swaps_total", "compare_href", "compare_isomers_href",
    "compare_swaps_href", "flash_class", "flash_class_link", "quotation", "csv_href",
    "measurements_href", "correlations_href", "json_ld", "history", "citations", "foot",
]  # fmt: skip


def test_context_keys_are_pinned_and_used() -> None:
    assert [f.name for f in dataclasses.fields(Datasheet)] == DATASHEET_KEYS
    template = (TEMPLATES / "datasheet.html.j2").read_text(encoding="utf-8")
    used = set(re.findall(r"\bs\.(\w+)", template))
    # Used by the search text and the addresses, not by the template.
    assert set(DATASHEET_KEYS) - used == {"slug", "formula_plain", "reference"}


def test_templates_do_no_arithmetic() -> None:
    environment = Environment(loader=FileSystemLoader(TEMPLATES))
    sums = (nodes.Add, nodes.Sub, nodes.Mul, nodes.Div, nodes.FloorDiv, nodes.Mod, nodes.Pow)
    templates = list(TEMPLATES.glob("*.j2"))
    assert templates
    for file in templates:
        tree = environment.parse(file.read_text(encoding="utf-8"))
        assert not list(tree.find_all(sums)), file.name


def test_headings_are_read_with_their_short_names() -> None:
    body = '<h1 id="top">A <sub>2</sub></h1><h2>no id</h2><h3 id="x" data-toc="X">X / nm</h3>'
    assert headings(body) == ((1, "top", "A 2"), (3, "x", "X"))


@pytest.mark.parametrize(
    ("name", "place"),
    [
        ("2-Butanone", "butanone"),
        ("cis-1,2-Dichloroethylene", "dichloroethylene"),
        ("N,N-Dimethylformamide", "dimethylformamide"),
        ("tert-Butyl methyl ether", "butyl methyl ether"),
        ("alpha-Pinene", "pinene"),
        ("m-Xylene", "xylene"),
        ("Nitrobenzene", "nitrobenzene"),
        ("1,4-Dioxane", "dioxane"),
    ],
)
def test_names_are_sorted_as_in_a_dictionary(name: str, place: str) -> None:
    assert sorting_name(name) == place


def test_map_makes_every_point_a_named_link_and_labels_do_not_overlap() -> None:
    axis = Axis("x", 0.0, 1.0, 0.5, 1)
    points = [
        Point(0.1 + 0.08 * (i % 10), 0.2 + 0.06 * (i // 10), f"Substance {i}", "ε 2", "a.html", s)
        for i, s in enumerate(["donor", "dipolar", "unpolar"] * 20)
    ]
    svg = str(polarity_map(points, axis, axis, "map"))
    assert svg.count("<a href") == len(points) == svg.count("<title>")
    labels = re.findall(r'<text class="label (\w+)" x="([\d.]+)" y="([\d.]+)">([^<]+)', svg)
    assert labels
    boxes = []
    for side, x, y, text in labels:
        width = 6.1 * len(text)
        left = float(x) - {"start": 0.0, "middle": width / 2, "end": width}[side]
        boxes.append((left, float(y) - 10, left + width, float(y) + 3))
    for i, a in enumerate(boxes):
        for b in boxes[:i]:
            assert not (a[0] < b[2] and b[0] < a[2] and a[1] < b[3] and b[1] < a[3])


def test_formula_of_the_structure_is_what_the_page_says(by_path: dict[str, Page]) -> None:
    formula = molecule("CC(C)=O").formula
    assert formula == "C3H6O"
    assert "C<sub>3</sub>H<sub>6</sub>O" in by_path["solvents/acetone.md"].html


def test_every_derived_number_leads_to_the_way_it_was_found(by_path: dict[str, Page]) -> None:
    """The link beside a derived quantity leads to its formula and to inputs that add up."""
    body = by_path["solvents/acetone.md"].html
    linked = re.findall(r'class="how" href="#(way-[a-z0-9-]+)"', body)
    assert len(linked) == len(set(linked)) >= 14
    for anchor in linked:
        part = body.split(f'id="{anchor}"')[1].split("</details>")[0]
        rows = [
            re.findall(r'<span class="share">(<?)(\d+)\u202f%', row)
            for row in re.findall(r"<tr>(.*?)</tr>", part, re.DOTALL)[1:]
        ]
        shares = [row for row in rows if row]
        assert shares, anchor
        for column in zip(*shares, strict=True):
            total = sum(int(percent) for less, percent in column if not less)
            assert 97 <= total <= 102, (anchor, column)
        assert "methods.html#" in part
