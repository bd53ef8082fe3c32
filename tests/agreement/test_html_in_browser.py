"""The report in a browser: nothing runs and nothing is fetched, and it reads on a phone, in the dark and in print."""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
from agreement.browser import Browser, browser

from prover import check, measure
from prover.api import compare
from prover.findings import Report
from prover.pair import Pairing
from prover.report import html
from prover.several import Outcome
from prover.spec import Spec

CASES = Path(__file__).parents[2] / "cases"
SIZES = [(360, True), (768, True), (1280, False)]

EVIL = r"""
module \<img/src=x/onerror=alert('module')> (input clk, output \"onload="alert('port')" );
  reg [1:0] \<script>alert('register')</script> ;
  always @(posedge clk) \<script>alert('register')</script> <= \<script>alert('register')</script> + 1'b1;
  assign \"onload="alert('port')" = \<script>alert('register')</script> [1];
endmodule
"""


@pytest.fixture(scope="module")
def window(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    with browser(tmp_path_factory.mktemp("profile")) as running:
        yield running


def case(name: str, ratio: str, **options: Any) -> Report:
    return check([CASES / name], Spec(ratio=Fraction(ratio), **options))


@pytest.fixture(scope="module")
def pages(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """Reports of every kind, by what they are of."""
    folder = tmp_path_factory.mktemp("pages")
    reports = {
        "proved": case("gauge/ping_by_7_ripple.v", "7", output="ping"),
        "refuted": case("faulty/by_7_clears_at_6.v", "7"),
        "huge": case("gauge/season_by_2147483647.v", "2147483647"),
        "rings": case("faulty/twisted_ring_5.v", "10"),
        "folded": case("gauge/second_26_eq.v", "50000001"),
        "unsettled": case("faulty/gate_that_chases_itself.v", "2"),
        "wide": case("wide/noise_24_xnor.v", "16777215", high=16777216),
        "glitch": case("faulty/two_pulses.v", "9", high=6),
        "released": case("faulty/gated_by_reset.v", "6"),
        "measured": measure([CASES / "faulty/compare_out_of_reach.v"]),
    }
    texts = {name: html.render(report) for name, report in reports.items()}
    found = [Outcome(report.ports.design.files, report) for report in reports.values()]
    old, new = ([CASES / f"pairs/sample_{kind}.v"] for kind in ("up", "live"))
    texts["compared"] = html.render_compared(compare(old, new, Pairing(moving=("divisor",))))
    texts["several"] = html.render_several(found)
    for name, text in texts.items():
        (folder / f"{name}.html").write_text(text, encoding="utf-8")
    return {name: folder / f"{name}.html" for name in texts}


KINDS = [
    "proved",
    "refuted",
    "huge",
    "rings",
    "folded",
    "unsettled",
    "wide",
    "glitch",
    "released",
    "measured",
    "compared",
    "several",
]


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize(("width", "mobile"), SIZES)
def test_the_page_is_no_wider_than_the_window(
    window: Browser, pages: dict[str, Path], kind: str, width: int, mobile: bool
) -> None:
    window.window(width, 800, mobile)
    window.media()
    window.open(pages[kind])
    # With all that can be opened open.
    window.evaluate("document.querySelectorAll('details').forEach(d => d.open = true)")
    assert window.evaluate("window.innerWidth") == width
    assert window.evaluate("document.documentElement.scrollWidth") == width
    # What is wider than its box can be scrolled there, and is reached by the keyboard.
    lost = window.evaluate(
        """[...document.querySelectorAll('main *')].filter(e => e.scrollWidth > e.clientWidth + 1
        && e.clientWidth > 0 && !e.closest('svg') && getComputedStyle(e).display != 'inline'
        && getComputedStyle(e).overflowX == 'visible').map(e => e.outerHTML.slice(0, 80))"""
    )
    assert lost == []
    assert window.requests == window.dialogs == []


def test_tables_of_texts_are_read_on_a_phone_without_scrolling(
    window: Browser, pages: dict[str, Path]
) -> None:
    window.window(390, 844, True)
    window.media()
    for kind in ("rings", "huge", "several"):
        window.open(pages[kind])
        window.evaluate("document.querySelectorAll('details').forEach(d => d.open = true)")
        boxes = window.evaluate(
            """[...document.querySelectorAll('table.told')].map(t => t.parentElement)
            .map(b => [b.scrollWidth, b.clientWidth])"""
        )
        assert boxes
        assert all(needed <= there for needed, there in boxes)


@pytest.mark.parametrize("kind", KINDS)
def test_every_part_of_a_page_is_there_to_be_seen(window: Browser, pages: dict[str, Path], kind: str) -> None:
    window.window(1280)
    window.media()
    window.open(pages[kind])
    parts = window.evaluate(
        """[...document.querySelectorAll('nav a')].map(a => {
        const part = document.getElementById(a.getAttribute('href').slice(1)); const box = part.getBoundingClientRect();
        return [a.textContent, part.querySelector('.title').textContent, box.width > 300, box.height > 30]})"""
    )
    assert all(name == title and wide and high for name, title, wide, high in parts)
    assert len(parts) >= 4 or kind == "several"
    pictures = window.evaluate(
        """[...document.querySelectorAll('svg[role=img]')].filter(s => s.checkVisibility())
        .map(s => s.getBoundingClientRect().width > 50 && s.getBBox().width > 40)"""
    )
    assert all(pictures)


def test_no_text_of_a_picture_is_cut_off(window: Browser, pages: dict[str, Path]) -> None:
    window.window(1280)
    window.media()
    for kind, path in pages.items():
        window.open(path)
        window.evaluate("document.querySelectorAll('details').forEach(d => d.open = true)")
        cut = window.evaluate(
            """[...document.querySelectorAll('svg text')].filter(t => { const a = t.getBoundingClientRect(),
            b = t.ownerSVGElement.getBoundingClientRect(); return a.left < b.left - 1 || a.right > b.right + 1
            || a.top < b.top - 2 || a.bottom > b.bottom + 2 }).map(t => t.textContent)"""
        )
        assert cut == [], kind


def test_the_names_stay_beside_a_wave_that_is_scrolled(window: Browser, pages: dict[str, Path]) -> None:
    window.window(360, 800, True)
    window.open(pages["folded"])
    moved = window.evaluate(
        """(() => { const strip = document.querySelector('#wave .strip'), names = strip.querySelector('.names');
        const before = names.getBoundingClientRect().left; strip.scrollLeft = 200;
        return [strip.scrollLeft, names.getBoundingClientRect().left - before] })()"""
    )
    assert moved == [200, 0]


def test_names_from_sources_are_shown_and_do_nothing(window: Browser, tmp_path: Path) -> None:
    source = tmp_path / "\"><img src=x onerror=alert('file')>.v"
    source.write_text(EVIL, encoding="utf-8")
    waivers = {"recovery": "</p><script>alert('waiver')</script><img src='https://example.invalid/x.png'>"}
    report = check([source], Spec(ratio=Fraction(3), waivers=waivers))
    one, several = tmp_path / "one.html", tmp_path / "several.html"
    one.write_text(html.render(report), encoding="utf-8")
    several.write_text(html.render_several([Outcome((str(source),), report)]), encoding="utf-8")
    for path in (one, several):
        window.open(path)
        window.evaluate("new Promise(done => setTimeout(done, 200))")
        assert window.dialogs == []
        assert window.requests == []
        shown = window.evaluate("document.body.innerText")
        assert "<img/src=x/onerror=alert('module')>" in shown
        assert "<script>alert('register')</script>" in shown
        assert "onload=\"alert('port')\"" in shown
        assert "<script>alert('waiver')</script>" in shown
        assert source.name in shown
        assert window.evaluate("document.querySelectorAll('script, img, [onload], [onerror]').length") == 0


def test_a_script_that_got_in_would_not_run(window: Browser, tmp_path: Path, pages: dict[str, Path]) -> None:
    """What the page's policy forbids: the second line of defence, tried with holes made into a page."""
    text = pages["proved"].read_text(encoding="utf-8")
    holes = "<script>alert(1)</script><img src='https://example.invalid/x.png' onerror='alert(2)'><style>main{display:none}"
    path = tmp_path / "holed.html"
    path.write_text(text.replace("<main", f"{holes}</style><main", 1), encoding="utf-8")
    window.open(path)
    window.evaluate("new Promise(done => setTimeout(done, 200))")
    assert window.dialogs == []
    assert window.evaluate("getComputedStyle(document.querySelector('main')).display") == "block"
    # The same holes without the policy: this test would see them.
    path.write_text(f"<!DOCTYPE html><title>x</title>{holes}</style><main></main>", encoding="utf-8")
    window.open(path)
    assert window.dialogs[0] == "1"
    assert window.requests == ["https://example.invalid/x.png"]


# -- light, dark, print ------------------------------------------------------------------------------------

CONTRAST = """(() => {
  const light = c => { const [r, g, b] = c.match(/[0-9.]+/g).map(Number).map(v => v / 255)
    .map(v => v <= .04045 ? v / 12.92 : ((v + .055) / 1.055) ** 2.4); return .2126 * r + .7152 * g + .0722 * b };
  const ground = e => { for (; e; e = e.parentElement) { const c = getComputedStyle(e).backgroundColor;
    if (c != 'rgba(0, 0, 0, 0)') return c } return 'rgb(255, 255, 255)' };
  const seen = {};
  for (const e of document.querySelectorAll('body *')) {
    const own = [...e.childNodes].some(n => n.nodeType == 3 && n.textContent.trim());
    if (!own || !e.checkVisibility() || e.closest('title, desc')) continue;
    const inside = e.closest('svg'), style = getComputedStyle(e);
    // A filled box of a state graph has its own ground.
    const box = e.classList.contains('label') ? e.parentElement.querySelector('.state') : null;
    const below = box ? getComputedStyle(box).fill : ground(e);
    const [a, b] = [light(inside ? style.fill : style.color), light(below)];
    const ratio = (Math.max(a, b) + .05) / (Math.min(a, b) + .05);
    const kind = `${e.tagName} ${e.getAttribute('class')}`;
    seen[kind] = Math.min(seen[kind] ?? 99, ratio);
  }
  return seen;
})()"""
"""The least contrast of each kind of text, as WCAG 2.2 defines it under "relative luminance" and "contrast ratio"."""


@pytest.mark.parametrize("scheme", ["light", "dark"])
@pytest.mark.parametrize("medium", ["screen", "print"])
@pytest.mark.parametrize("kind", ["refuted", "unsettled", "several"])
def test_every_text_stands_out_from_its_ground(
    window: Browser, pages: dict[str, Path], scheme: str, medium: str, kind: str
) -> None:
    window.window(1280)
    window.media(medium, scheme)
    window.open(pages[kind])
    seen = window.evaluate(CONTRAST)
    assert len(seen) > 12
    # WCAG 2.2, success criterion 1.4.3.
    assert {name: ratio for name, ratio in seen.items() if ratio < 4.5} == {}


def test_the_dark_page_is_dark_and_the_printed_one_is_not(window: Browser, pages: dict[str, Path]) -> None:
    grounds = {}
    for medium, scheme in (("screen", "light"), ("screen", "dark"), ("print", "dark")):
        window.media(medium, scheme)
        window.open(pages["refuted"])
        colour = window.evaluate(
            "getComputedStyle(document.body).backgroundColor.match(/[0-9]+/g).map(Number)"
        )
        grounds[medium, scheme] = sum(colour) / 3
    assert grounds["screen", "light"] > 230
    assert grounds["screen", "dark"] < 60
    assert grounds["print", "dark"] == 255


@pytest.mark.parametrize("kind", ["refuted", "rings", "several"])
def test_a_page_prints_whole(window: Browser, pages: dict[str, Path], kind: str) -> None:
    window.media("print")
    # The width of a page of A4 between margins of 14 mm, in CSS pixels.
    window.window(688)
    window.open(pages[kind])
    wide = window.evaluate(
        """[...document.querySelectorAll('main svg, main table, main p')].filter(e => e.checkVisibility()
        && e.getBoundingClientRect().right > 689).map(e => e.outerHTML.slice(0, 80))"""
    )
    assert wide == []
    # What is folded away on the screen is on paper.
    assert window.evaluate("[...document.querySelectorAll('td')].every(e => e.checkVisibility())")
    aligned = window.evaluate(
        """[...document.querySelectorAll('.strip')].filter(s => s.children.length == 2).every(s =>
        Math.abs(s.children[0].getBoundingClientRect().height - s.children[1].getBoundingClientRect().height) < 1)"""
    )
    assert aligned
    printed = window.printed()
    assert printed.startswith(b"%PDF-")
    assert len(printed) > 20_000


def test_an_index_opens_what_it_points_at(window: Browser, pages: dict[str, Path]) -> None:
    window.window(1280)
    window.media()
    window.open(pages["several"])
    closed = window.evaluate("[...document.querySelectorAll('details.divider')].map(d => d.open)")
    assert not all(closed)
    window.evaluate("document.querySelector('.index a').click()")
    assert window.evaluate("document.querySelector('details.divider').open")
    assert window.evaluate("document.querySelector('details.divider h2').getBoundingClientRect().top < 100")


def test_pictures_and_tables_have_names_for_those_who_hear_them(
    window: Browser, pages: dict[str, Path]
) -> None:
    window.open(pages["refuted"])
    window.ask("Accessibility.enable")
    nodes = window.ask("Accessibility.getFullAXTree")["nodes"]
    told: dict[str, list[str]] = {}
    for node in nodes:
        if not node.get("ignored"):
            told.setdefault(node["role"]["value"], []).append(node.get("name", {}).get("value", ""))
    for role in ("banner", "navigation", "main", "contentinfo"):
        assert len(told[role]) == 1, role
    assert {"Verdicts", "Wave", "Counterexamples", "States", "Facts"} <= set(told["region"])
    images = told.get("image", []) + told.get("img", [])
    assert len(images) == 5
    assert all(images)
    assert told["heading"][0] == "by_7_clears_at_6"
