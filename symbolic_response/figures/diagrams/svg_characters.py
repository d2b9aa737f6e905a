"""The characters that LaTeX commands of labels stand for."""

from __future__ import annotations

_GREEK = """
alpha α beta β gamma γ delta δ epsilon ϵ zeta ζ eta η theta θ iota ι kappa κ lambda λ mu μ nu ν
xi ξ pi π rho ρ sigma σ tau τ upsilon υ phi ϕ chi χ psi ψ omega ω varepsilon ε vartheta ϑ varpi ϖ
varrho ϱ varsigma ς varphi φ varkappa ϰ digamma ϝ
Gamma Γ Delta Δ Theta Θ Lambda Λ Xi Ξ Pi Π Sigma Σ Upsilon Υ Phi Φ Psi Ψ Omega Ω
varGamma Γ varDelta Δ varTheta Θ varLambda Λ varXi Ξ varPi Π varSigma Σ varUpsilon Υ varPhi Φ
varPsi Ψ varOmega Ω
"""
_SIGNS = """
prime ′ backprime ‵ varnothing ∅ emptyset ∅ infty ∞ star ⋆ ast ∗ dagger † ddagger ‡ dag † ddag ‡
circ ∘ bullet • ell ℓ hbar ℏ hslash ℏ Re ℜ Im ℑ imath ı jmath ȷ wp ℘ aleph ℵ partial ∂ nabla ∇
sharp ♯ flat ♭ natural ♮ square □ triangle △ diamond ⋄ Box □ bigcirc ◯ bigstar ★ blacksquare ■
angle ∠ top ⊤ bot ⊥ pm ± mp ∓ cdot · times × div ÷ ominus ⊖ oplus ⊕ otimes ⊗ odot ⊙ oslash ⊘
wedge ∧ vee ∨ neg ¬ cap ∩ cup ∪ setminus ∖ to → gets ← rightarrow → leftarrow ← leftrightarrow ↔
uparrow ↑ downarrow ↓ updownarrow ↕ mapsto ↦ Rightarrow ⇒ Leftarrow ⇐ Leftrightarrow ⇔ Uparrow ⇑
Downarrow ⇓ longrightarrow ⟶ longleftarrow ⟵ nearrow ↗ searrow ↘ swarrow ↙ nwarrow ↖
rightleftharpoons ⇌ leftrightharpoons ⇋ rightleftarrows ⇄ circlearrowleft ↺ circlearrowright ↻
le ≤ leq ≤ ge ≥ geq ≥ ne ≠ neq ≠ ll ≪ gg ≫ approx ≈ sim ∼ simeq ≃ equiv ≡ propto ∝ in ∈ notin ∉
subset ⊂ supset ⊃ mid ∣ parallel ∥ perp ⊥ langle ⟨ rangle ⟩ lbrace { rbrace } lbrack [ rbrack ]
lvert | rvert | lVert ‖ rVert ‖ vert | Vert ‖ lfloor ⌊ rfloor ⌋ lceil ⌈ rceil ⌉ sum ∑ prod ∏ int ∫
dots … ldots … cdots ⋯ vdots ⋮ colon :
"""


def _table(text: str) -> dict[str, str]:
    words = text.split()
    return {f"\\{name}": sign for name, sign in zip(words[::2], words[1::2], strict=True)}


CHARACTERS = _table(_GREEK) | _table(_SIGNS) | {
    r"\{": "{", r"\}": "}", r"\|": "‖", r"\_": "_", r"\%": "%", r"\&": "&", r"\#": "#",
    r"\$": "$", "-": "−", "*": "∗", "'": "′",
}
"""Characters by command or sign."""
SPACES = {r"\,": 1.7, r"\:": 2.2, r"\;": 2.8, r"\!": -1.7, r"\>": 2.2, r"\quad": 10.0}
"""Spaces in pt at 10 pt."""
ACCENTS = {
    r"\hat": "\u0302", r"\bar": "\u0304", r"\tilde": "\u0303", r"\vec": "\u20d7",
    r"\dot": "\u0307", r"\ddot": "\u0308", r"\acute": "\u0301", r"\grave": "\u0300",
    r"\breve": "\u0306", r"\check": "\u030c", r"\mathring": "\u030a", r"\widehat": "",
    r"\widetilde": "", r"\overline": "", r"\underline": "", r"\overrightarrow": "",
    r"\overleftarrow": "",
}
"""Combining characters; none where a line is drawn."""
