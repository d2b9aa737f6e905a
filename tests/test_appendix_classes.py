"""Classes, columns, sizes and fragments: every document compiles and nothing sticks out."""

from __future__ import annotations

import itertools
import re
import subprocess
from collections import Counter
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import pytest
from appendix_networks import ALL, K4, ONE_WAY, RING
from test_appendix_proofs import CHANNELS, EVERY_KIND

from symbolic_response.appendix import Layout, appendix_text, write_appendix
from symbolic_response.appendix.displays import fitted
from symbolic_response.appendix.forests import forests_into
from symbolic_response.appendix.named_sums import NamedSums
from symbolic_response.appendix.page import LINES, SCALES, Page, settings
from symbolic_response.appendix.sources import SOURCES, bibtex
from symbolic_response.appendix.tables import Column, table, text_width
from symbolic_response.cli import run
from symbolic_response.errors import NetworkError, OutputError
from symbolic_response.expressions.breaking import Equation, Piece, align
from symbolic_response.expressions.loosening import parts_of
from symbolic_response.expressions.normal_form import normal_form
from symbolic_response.expressions.tree import ZERO, add, multiply, negate
from symbolic_response.expressions.widths import formula_width
from symbolic_response.network import Network, Rates, build_network
from symbolic_response.network.toml_reader import read_network, read_network_text
from symbolic_response.response.analysis import Analysis
from symbolic_response.response.notation import notation_of

WORKED = Path(__file__).parent.parent / "worked_cases"
VARIANTS = [Layout(kind, columns, None if kind == "revtex" else size)
            for kind, columns, size in LINES]
ARTICLE, ARTICLE_2 = Layout("article", 1, 10), Layout("article", 2, 10)
REVTEX, REVTEX_2 = Layout("revtex", 1), Layout("revtex", 2)


def ladder(rungs: int) -> Network:
    """Return a ladder whose second rail is one-way."""
    rates = [Rates(f"L{i}", f"L{i + 1}", f"u_{i}*x", f"v_{i}") for i in range(rungs - 1)]
    rates += [Rates(f"R{i}", f"R{i + 1}", f"s_{i}") for i in range(rungs - 1)]
    rates += [Rates(f"L{i}", f"R{i}", f"a_{i}", f"b_{i}") for i in range(rungs)]
    return build_network(f"ladder of {rungs}", transitions=rates,
                         states=" ".join(f"{side}{i}" for side in "LR" for i in range(rungs)),
                         observables={"right": {f"R{i}": 1 for i in range(rungs)}})


def star(legs: int) -> Network:
    """Return a star whose legs are pairs of channels."""
    return build_network(f"star of {legs}", states="H " + " ".join(f"T{i}" for i in range(legs)),
                         transitions=[Rates("H", f"T{i}", f"f_{i}_{c}*exp(z/3)", f"b_{i}_{c}",
                                            name=f"leg{i}_{c}")
                                      for i in range(legs) for c in range(2)])


def wide_ring(size: int) -> Network:
    """Return a ring whose rates are long products with long names."""
    return build_network("long names", states=[f"conformation{k}" for k in range(size)],
                         transitions=[Rates(
                             f"conformation{k}", f"conformation{(k + 1) % size}",
                             f"catalytic_{k}*(1 + catalytic_{(k + 1) % size}*backward_rate_{k})"
                             f"*exp(-binding_{k}/3)", f"backward_rate_{k}", name=f"step_number_{k}")
                             for k in range(size)])


GENERATED = {"ladder": ladder(3), "star": star(3), "k4": read_network_text(K4),
             "names": wide_ring(4), "one_way": read_network_text(ONE_WAY),
             "odd": read_network_text(ALL["odd"])}
THREE = {"ring": (read_network_text(RING), None),
         "energy": (read_network_text(ALL["energy"]), None),
         "channels": (read_network_text(CHANNELS + "[appendix]\ncertificates = 2\n"), EVERY_KIND)}
FOUR = (ARTICLE, ARTICLE_2, REVTEX, REVTEX_2)
CASES = [(name, "", layout) for name in THREE for layout in FOUR]
_OTHERS = itertools.cycle(VARIANTS)
CASES += [(name, "worked", next(_OTHERS)) for path in sorted(WORKED.glob("*/network.toml"))
          for name in [path.parent.name] for _ in range(2)]
CASES += [(name, "made", next(_OTHERS)) for name in GENERATED for _ in range(2)]


@dataclass(frozen=True)
class Compiled:
    """A run of TeX: the log, the text of the PDF in words with places, the number of equations."""

    log: str
    words: list[tuple[str, float, float]]
    equations: int


def text_of(name: str, kind: str, layout: Layout) -> str:
    analysis = analysis_of(name, kind)
    return appendix_text(analysis.network, analysis=analysis, layout=layout,
                         quantities=None if kind else THREE[name][1],
                         proofs_file=f"the_network_called_{name}_in_full_length.proofs.json")


@cache
def analysis_of(name: str, kind: str) -> Analysis:
    """Return the analysis of a network, made once for all its variants."""
    if kind == "worked":
        return Analysis(read_network(WORKED / name / "network.toml"))
    return Analysis(GENERATED[name] if kind else THREE[name][0])


def compiled(text: str, folder: Path, bib: str | None = None) -> Compiled:
    """Compile twice; references to equations print in square brackets, numbers of equations not."""
    marked = text.replace(
        r"\begin{document}", r"\let\eqref\undefined\newcommand\eqref[1]{[\ref{#1}]}"
        r"\AtEndDocument{\typeout{EQUATIONS \theequation}}" + "\n" + r"\begin{document}", 1)
    (folder / "one.tex").write_text(marked, encoding="ascii")
    for step in range(3 if bib else 2):
        made = subprocess.run(["pdflatex", "-interaction=nonstopmode", "-halt-on-error", "one.tex"],
                              cwd=folder, capture_output=True, timeout=300, check=False)
        assert made.returncode == 0, made.stdout.decode("latin-1")[-2000:]
        if bib and step == 0:
            subprocess.run(["bibtex", "one"], cwd=folder, capture_output=True, timeout=60,
                           check=True)
    log = (folder / "one.log").read_text(encoding="latin-1")
    found = re.search(r"EQUATIONS [A-Z]?(\d+)", log)
    assert found is not None
    return Compiled(log, words_of(folder), int(found[1]))


def words_of(folder: Path) -> list[tuple[str, float, float]]:
    """Return the words of the PDF with their left and right ends in pt."""
    subprocess.run(["pdftotext", "-bbox", "one.pdf", "one.html"], cwd=folder, check=True,
                   capture_output=True, timeout=60)
    shown = (folder / "one.html").read_text(encoding="utf-8")
    rows = re.findall(r'<word xMin="([\d.]+)" yMin="[^"]*" xMax="([\d.]+)"[^>]*>(.*?)</word>',
                      shown)
    return [(word, float(low), float(high)) for low, high, word in rows]


@cache
def runs(folder: Path) -> dict[tuple[str, str, Layout], Compiled]:
    """Compile all documents once, two at a time."""
    def one(place: int) -> Compiled:
        where = folder / f"{place}"
        where.mkdir()
        return compiled(texts[place], where)

    texts = [text_of(*case) for case in CASES]
    with ThreadPoolExecutor(2) as pool:
        return dict(zip(CASES, pool.map(one, range(len(CASES))), strict=True))


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("classes")


def clean(log: str) -> None:
    """Fail on overfull boxes, undefined or double names and missing glyphs."""
    assert "Overfull" not in log, re.findall(r"Overfull.*", log)
    assert not re.search(r"undefined|multiply|Missing character", log)


def test_every_variant_is_among_the_cases() -> None:
    assert {case[2] for case in CASES} >= set(VARIANTS)


@pytest.mark.parametrize("case", CASES, ids=lambda c: f"{c[0]}-{c[2].document_class}"
                         f"{c[2].columns}-{c[2].size}")
def test_it_compiles(case: tuple[str, str, Layout], folder: Path, requires_latex: None) -> None:
    made = runs(folder)[case]
    clean(made.log)
    # right ends of the columns, where numbers of equations stand
    ends = Counter(round(high) for word, _, high in made.words if re.fullmatch(r"\(\d+\)", word))
    columns = [end for end, _ in ends.most_common(case[2].columns)]
    numbers = sorted(int(word[1:-1]) for word, _, high in made.words
                     if re.fullmatch(r"\(\d+\)", word)
                     and any(abs(high - end) <= 1.5 for end in columns))
    assert sorted(set(numbers)) == list(range(1, made.equations + 1))
    assert len(numbers) == made.equations


# -- widths ----------------------------------------------------------------------------------------

FORMULAS = (r"k abc xyz", r"w_{AB} w_{CD} + \Phi_{A,AB}^{2}", r"\frac{a b}{c_{1} + d}",
            r"\mathcal{F}_{\mathrm{bind}} \tanh x")


def test_lines_and_scales_are_those_of_tex(tmp_path: Path, requires_latex: None) -> None:
    """Measured in TeX itself."""
    def measure(layout: Layout) -> list[float]:
        where = tmp_path / f"{layout.document_class}{layout.columns}{layout.size}"
        where.mkdir()
        boxes = "".join(rf"\setbox0\hbox{{${f}$}}\typeout{{MEASURED \the\wd0}}" for f in FORMULAS)
        head = appendix_text(read_network_text(ALL["pair"]), layout=layout).split("\\section")[0]
        (where / "m.tex").write_text(
            head + rf"\typeout{{MEASURED \the\columnwidth}}{boxes}x\end{{document}}")
        subprocess.run(["pdflatex", "-interaction=nonstopmode", "m.tex"], cwd=where, check=True,
                       capture_output=True, timeout=60)
        return [float(x) for x in re.findall(r"MEASURED ([\d.]+)pt", (where / "m.log").read_text())]

    plain = measure(ARTICLE)
    for layout in VARIANTS:
        page = settings(read_network_text(ALL["pair"]), layout).page
        line, *widths = plain if layout == ARTICLE else measure(layout)
        assert line == page.line
        growth = [one / other for one, other in zip(widths, plain[1:], strict=True)]
        assert max(growth) <= SCALES[page.size] + 5e-4
        assert min(growth) > SCALES[page.size] - 0.13


# -- what is too wide ------------------------------------------------------------------------------


@pytest.mark.parametrize(("body", "parts"), [
    (r"\frac{a + b}{c d}", [("", r"\frac{1}{c d}"), ("", "(a"), ("+", "b)")]),
    (r"x \ln\left(\frac{a b}{c}\right)", [("", "x"), ("", r"\ln(\frac{1}{c}"), ("", "(a"),
                                          ("", "b))")]),
    (r"e^{a + b}", [("", r"\exp(a"), ("+", "b)")]),
    (r"\sqrt{a - b}", [("", "(a"), ("-", "b)^{1/2}")]),
    (r"\frac{\partial (a + b)}{\partial x}", [("", r"\frac{\partial}{\partial x}"), ("", "((a"),
                                              ("+", "b))")]),
    (r"3 \cdot (-a + b)", [("", "3"), (r"\cdot", "(-a"), ("+", "b)")]),
])
def test_parts_of_a_wide_formula(body: str, parts: list[tuple[str, str]]) -> None:
    fit = {r"\frac{1}{c d}", r"\frac{1}{c}", r"\frac{\partial}{\partial x}"}
    assert parts_of(body, 10.0, lambda text: 5.0 if text in fit else 20.0) == parts


def test_a_wide_factor_is_broken_inside_plain_parentheses() -> None:
    long = " + ".join(f"a_{{{k}}} b_{{{k}}}" for k in range(20))
    text = align([Equation("x", (Piece("", rf"y \left({long}\right)"),))], 200.0)
    assert r"\left" not in text and text.count(r"\notag") > 2
    for line in text.split("\n")[1:-1]:
        shown = re.sub(r"\\notag|\\\\|&|\{\}", "", line)
        assert formula_width(shown) <= 200.0
    assert re.sub(r"\\notag\\\\\n&\\quad\{\}|&", "", text).count("a_{") == 20


def test_displayed_formulas_keep_their_labels_and_parts() -> None:
    text = "\\begin{equation}\na = b + c , \\qquad\nd = e\n\\label{eq:x}\n\\end{equation}"
    assert fitted(text, 400.0) == text
    narrow = fitted(text, 95.0)
    assert narrow.count(r"\label{eq:x}") == 1 and narrow.index(r"\end{gathered}") < \
        narrow.index(r"\label")
    assert r"a = b + c ," in narrow and r"d = e" in narrow and r"\qquad" not in narrow
    assert r"\begin{aligned}" in fitted(text, 60.0)


def test_tables_wrap_then_become_lists() -> None:
    columns = (Column("Symbol"), Column("Meaning", "wrap", ""), Column("Sign"))
    rows = [["$k$", "rate of binding to the reservoir on the left", "positive"],
            ["", "again", "real"]]
    wide, narrow = Page(line=345.0), Page(columns=2, line=180.0)
    assert r"p{" not in table(wide, columns, rows) and "longtable" in table(wide, columns, rows)
    wrapped = table(narrow, columns, rows)
    assert r"p{" in wrapped and "longtable" not in wrapped
    assert wrapped.count(r"\begin{tabular}") == len(rows)
    listed = table(Page(columns=2, line=100.0), columns, rows)
    assert listed.count(r"\item") == 1
    assert "Sign positive; again, Sign real." in listed
    assert text_width("a $b$") == pytest.approx(
        formula_width(r"\text{a}") + formula_width("b") + 3.3334)


# -- fragments -------------------------------------------------------------------------------------

PAPER = r"""\documentclass[aps,pre,reprint]{revtex4-2}
%s
\newtheorem{theorem}{Theorem}
\begin{document}
\title{A paper}
\maketitle
\section{Results}
\begin{theorem}\label{th:ends}Ours.\end{theorem}
\begin{equation}
a = b \label{eq:free}
\end{equation}
See Eq.~\eqref{eq:free}, Theorem~\ref{th:ends}, Eq.~\eqref{one:eq:mean} and App.~\ref{two_2}.
\appendix
\input{one-ring}
\input{two}
\bibliography{one-ring,two}
\end{document}
"""


def test_two_fragments_in_one_paper(tmp_path: Path, requires_latex: None) -> None:
    layout = Layout("revtex", 2, fragment=True, prefix="one")
    files = write_appendix(read_network_text(RING), tmp_path / "one-ring.tex", layout=layout)
    assert [file.name for file in files] == ["one-ring.tex", "one-ring.proofs.json", "one-ring.bib"]
    write_appendix(THREE["channels"][0], tmp_path / "two.tex", quantities=EVERY_KIND,
                   layout=Layout("revtex", 2, fragment=True, prefix="two_2"))
    texts = [(tmp_path / name).read_text() for name in ("one-ring.tex", "two.tex")]
    needed = {line[4:] for text in texts for line in text.splitlines()
              if line.startswith("%   \\use")}
    made = compiled(PAPER % "\n".join(sorted(needed)), tmp_path, bib="yes")
    clean(made.log)
    for text, prefix in zip(texts, ("one:", "two_2:"), strict=True):
        names = re.findall(r"\\(?:label|ref|eqref|cite)\{([^}]*)\}", text)
        assert all(part.startswith(prefix) or part == prefix[:-1]
                   for name in names for part in name.split(","))
        assert "documentclass" not in text and r"\begin{document}" not in text


def test_the_sources_of_a_fragment_are_those_it_cites(tmp_path: Path) -> None:
    text, _, bib = (file.read_text() for file in write_appendix(
        read_network_text(RING), tmp_path / "my ring.tex", layout=Layout(fragment=True)))
    cited = {key for group in re.findall(r"\\cite\{(.*?)\}", text) for key in group.split(",")}
    assert cited == set(re.findall(r"@article\{(.*?),", bib))
    assert all(key.startswith("my-ring:") for key in cited)
    assert "thebibliography" not in text


@pytest.mark.parametrize("layout", [Layout(bibtex=True), Layout(bibtex=True, prefix="x")])
def test_the_sources_of_a_document(layout: Layout, tmp_path: Path) -> None:
    files = write_appendix(read_network_text(RING), tmp_path / "a.tex", layout=layout)
    assert files[-1].name == "a.bib"
    text = files[0].read_text()
    keys = re.findall(r"\\bibitem\{(.*?)\}", text)
    groups = re.findall(r"\\cite\{(.*?)\}", text)
    assert keys == list(dict.fromkeys(key for group in groups for key in group.split(",")))
    assert re.findall(r"@article\{(.*?),", files[-1].read_text()) == keys
    assert keys[0].startswith("x:") == (layout.prefix == "x")


def test_every_source_is_cited_somewhere() -> None:
    texts = [text_of("channels", "", ARTICLE), text_of("ring", "", ARTICLE)]
    assert set(SOURCES) == {key for text in texts
                            for key in re.findall(r"\\bibitem\{(.*?)\}", text)}


def test_every_source_is_complete() -> None:
    for key, source in SOURCES.items():
        assert source.authors and source.title and source.journal and source.pages, key
        assert 1800 < source.year < 2030
        entry = bibtex([key], "")
        assert entry.isascii() and entry.count("{") == entry.count("}")


# -- options ---------------------------------------------------------------------------------------


def with_section(section: str) -> Network:
    return read_network_text(f"{ALL['pair']}\n[appendix]\n{section}\n")


def test_the_option_wins_over_the_file() -> None:
    network = with_section('class = "article"\ncolumns = 2\nsize = 11\nfragment = true')
    assert settings(network, Layout()).page == Page("article", 2, 11, 229.5)
    assert settings(network, Layout(size=12, columns=1)).page == Page("article", 1, 12, 390.0)
    assert settings(network, Layout("revtex")).page == Page("revtex", 2, 10, 246.0)
    assert settings(network, Layout(), "a b").prefix == "a-b"
    assert not settings(network, Layout(fragment=False)).fragment
    assert settings(read_network_text(ALL["pair"]), Layout()).page == Page()


@pytest.mark.parametrize(("section", "layout", "words"), [
    ('class = "book"', Layout(), r"^\[appendix\] class is 'book'; write article or revtex"),
    ("columns = 3", Layout(), r"columns is 3; write 1 or 2"),
    ("columns = true", Layout(), r"columns is True; write 1 or 2"),
    ("size = 9", Layout(), r"size is 9; write 10, 11 or 12"),
    ("fragment = 1", Layout(), r"fragment is not true or false"),
    ("", Layout("Article"), r"^class is 'Article'"),
    ("", Layout("revtex", size=11), "REVTeX sets its own size"),
    ('class = "revtex"\nsize = 10', Layout(), "REVTeX sets its own size"),
    ("", Layout(prefix="a b"), "prefix 'a b'"), ("", Layout(prefix=""), "prefix ''"),
    ("", Layout(prefix="é"), "prefix"),
])
def test_faulty_choices_are_refused_in_one_line(section: str, layout: Layout, words: str) -> None:
    with pytest.raises(NetworkError, match=words) as caught:
        appendix_text(with_section(section), layout=layout)
    assert "\n" not in str(caught.value)


def test_a_document_that_would_be_its_own_sources(tmp_path: Path) -> None:
    with pytest.raises(OutputError, match=r"give it the ending .tex"):
        write_appendix(read_network_text(RING), tmp_path / "a.bib", layout=Layout(bibtex=True))


def test_the_verb(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    Path("net.toml").write_text(RING)
    assert run(["appendix", "net.toml", "-o", "out.tex", "--class", "revtex", "--columns", "2",
                "--fragment", "--prefix", "r", "--quiet"]) == 0
    assert Path("out.bib").read_text().startswith("@article{r:")
    assert "broken for lines of 246pt" in Path("out.tex").read_text()
    assert run(["appendix", "net.toml", "-o", "out.tex", "--class", "revtex", "--size", "11"]) != 0
    assert len(capsys.readouterr().err.splitlines()) == 4  # three files written, one error


def test_one_equation_in_latex(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    Path("net.toml").write_text(ALL["pair"])
    assert run(["derive", "net.toml", "p[A]", "--latex", "--quiet"]) == 0
    assert capsys.readouterr().out == "\\pi_{A} = \\frac{D}{k N_{A} + D}\n"
    assert run(["derive", "net.toml", "p[A]", "--latex", "--at", "k=2", "--at", "D=1",
                "--at", "N_A=3", "--quiet"]) == 0
    assert capsys.readouterr().out == "\\pi_{A} = \\frac{1}{7}\n"


# -- what is said ----------------------------------------------------------------------------------


@pytest.mark.parametrize("source", [RING, ALL["energy"], ONE_WAY])
def test_the_current_of_a_single_cycle(source: str) -> None:
    """The product along less that against, times the forests into the cycle."""
    analysis = Analysis(read_network_text(source))
    sums = NamedSums(analysis, notation_of(analysis.network))
    (cycle,) = analysis.fundamental_cycles
    assert r"\label{eq:cycle}" in appendix_text(analysis.network)
    for e, ahead in zip(cycle.transitions, cycle.along, strict=True):
        one_way = any(t.backward is None for t in analysis.network.transitions)
        sides = [ZERO if back and one_way else multiply([
            analysis.rate_expression(step, way == back)
            for step, way in zip(cycle.transitions, cycle.along, strict=True)])
            for back in (False, True)]
        whole = multiply([add([sides[0], negate(sides[1])]),
                          forests_into(analysis, cycle.states)])
        shown = multiply([sums.current(e).form.expression(), sums.common.expression()])
        difference = add([shown, negate(whole) if ahead else whole])
        assert normal_form(difference, analysis.domain).is_zero()


def test_limits_are_stated_where_they_apply() -> None:
    ring, channels = appendix_text(read_network_text(RING)), appendix_text(
        read_network_text(CHANNELS))
    assert "no probability responds to a barrier" in " ".join(ring.split())
    assert r"|\ln r_e| = |\mathcal{F}_1|$" in ring
    assert r"\label{eq:cycle}" not in channels and "the only cycle" not in channels


SPECIAL = r"_ % & # $ ~ ^ \ { }"


def test_signs_of_tex_in_titles_texts_and_names(tmp_path: Path, requires_latex: None) -> None:
    quoted = SPECIAL.replace("\\", "\\\\")
    source = RING.replace("Three-state rectifier", f"T {quoted}").replace(
        "binding rate constant", f"about {quoted}").replace("A receptor", f"Text {quoted}")
    layouts = {"a": ARTICLE, "r": REVTEX_2}
    for name, layout in layouts.items():
        (tmp_path / name).mkdir()
        made = compiled(appendix_text(read_network_text(source), layout=layout), tmp_path / name)
        clean(made.log)
        words = [word for word, *_ in made.words]
        for start in ("T", "about", "Text"):
            place = words.index(start)
            shown = "".join(words[place + 1:place + 12])
            assert all(sign in shown for sign in ("%", "&amp;", "#", "$", "\\", "{", "}"))


@pytest.mark.parametrize("sign", SPECIAL.split())
@pytest.mark.parametrize("kind", ["states.{}", "symbols.{}"])
def test_signs_of_tex_in_names_are_refused_or_plain(sign: str, kind: str) -> None:
    name = f"x{sign}y"
    source = ALL["pair"] + f"\n[{kind.format(repr(name))}]\n"
    try:
        read_network_text(source)
    except NetworkError as error:
        assert "\n" not in str(error)
    else:
        assert sign == "_"


