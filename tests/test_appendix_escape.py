"""Text of the file in the document: it prints as it is and commands nothing."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent))

from appendix_networks import PAIR

from symbolic_response.appendix import appendix_text
from symbolic_response.appendix.escape import escaped
from symbolic_response.network.toml_reader import read_network_text

TEXTS = [
    r"\input{/etc/passwd}", "50% of $x$ & #1 ~ ^ _ {}", r"\end{document}", "a^^5cinput b",
    r"\\ % comment", "für Übergänge: Å, ß, œ, ñ, ç, ı, Ł, ő", "α → β at 37 °C, µM, x² ≥ 1, 10⁻³",
    "中文 and Русский and 🧪", "“quotes” – dash — …", "<tag> | \"q\" `b' ?` !`",
    "e\u0301\u0323 x\u0301",
    "x" * 300, "soft\u00adhyphen zero\u200bwidth", "ﬁne ½ Ⅳ",
]


@pytest.mark.parametrize("text", TEXTS)
def test_nothing_but_known_commands_and_ascii(text: str) -> None:
    shown = escaped(text)
    assert shown.isascii()
    assert r"\input" not in shown and r"\end" not in shown and "^^" not in shown
    assert "%" not in shown.replace(r"\%", "")


def test_accents_and_signs() -> None:
    assert escaped("é ï ő") == r"\'{e} \"{\i} \H{o}"
    assert escaped("α Ω Α") == r"$\alpha$ $\Omega$ [U+0391]"
    assert escaped("x²") == r"x${}^{2}$"
    assert escaped("中") == "[U+4E2D]"


def test_hostile_and_foreign_texts_compile(tmp_path: Path, requires_latex: None) -> None:
    quoted = [text.replace("\\", "\\\\").replace('"', '\\"') for text in TEXTS]
    source = PAIR.replace('title = "Two states"', f'title = "{quoted[0]} {quoted[1]}"\n'
                          'about = "' + "\\n\\n".join(quoted) + '"')
    source = source.replace("[symbols.k]", f'[symbols.k]\nabout = "{" ".join(quoted)}"')
    document = appendix_text(read_network_text(source))
    (tmp_path / "document.tex").write_text(document, encoding="ascii")
    run = subprocess.run(
        ["pdflatex", "-interaction=nonstopmode", "-halt-on-error", "document.tex"],
        cwd=tmp_path, capture_output=True, timeout=120, check=False,
    )
    log = (tmp_path / "document.log").read_text(encoding="latin-1")
    assert run.returncode == 0, log[-2000:]
    assert "/etc/passwd)" not in log and "(/etc/passwd" not in log
    assert "Overfull" not in log
