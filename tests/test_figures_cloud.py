"""Figures of clouds: their points against the data, the envelope, their files."""

import math
from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import pytest

from symbolic_response.control.cloud import Cloud, CloudPoint, cloud
from symbolic_response.errors import OutputError
from symbolic_response.figures.cloud import cloud_figure, cloud_plot
from symbolic_response.response.analysis import Analysis
from tests.benchmarks.networks import square_with_chord

F = Fraction


@pytest.fixture(scope="module")
def data() -> Cloud:
    return cloud(Analysis(square_with_chord()), "d ln(p[s1]/p[s3]) / d barrier[e1_3]", 50,
                 workers=1)


@pytest.mark.parametrize("columns", ["single", "double"])
def test_every_point_is_drawn(data: Cloud, columns: str) -> None:
    figure = cloud_plot(data, columns)
    (axes,) = figure.axes
    drawn = {str(line.get_label()): list(zip(line.get_xdata(), line.get_ydata(), strict=True))
             for line in axes.get_lines()}
    assert drawn["sampled"] == [(p.force, float(p.value)) for p in data.points[:50]]
    assert drawn["constructed"] == [(p.force, float(p.value)) for p in data.points[50:]]
    assert drawn["against end-pair force"] == [
        (p.end_pair_force, float(p.value)) for p in data.points]
    (envelope,) = (pairs for name, pairs in drawn.items() if "tanh" in name)
    assert all(y == math.tanh(x / 4) for x, y in envelope)
    assert axes.get_xlim()[0] == 0 and axes.get_xlim()[1] > max(p.force for p in data.points)
    assert axes.get_ylim()[1] > 1
    assert envelope[-1][0] == axes.get_xlim()[1]
    styles = {(line.get_linestyle(), line.get_marker()) for line in axes.get_lines()}
    assert len(styles) == 4  # told apart in grey


def test_labels(data: Cloud) -> None:
    (axes,) = cloud_plot(data).axes
    assert axes.get_xlabel() == (
        r"largest cycle force through $\mathrm{e1\_3}$, $\mathcal{F}_{\max}$")
    assert axes.get_ylabel() == f"${data.value_latex}$"
    (axes,) = cloud_plot(replace(data, value_latex=r"\nothing", transition_latex=r"\square")).axes
    assert axes.get_ylabel() == data.value_text
    assert "through e1_3," in axes.get_xlabel()


def test_without_constructed_points_and_without_forces() -> None:
    point = CloudPoint(F(1), F(0), F(1))
    bare = Cloud("v", "v", "e", "e", "F", "0", 1, (point,), "why not")
    (axes,) = cloud_plot(bare).axes
    assert len(axes.get_lines()) == 3
    assert axes.get_xlim() == (0, 1.02)


@pytest.mark.parametrize("suffix", ["pdf", "png", "svg"])
def test_the_same_data_give_the_same_bytes(data: Cloud, tmp_path: Path, suffix: str) -> None:
    paths = [tmp_path / f"{name}.{suffix}" for name in "ab"]
    for path in paths:
        cloud_figure(data, path)
    assert paths[0].read_bytes() == paths[1].read_bytes()


def test_paths_that_cannot_be(data: Cloud, tmp_path: Path) -> None:
    with pytest.raises(OutputError, match=r"write \.pdf, \.png or \.svg$"):
        cloud_figure(data, tmp_path / "a.gif")
    with pytest.raises(OutputError, match="there is no folder"):
        cloud_figure(data, tmp_path / "none" / "a.svg")
