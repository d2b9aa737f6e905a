"""Figures of response curves: their lines against the data, their files, their labels."""

import math
import stat
import subprocess
from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import matplotlib
import pytest
from curve_examples import below_hill, constant, curve, hill
from matplotlib.axes import Axes
from matplotlib.lines import Line2D

from symbolic_response.appendix.escape import escaped
from symbolic_response.control.curve_data import (
    CurveData,
    CurvePoint,
    balanced,
    number_of,
    saturating,
)
from symbolic_response.errors import OutputError
from symbolic_response.expressions.reader import read_expression
from symbolic_response.figures.curve import curve_figure, curve_plot
from symbolic_response.figures.labels import can_be_set, math_label, text_label, with_about
from symbolic_response.figures.pgfplots import PREAMBLE, curve_pgfplots

F = Fraction


def falling(**more: object) -> CurveData:
    return curve(lambda x: 1 / (1 + x) / 3, lambda x: -x / (1 + x) ** 2 / 3, lambda x: F(1), **more)


EXAMPLES = {
    "rising": below_hill(parameter_about="concentration of the ligand over its reference"),
    "falling": falling(rescaled=(F(1), F(4)), h0=F(1), observable_about="fraction open"),
    "constant": constant(F(1, 5), h0=F(1)),
    "zero": constant(F(0)),
    "plain": hill(2, logarithmic=False),
    "real": CurveData("E", "E", "p[A]", r"\pi_{A}", False, tuple(
        CurvePoint(read_expression(f"{k}*ln(3/2)"), 1 / (1 + F(3, 2) ** k), F(-k * k, 100), F(2))
        for k in range(-4, 5))),
}


def lines(axes: Axes) -> dict[str, Line2D]:
    return {str(line.get_label()): line for line in axes.get_lines()}


def values(line: Line2D) -> list[float]:
    return [float(y) for y in line.get_ydata()]


@pytest.mark.parametrize("name", EXAMPLES)
def test_the_lines_are_the_data(name: str) -> None:
    data = EXAMPLES[name]
    upper, lower = curve_plot(data).axes
    for line in (*lines(lower).values(), lines(upper)["exact"]):
        assert list(line.get_xdata()) == [number_of(point.x) for point in data.points]
    assert values(lines(upper)["exact"]) == [float(point.q) for point in data.points]
    assert values(lines(lower)["exact"]) == [float(abs(p.sensitivity)) for p in data.points]
    assert values(lines(lower)["steepness bound"]) == [
        float(point.steepness * point.q * (1 - point.q)) for point in data.points]
    assert lower.get_xscale() == ("log" if data.logarithmic else "linear")
    (lowest, highest) = lower.get_ylim()
    for line in lines(lower).values():
        assert all(lowest < y < highest for y in values(line) if not math.isnan(y))


def test_the_curves_to_compare_with() -> None:
    data = EXAMPLES["rising"]
    upper, lower = curve_plot(data).axes
    best = saturating(data)
    assert values(lines(upper)["saturating"]) == list(best.values)
    assert values(lines(upper)["saturating, no driving"]) == list(balanced(data, F(2)).values)
    marked = upper.get_lines()[-1]
    assert (*marked.get_xdata(), *marked.get_ydata()) == best.anchor
    assert "nearest one half" not in lines(upper)
    finer = values(lines(lower)["covariance bound"])
    assert math.isnan(finer[5]) and sum(map(math.isnan, finer)) == 1
    assert finer[6] == float(data.points[6].covariance or 0)
    upper, lower = curve_plot(EXAMPLES["falling"]).axes
    assert set(lines(upper)) == {"exact", "saturating, driven or not", "nearest one half"}
    assert set(lines(lower)) == {"exact", "steepness bound"}
    upper, _ = curve_plot(EXAMPLES["zero"]).axes
    assert set(lines(upper)) == {"exact", "saturating", "nearest one half"}


@pytest.mark.parametrize("name", EXAMPLES)
def test_the_lines_differ_without_colour(name: str) -> None:
    for axes in curve_plot(EXAMPLES[name]).axes:
        looks = [(line.get_linestyle(), getattr(line, "_unscaled_dash_pattern", None),
                  line.get_marker()) for line in axes.get_lines()]
        assert len(set(map(str, looks))) == len(looks)
        thickest = max(axes.get_lines()[:-1] or axes.get_lines(), key=Line2D.get_linewidth)
        assert thickest.get_label() == "exact"


@pytest.mark.parametrize("columns", ["single", "double"])
@pytest.mark.parametrize("name", [*EXAMPLES, "long"])
def test_nothing_overlaps(name: str, columns: str) -> None:
    long = below_hill(observable_latex=r"\langle \mathrm{" + "x" * 60 + r"} \rangle",
                      observable_about="what is open " * 5, parameter_about="concentration " * 20)
    figure = curve_plot(EXAMPLES.get(name, long), columns)
    figure.draw_without_rendering()
    assert figure.get_size_inches()[0] == {"single": 3.4, "double": 7.0}[columns]
    boxes = []
    for axes in figure.axes:
        legend = axes.get_legend()
        assert legend is not None
        boxes += [axes.get_window_extent(), legend.get_window_extent(),
                  axes.yaxis.label.get_window_extent()]
    boxes.append(figure.axes[1].xaxis.label.get_window_extent())
    width, height = figure.bbox.width, figure.bbox.height
    for place, box in enumerate(boxes):
        assert box.x0 >= -1 and box.y0 >= -1 and box.x1 <= width + 1 and box.y1 <= height + 1
        for other in boxes[place + 1:]:
            meet = (min(box.x1, other.x1) - max(box.x0, other.x0),
                    min(box.y1, other.y1) - max(box.y0, other.y0))
            assert min(meet) <= 4, (box, other)


# -- files -----------------------------------------------------------------------------------------


@pytest.mark.parametrize(("suffix", "start"), [("pdf", b"%PDF"), ("png", b"\x89PNG"),
                                               ("svg", b"<?xml"), ("PNG", b"\x89PNG")])
def test_the_same_data_give_the_same_bytes(tmp_path: Path, suffix: str, start: bytes) -> None:
    first, second = tmp_path / f"a.{suffix}", tmp_path / f"b.{suffix}"
    curve_figure(EXAMPLES["rising"], first)
    with matplotlib.rc_context({"font.size": 20, "svg.hashsalt": None, "lines.linewidth": 9,
                                "savefig.bbox": "tight", "text.usetex": True}):
        curve_figure(below_hill(parameter_about=EXAMPLES["rising"].parameter_about), second)
        assert matplotlib.rcParams["font.size"] == 20
    assert first.read_bytes() == second.read_bytes()
    assert first.read_bytes().startswith(start)
    assert stat.S_IMODE(first.stat().st_mode) & 0o444 == 0o444
    assert not any(word in first.read_bytes() for word in (b"Date", b"dc:date"))
    assert {path.name for path in tmp_path.iterdir()} == {first.name, second.name}


@pytest.mark.parametrize("name", ["curve", "curve.jpg", "curve.tex", ".png"])
def test_other_suffixes_are_refused(tmp_path: Path, name: str) -> None:
    with pytest.raises(OutputError, match=r"write \.pdf, \.png or \.svg$"):
        curve_figure(EXAMPLES["rising"], tmp_path / name)
    assert not list(tmp_path.iterdir())


def test_files_that_cannot_be_written(tmp_path: Path) -> None:
    with pytest.raises(OutputError, match="there is no folder"):
        curve_figure(EXAMPLES["rising"], tmp_path / "none" / "a.png")
    (tmp_path / "a.png").mkdir()
    with pytest.raises(OutputError, match="is a folder"):
        curve_figure(EXAMPLES["rising"], tmp_path / "a.png")
    with pytest.raises(OutputError, match="there is no width 'triple'; there are single, double"):
        curve_figure(EXAMPLES["rising"], tmp_path / "b.png", "triple")
    assert [path.name for path in tmp_path.iterdir()] == ["a.png"]


def test_a_failure_leaves_the_old_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    target = tmp_path / "a.svg"
    target.write_text("old")

    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("os.replace", full)
    with pytest.raises(OutputError, match=r"^cannot write '.*a\.svg': No space left on device$"):
        curve_figure(EXAMPLES["rising"], target)
    assert target.read_text() == "old" and list(tmp_path.iterdir()) == [target]


# -- labels ----------------------------------------------------------------------------------------


def test_formulas_that_cannot_be_set_become_plain_names(tmp_path: Path) -> None:
    data = replace(EXAMPLES["rising"], parameter_latex=r"\square_{c}",
                   observable_latex=r"\langle \varDelta \rangle")
    upper, lower = curve_plot(data).axes
    assert lower.get_xlabel().startswith("c (concentration")
    assert upper.get_ylabel() == "mean[open]"
    assert lower.get_ylabel() == "abs(d mean[open] / d ln c)"
    curve_figure(data, tmp_path / "a.png")


def test_formulas_that_can_be_set() -> None:
    assert math_label(r"k_{\mathrm{on}}", "k_on") == r"$k_{\mathrm{on}}$"
    assert math_label(r"\Bigl(\tfrac{a}{b}\Bigr)", "x") == r"$\left(\frac{a}{b}\right)$"
    assert math_label(r"\Bigl(x", "x_1") == "x_1"
    assert math_label(r"a\le b", "x") == r"$a\leq b$"
    assert math_label(r"\left", "x$") == r"x\$"
    assert not can_be_set(r"\mathfrak{unclosed") and not can_be_set("a$b")


def test_what_the_file_says_is_text() -> None:
    assert text_label("50% of $x_1^2$ in \\mu 中") == r"50% of \$x_1^2\$ in \mu [U+4E2D]"
    assert with_about("$c$", "", 20) == with_about("$c$", "  ", 20) == "$c$"
    assert with_about("$c$", "in micromolar", 20) == "$c$ (in micromolar)"
    assert with_about(r"$\alpha$", "one two three four", 12) == "$\\alpha$ (one two\nthree four)"
    upper, lower = curve_plot(EXAMPLES["falling"]).axes
    assert upper.get_ylabel() == r"$(\langle \mathrm{open} \rangle - 1)/3$ (fraction open)"
    assert lower.get_ylabel().endswith(r"\right|/3$")


# -- in LaTeX --------------------------------------------------------------------------------------


def test_the_picture_in_latex_compiles(tmp_path: Path, requires_latex: None) -> None:
    hostile = falling(parameter_about=r"50% of \input{x} & a, [b] = {c", rescaled=(F(1, 3), F(2)),
                      observable_about="für $5", parameter_latex=r"c_{a,b}^{[1]}")
    pictures = [curve_pgfplots(data, escaped) for data in (*EXAMPLES.values(), hostile)]
    (tmp_path / "a.tex").write_text(
        "\\documentclass{article}\n\\usepackage{amsmath}\n" + PREAMBLE + "\\begin{document}\n"
        + "\n\n".join(pictures) + "\\end{document}\n")
    done = subprocess.run(["pdflatex", "-interaction=nonstopmode", "-halt-on-error", "a.tex"],
                          cwd=tmp_path, capture_output=True, text=True, check=False, timeout=300)
    assert done.returncode == 0, done.stdout[-2000:]
    assert "Overfull" not in done.stdout and "Package pgfplots Warning" not in done.stdout


def test_the_picture_in_latex_holds_the_data() -> None:
    data = EXAMPLES["rising"]
    text = curve_pgfplots(data, escaped)
    plots = [[pair.strip("()").split(",") for pair in part.split("{\n")[1].split("}")[0].split()]
             for part in text.split("\\addplot") if "mark=none" in part.split("]")[0]]
    assert len(plots) == 6
    for plot, wanted in ((plots[0], [p.q for p in data.points]),
                         (plots[3], [p.sensitivity for p in data.points])):
        assert [float(x) for x, _ in plot] == pytest.approx([float(p.x) for p in data.points], 1e-4)
        assert [float(y) for _, y in plot] == pytest.approx(list(map(float, wanted)), 1e-4)
    assert plots[5][5][1] == "nan"
    assert text.count("addlegendentry") == 6 and text == curve_pgfplots(data, escaped)
    assert max(map(len, text.splitlines())) < 200
