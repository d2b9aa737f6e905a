"""Drawings as files: they compile, SVG is well formed, nothing is left behind on failure."""

from __future__ import annotations

import re
import subprocess
import zlib
from dataclasses import replace
from pathlib import Path
from xml.etree import ElementTree

import pytest
from diagram_networks import networks

from symbolic_response.errors import OutputError
from symbolic_response.figures.diagrams import (
    PREAMBLE,
    Drawing,
    draw,
    network_svg,
    write_drawing,
)
from symbolic_response.figures.diagrams.labels import label
from symbolic_response.figures.diagrams.looks import LINES, MARKS
from symbolic_response.figures.diagrams.svg_text import svg_label
from symbolic_response.network import math_latex

NETWORKS = networks()
SVG = "{http://www.w3.org/2000/svg}"
KINDS = ("network", "cycles", "trees", "splittings", "forests")


def drawings(width: float) -> list[Drawing]:
    made = []
    for name in ("square with chord", "twin_ferry", "stamp_press"):
        for what in KINDS:
            made.append(draw(NETWORKS[name], what, transition=1, root=1, width=width))
    made += [draw(NETWORKS[name], width=width) for name in ("cube", "K5", "ladder", "text odd")]
    return made


def compiled(folder: Path, text: str) -> str:
    (folder / "d.tex").write_text(text, encoding="utf-8")
    subprocess.run(["pdflatex", "-interaction=nonstopmode", "-halt-on-error", "d.tex"],
                   cwd=folder, check=True, capture_output=True, timeout=120)
    return (folder / "d.log").read_text(encoding="utf-8", errors="replace")


@pytest.mark.parametrize(("head", "width"), [
    (r"\documentclass{article}", 345.0),
    (r"\documentclass[aps,pre,twocolumn]{revtex4-2}", 246.0),
])
def test_every_kind_compiles(
    head: str, width: float, requires_latex: None, tmp_path: Path
) -> None:
    made = drawings(width)
    body = "\n\n".join(
        f"\\setbox0\\hbox{{{d.text}}}\\immediate\\write\\sizes{{\\the\\wd0}}\n"
        "\\noindent\\box0\\par" for d in made
    )
    log = compiled(tmp_path, head + "\n\\usepackage{amsmath,amssymb}\n" + PREAMBLE
                   + "\\newwrite\\sizes\\immediate\\openout\\sizes=sizes.out\n"
                   + f"\\begin{{document}}\n{body}\n\\end{{document}}\n")
    assert "Overfull" not in log and "Missing character" not in log
    widths = [float(line[:-2]) for line in (tmp_path / "sizes.out").read_text().split()]
    for drawing, measured in zip(made, widths, strict=True):
        assert abs(drawing.width - measured) < 0.1
        assert drawing.width <= width


def page_size(pdf: bytes) -> tuple[float, float]:
    """Return the size of the one page in TeX's points."""
    streams = re.findall(rb"/ObjStm.*?stream\r?\n(.*?)endstream", pdf, re.DOTALL)
    text = pdf + b"".join(zlib.decompress(stream) for stream in streams)
    ((width, height),) = re.findall(rb"/MediaBox ?\[ ?0 0 ([\d.]+) ([\d.]+) ?\]", text)
    return float(width) * 72.27 / 72, float(height) * 72.27 / 72


@pytest.mark.parametrize("what", KINDS)
def test_a_page_is_as_large_as_the_drawing(
    what: str, requires_latex: None, tmp_path: Path
) -> None:
    path = tmp_path / f"{what}.pdf"
    made = write_drawing(NETWORKS["K4"], path, what=what, transition="t2", root="s1")
    assert [file.name for file in tmp_path.iterdir()] == [path.name]
    width, height = page_size(path.read_bytes())
    down = sum(row[0].box.height + 8 for row in made.rows) - 8
    assert abs(width - made.width - 6) < 0.2
    assert abs(height - down - 6) < 0.2
    if what == "trees":
        again = tmp_path / "again.pdf"
        assert write_drawing(NETWORKS["K4"], again, what=what, transition=2, root=1) == made
        assert again.read_bytes() == path.read_bytes()


def test_tex_is_a_whole_document(requires_latex: None, tmp_path: Path) -> None:
    write_drawing(NETWORKS["tide_lamp"], tmp_path / "a.tex", what="cycles")
    text = (tmp_path / "a.tex").read_text()
    assert "Overfull" not in compiled(tmp_path, text)
    assert text == draw(NETWORKS["tide_lamp"], "cycles").document


@pytest.mark.parametrize("what", KINDS)
@pytest.mark.parametrize("name", ["K4", "twin_ferry", "stamp_press", "text odd", "text numbers"])
def test_svg_is_well_formed_and_shows_the_same(name: str, what: str, tmp_path: Path) -> None:
    path = tmp_path / "a.svg"
    made = write_drawing(NETWORKS[name], path, what=what, transition=0, root=0)
    assert path.read_text(encoding="utf-8") == made.svg == made._repr_svg_()
    root = ElementTree.fromstring(made.svg)
    assert root.tag == f"{SVG}svg" and len(root.findall(f"{SVG}g")) == made.shown
    pictures = [picture for row in made.rows for picture in row]
    assert len(root.findall(f".//{SVG}text")) == sum(len(p.labels) for p in pictures)
    tips = sum(LINES[s.look].tip is not None for p in pictures for s in p.strokes)
    assert sum("Z" in p.attrib["d"] for p in root.iter(f"{SVG}path")) == tips
    width, height = (float(x) for x in root.attrib["viewBox"].split()[2:])
    for text in root.iter(f"{SVG}tspan"):
        assert 0 < float(text.attrib["x"]) < width and 0 < float(text.attrib["y"]) < height
        assert "\\" not in (text.text or "")


def test_letters_and_scripts_in_svg() -> None:
    text = svg_label(label(r"\gamma_{AB}^2", 8), 10 + 10j)
    spans = list(ElementTree.fromstring(text))
    assert [span.text for span in spans] == ["γ", "A", "B", "2"]
    heights = [float(span.attrib["y"]) for span in spans]
    assert heights[1] == heights[2] > heights[0] == 10 > heights[3]
    assert "font-size" not in spans[0].attrib and float(spans[1].attrib["font-size"]) < 8
    word = ElementTree.fromstring(svg_label(label(r"\mathrm{loaded}", 10), 0j))
    assert [span.text for span in word] == ["loaded"]
    assert "font-style" not in word[0].attrib
    minus = ElementTree.fromstring(svg_label(label("a - b", 8), 0j))
    assert [span.text for span in minus] == ["a", "−", "b"]


@pytest.mark.parametrize("command", sorted(math_latex._COMMANDS))
def test_every_command_of_an_entry_has_a_form_in_svg(command: str) -> None:
    for latex in (rf"{command}{{a}}{{b}}", rf"x_{{{command} a}}^{{{command}}}", command,
                  "}{" + command, rf"\frac{{{command}}}"):
        made = f"<g>{svg_label(label(latex, 8), 5 + 5j)}</g>"
        assert "\\" not in "".join(ElementTree.fromstring(made).itertext())


def test_hostile_titles_and_labels_stay_well_formed() -> None:
    network = NETWORKS["K4"]
    states = tuple(replace(state, latex="x_{<}>") for state in network.states)
    ElementTree.fromstring(network_svg(replace(network, title="<a>&\x00\"]]>", states=states)))


def test_looks_differ_in_grey() -> None:
    used, chosen, behind = LINES["branch"], LINES["chosen branch"], LINES["behind"]
    assert chosen.dashes and not used.dashes and chosen.width >= 2 * used.width
    assert min(behind.colour) > 150 and max(used.colour) == 0
    assert LINES["cut"].dashes and not LINES["inside"].dashes
    assert MARKS["in"].fill != MARKS["out"].fill and MARKS["root"].fill == (255, 255, 255)


def test_other_suffixes_are_refused(tmp_path: Path) -> None:
    for name in ("a.png", "a", "a.pdf.eps"):
        with pytest.raises(OutputError, match=r"\.tex, \.pdf or \.svg"):
            write_drawing(NETWORKS["pair"], tmp_path / name)
    with pytest.raises(OutputError, match="no folder"):
        write_drawing(NETWORKS["pair"], tmp_path / "none" / "a.svg")
    assert not list(tmp_path.iterdir())


def test_missing_or_failing_pdflatex_is_one_line(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("PATH", str(tmp_path / "bin"))
    with pytest.raises(OutputError, match="pdflatex is not installed"):
        write_drawing(NETWORKS["pair"], tmp_path / "a.pdf")
    (tmp_path / "bin").mkdir()
    program = tmp_path / "bin" / "pdflatex"
    program.write_text("#!/bin/sh\nprintf '! Broken.\\n' > drawing.log\nexit 1\n")
    program.chmod(0o755)
    with pytest.raises(OutputError) as failure:
        write_drawing(NETWORKS["pair"], tmp_path / "a.pdf")
    assert str(failure.value) == "pdflatex failed: Broken.; write .svg or .tex"
    assert not (tmp_path / "a.pdf").exists()
