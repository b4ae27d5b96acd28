"""compare.html: complete, offline, safe with any name, the same bytes every time."""

from __future__ import annotations

import base64
import dataclasses
import json
from html.parser import HTMLParser
from pathlib import Path
from urllib.parse import unquote

import pytest
from helpers.comparisons import boss_moved, core, hundreds, nothing_changed, piece

from moldgen.model.revision import Comparison, Work
from moldgen.output import compare_html
from moldgen.output.compare_page import FILE, write_compare_page
from moldgen.output.compare_pictures import DrawnComparison, DrawnComponent
from moldgen.output.compare_words import CAUTIONS, comparison_json, steel_words, verdict

VOID = {"meta", "img", "br", "link", "input", "hr"}
LOADS = ("src", "href", "srcset", "data", "poster", "action", "background")
PNG = b"\x89PNG\r\n\x1a\n made up"


class Page(HTMLParser):
    """A page read by the letter: every element must close, and what it refers to is kept."""

    def __init__(self, source: str) -> None:
        super().__init__(convert_charrefs=True)
        self.open: list[str] = []
        self.references: list[str] = []
        self.ids: set[str] = set()
        self.tags: list[str] = []
        self.events: list[str] = []
        self.words: list[str] = []
        self.rows: list[list[str]] = []
        self.feed(source)
        self.close()
        assert self.open == []
        self.text = " ".join("".join(self.words).split())

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(tag)
        if tag not in VOID:
            self.open.append(tag)
        for name, value in attrs:
            if name in LOADS:
                self.references.append(value or "")
            if name == "id":
                assert value not in self.ids
                self.ids.add(value or "")
            if name.startswith("on"):
                self.events.append(name)
        if tag == "tr":
            self.rows.append([])
        if tag in ("td", "th"):
            self.rows[-1].append("")

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        if self.open and self.open[-1] != "style":
            self.words.append(data + (" " if self.open[-1] in ("p", "td", "th", "li", "h1", "h2", "h3") else ""))
        if "td" in self.open:
            self.rows[-1][-1] += data


def written(comparison: Comparison, folder: Path, pictures: DrawnComparison | None = None) -> Page:
    path = write_compare_page(comparison, pictures or DrawnComparison(), folder)
    assert path == folder / FILE
    return Page(path.read_text(encoding="utf-8"))


def steel_folder(folder: Path) -> Path:
    (folder / "steel").mkdir()
    (folder / "steel" / "core_cut_1.step").write_text("made up")
    return folder


def outside(page: Page, folder: Path) -> list[str]:
    """What a page refers to beyond itself and the files beside it."""
    found = []
    for reference in page.references:
        inside = reference.startswith("data:image/png;base64,") or reference in {f"#{i}" for i in page.ids}
        beside = reference.startswith("./") and (folder / unquote(reference)).is_file()
        if not inside and not beside:
            found.append(reference)
    return found


@pytest.fixture
def drawn(tmp_path: Path) -> DrawnComparison:
    files = (tmp_path / "1.png", tmp_path / "2.png")
    for file in files:
        file.write_bytes(PNG)
    return DrawnComparison(
        (DrawnComponent("steel/core_cut_1.step", files),), "not drawn: 3.png; the painter ended with exit code 1"
    )


def test_the_check_for_outside_references_finds_them(tmp_path: Path) -> None:
    page = Page('<p><a href="#no">a</a><img src="https://a.b/c.png"><a href="./no.step">b</a><a href="x">c</a></p>')
    assert outside(page, tmp_path) == ["#no", "https://a.b/c.png", "./no.step", "x"]


@pytest.mark.parametrize("comparison", [nothing_changed(), boss_moved(), hundreds()], ids=["same", "boss", "hundreds"])
def test_page_needs_nothing_from_outside(comparison: Comparison, tmp_path: Path, drawn: DrawnComparison) -> None:
    page = written(comparison, steel_folder(tmp_path), drawn)
    assert outside(page, tmp_path) == []
    source = (tmp_path / FILE).read_text(encoding="utf-8")
    for word in ("http:", "https:", "url(", "@import", "@font-face", "<script", "<link"):
        assert word not in source
    assert "default-src 'none'" in source
    assert page.events == []


def test_page_says_what_becomes_of_the_steel(tmp_path: Path, drawn: DrawnComparison) -> None:
    page = written(boss_moved(), steel_folder(tmp_path), drawn)
    assert (
        "1 component is cut, 1 needs welding or a new insert, 1 is new, 1 is no longer used, 1 is moved, "
        "1 stays as it is."
    ) in page.text
    for caution in CAUTIONS:
        assert caution in page.text
    assert "Not steel-safe: 33.25 mm³ of steel is missing and new components have to be made." in page.text
    assert "as drawn: both parts stand in one place; 137 of 139 faces" in page.text
    assert "warning: volumes do not add up (0.3 mm3, limit 0.1 mm3) [core]" in page.text
    assert "painter ended with exit code 1" in page.text
    assert "New components (1) ejector pin 7: material 1.2210, quantity 4" in page.text
    assert "No longer used (1) ejector pin 5" in page.text
    assert "Moved, steel unchanged (1) core pin 1: moved by -2.000, 0.000, 0.000 mm" in page.text
    assert "Unchanged (1) cavity" in page.text


def test_components_come_with_those_to_weld_first(tmp_path: Path) -> None:
    text = written(boss_moved(), tmp_path).text
    sections = [text.index("core: weld or new insert"), text.index("gate insert: cut"), text.index("New components")]
    assert sections == sorted(sections)


def test_every_piece_stands_in_its_table(tmp_path: Path) -> None:
    page = written(boss_moved(), steel_folder(tmp_path))
    places = ["10.00, 5.00, -3.00", "9.95, 4.98, -2.99", "boss d 6.6 moved"]
    assert ["weld 1", "about 33.25", "2", *places, "steel/core_weld_1.step"] in page.rows
    assert ["cut 1", "33.5", "2", *places, "steel/core_cut_1.step"] in page.rows
    assert ["cut 1", "4", "2", *places, "none"] in page.rows
    assert "./steel/core_cut_1.step" in page.references  # the file is there
    assert "./steel/core_weld_1.step" not in page.references  # this one is not: no dead link


def test_pins_numbers_and_the_part_are_listed(tmp_path: Path) -> None:
    rows = written(boss_moved(), tmp_path).rows
    assert [
        "ejector pin",
        "ejector pin 3",
        "30.00, 18.00, -30.00",
        "28.00, 18.00, -30.00",
        "2.000",
        "d 3 mm",
        "d 3 mm",
    ] in rows
    assert ["ejector pin", "ejector pin 7", "", "0.00, 5.00, -30.00", "new", "", "d 4 mm"] in rows
    assert ["clamp force [kN]", "210", "214.2", "+2.0 %", "the rim grew"] in rows
    assert ["thinnest wall [mm]", "1.18", "", "gone", ""] in rows
    assert ["moved", "boss d 6.6", "31.00, 20.00, 8.00", "-2.000, 0.000, 0.000", "12, 13 → 12, 13"] in rows


def test_pictures_are_inside_the_page(tmp_path: Path, drawn: DrawnComparison) -> None:
    page = written(boss_moved(), tmp_path, drawn)
    assert sum(r.startswith("data:") for r in page.references) == 2
    for component in drawn.components:
        for file in component.files:
            file.unlink()
    assert page.tags.count("img") == 2


def test_components_of_one_name_keep_their_own_pictures(tmp_path: Path) -> None:
    changes, drawn = [], []
    for number in (1, 2):
        file = tmp_path / f"{number}.png"
        file.write_bytes(PNG + bytes([number]))
        changes.append(core(piece("pin", Work.CUT, 1, 10.0 - number, file=f"steel/{number}.step"), name="pin"))
        drawn.append(DrawnComponent(f"steel/{number}.step", (file,)))
    comparison = dataclasses.replace(nothing_changed(), components=tuple(changes))
    page = written(comparison, tmp_path, DrawnComparison(tuple(drawn)))
    shown = [base64.b64decode(r.partition(",")[2])[-1] for r in page.references if r.startswith("data:")]
    assert shown == [1, 2]


def test_names_cannot_become_markup(tmp_path: Path) -> None:
    evil = '<script>alert(1)</script><img src=x onerror="a()">&amp;\u202egpj\x00'
    bad = piece(evil, Work.WELD, 1, 3.0, file='javascript:alert("1")')
    changed = dataclasses.replace(core(bad), new=evil, old=evil, note=evil, material=evil)
    items = tuple(dataclasses.replace(i, name=evil, note=evil, was=evil) for i in boss_moved().items)
    part = tuple(dataclasses.replace(c, feature=evil) for c in boss_moved().part)
    comparison = dataclasses.replace(boss_moved(), old=evil, new=evil, components=(changed,), items=items, part=part)
    page = written(comparison, tmp_path)
    assert not {"script", "img"} & set(page.tags)
    assert page.events == []
    assert outside(page, tmp_path) == []
    shown = '<script>alert(1)</script><img src=x onerror="a()">&amp;\ufffdgpj\ufffd'
    assert page.text.count(shown) >= 10
    assert "\x00" not in page.text
    assert "\u202e" not in page.text


@pytest.mark.parametrize("name", ["../secret.step", "/etc/hostname", "https://a.b/c.step", "steel/none.step", ""])
def test_only_files_beside_the_page_are_linked(name: str, tmp_path: Path) -> None:
    (tmp_path / "secret.step").write_text("made up")
    (tmp_path / "out").mkdir()
    assert "<a" not in compare_html.file_link(tmp_path / "out", name)


def test_a_file_with_odd_letters_is_linked(tmp_path: Path) -> None:
    (tmp_path / "a:b #1%.step").write_text("made up")
    assert 'href="./a%3Ab%20%231%25.step"' in compare_html.file_link(tmp_path, "a:b #1%.step")


def test_page_of_two_equal_tools_says_so(tmp_path: Path) -> None:
    text = written(nothing_changed(), tmp_path).text
    assert "All 2 components stay as they are." in text
    assert "No steel has to be cut, welded or made new." in text
    assert "No component changes." in text
    assert "The part is the same." in text


def test_page_without_any_component_still_comes_out(tmp_path: Path) -> None:
    empty = dataclasses.replace(nothing_changed(), components=())
    assert "There is no component to compare." in written(empty, tmp_path).text


def test_hundreds_of_changes_are_all_there(tmp_path: Path) -> None:
    comparison = hundreds()
    page = written(comparison, tmp_path)
    assert "150 components need welding or a new insert." in page.text
    assert sum(row[0] in ("weld 1", "cut 1") for row in page.rows if row) == 300
    assert sum(row[0] == "ejector pin" for row in page.rows if row) == 300
    assert sum(row[0].startswith("number ") for row in page.rows if row) == 300
    assert sum(row[0] == "reshaped" for row in page.rows if row) == 300


def test_same_comparison_gives_the_same_bytes(tmp_path: Path, drawn: DrawnComparison) -> None:
    folders = (tmp_path / "one", tmp_path / "elsewhere" / "two")
    for folder in folders:
        folder.mkdir(parents=True)
        write_compare_page(boss_moved(), drawn, folder)
    first, second = ((folder / FILE).read_bytes() for folder in folders)
    assert first == second
    assert str(tmp_path).encode() not in first
    other = dataclasses.replace(boss_moved(), components=boss_moved().components[1:])
    assert write_compare_page(other, drawn, folders[0]).read_bytes() != second


def test_sentences_tell_cutting_from_welding() -> None:
    only_cut = dataclasses.replace(nothing_changed(), components=(core(piece("core", Work.CUT, 1, 5.0)),))
    assert verdict(only_cut) == "1 component is cut."
    assert steel_words(only_cut) == "Steel-safe: cutting 5 mm³ is enough, no steel is missing."
    both = (piece("core", Work.CUT, 1, 5.0), piece("core", Work.WELD, 1, 0.25))
    welded = dataclasses.replace(nothing_changed(), components=(core(*both),))
    assert steel_words(welded) == "Not steel-safe: 0.25 mm³ of steel is missing."


def test_json_holds_all_and_the_sentences() -> None:
    record = json.loads(comparison_json(boss_moved()))
    assert record["verdict"] == verdict(boss_moved())
    assert record["steel_safe"] is False
    assert record["components"][2]["pieces"][1]["work"] == "weld"
    assert record["components"][2]["pieces"][1]["volume_mm3"] == 33.25
    assert [len(record[k]) for k in ("items", "numbers", "part", "findings")] == [3, 2, 1, 1]
