"""What each LaTeX command stands for: Unicode characters, never names of another system's symbols."""

from __future__ import annotations


def _table(text: str) -> dict[str, str]:
    words = text.split()
    return dict(zip(words[::2], words[1::2], strict=True))


GREEK = _table(
    "alpha α beta β gamma γ delta δ epsilon ϵ varepsilon ε zeta ζ eta η theta θ vartheta ϑ iota ι kappa κ "
    "varkappa ϰ lambda λ mu μ nu ν xi ξ pi π varpi ϖ rho ρ varrho ϱ sigma σ varsigma ς tau τ upsilon υ "
    "phi ϕ varphi φ chi χ psi ψ omega ω"
)
CAPITALS = _table("Gamma Γ Delta Δ Theta Θ Lambda Λ Xi Ξ Pi Π Sigma Σ Upsilon Υ Phi Φ Psi Ψ Omega Ω")
ORDINARY = _table(
    "hbar ℏ ell ℓ Re ℜ Im ℑ aleph ℵ nabla ∇ partial ∂ infty ∞ forall ∀ exists ∃ nexists ∄ emptyset ∅ "
    "varnothing ∅ angle ∠ measuredangle ∡ sphericalangle ∢ degree ° circledast ⊛ top ⊤ bot ⊥ neg ¬ lnot ¬ prime ′ "
    "% % & & # # $ $ _ _ dagger † ddagger ‡ square □ triangle △ star ⋆ checkmark ✓ imath ı jmath ȷ "
    "Box □ bigstar ★ backslash \\ vdots ⋮"
)
BINARY = _table(
    "pm ± mp ∓ times × div ÷ cdot ⋅ ast ∗ circ ∘ bullet ∙ oplus ⊕ ominus ⊖ otimes ⊗ oslash ⊘ odot ⊙ "
    "cup ∪ cap ∩ setminus ∖ wedge ∧ land ∧ vee ∨ lor ∨ boxtimes ⊠ boxplus ⊞ diamond ⋄ amalg ⨿ ltimes ⋉ rtimes ⋊ "
    "uplus ⊎ sqcup ⊔ sqcap ⊓ bigtriangleup △"
)
RELATION = _table(
    "leq ≤ le ≤ geq ≥ ge ≥ leqslant ⩽ geqslant ⩾ ll ≪ gg ≫ neq ≠ ne ≠ equiv ≡ sim ∼ simeq ≃ approx ≈ cong ≅ "
    "propto ∝ triangleq ≜ coloneqq ≔ doteq ≐ in ∈ notin ∉ ni ∋ subset ⊂ subseteq ⊆ supset ⊃ supseteq ⊇ "
    "subsetneq ⊊ nsubseteq ⊈ mid ∣ nmid ∤ parallel ∥ nparallel ∦ perp ⟂ to → rightarrow → leftarrow ← gets ← "
    "leftrightarrow ↔ Rightarrow ⇒ Leftarrow ⇐ Leftrightarrow ⇔ mapsto ↦ longrightarrow ⟶ longleftarrow ⟵ "
    "Longrightarrow ⟹ Longleftarrow ⟸ longleftrightarrow ⟷ Longleftrightarrow ⟺ longmapsto ⟼ implies ⟹ "
    "impliedby ⟸ iff ⟺ uparrow ↑ downarrow ↓ nearrow ↗ searrow ↘ hookrightarrow ↪ rightharpoonup ⇀ lesssim ≲ "
    "gtrsim ≳ prec ≺ succ ≻ preceq ⪯ succeq ⪰ vdash ⊢ models ⊨ asymp ≍ rightleftharpoons ⇌ circlearrowleft ↺ "
    "circlearrowright ↻ curvearrowleft ↶ curvearrowright ↷ colon :"
)
INNER = _table("dots … ldots … cdots ⋯ ddots ⋱ dotsc … dotsb ⋯")
BIG = _table(
    "sum ∑ prod ∏ coprod ∐ bigcup ⋃ bigcap ⋂ bigoplus ⨁ bigotimes ⨂ bigodot ⨀ bigvee ⋁ bigwedge ⋀ "
    "int ∫ iint ∬ iiint ∭ oint ∮ oiint ∯"
)
INTEGRALS = set("∫∬∭∮∯")
_NAMES = "sin cos tan cot sec csc arcsin arccos arctan sinh cosh tanh coth ln log lg exp det dim ker deg arg hom"
FUNCTIONS = set(_NAMES.split())
LIMIT_FUNCTIONS = {"lim": "lim", "max": "max", "min": "min", "sup": "sup", "inf": "inf"} | {
    "limsup": "lim sup",
    "liminf": "lim inf",
    "gcd": "gcd",
    "Pr": "Pr",
}
DELIMITERS = _table(
    "lbrace { rbrace } lbrack [ rbrack ] langle ⟨ rangle ⟩ lfloor ⌊ rfloor ⌋ lceil ⌈ rceil ⌉ lvert | rvert | "
    "lVert ‖ rVert ‖ vert | Vert ‖ { { } } | ‖ uparrow ↑ downarrow ↓ backslash \\"
)
OPENING = {"{", "lbrace", "lbrack", "langle", "lfloor", "lceil", "lvert", "lVert"}
CLOSING = {"}", "rbrace", "rbrack", "rangle", "rfloor", "rceil", "rvert", "rVert"}
SPACES = {
    ",": 1 / 6,
    ":": 2 / 9,
    ">": 2 / 9,
    ";": 5 / 18,
    "!": -1 / 6,
    " ": 0.25,
    "quad": 1.0,
    "qquad": 2.0,
    "thinspace": 1 / 6,
    "medspace": 2 / 9,
    "thickspace": 5 / 18,
    "enspace": 0.5,
    "enskip": 0.5,
    "negthinspace": -1 / 6,
    "nobreakspace": 0.25,
    "space": 0.25,
}
_NARROW = "hat tilde dot ddot dddot vec bar check breve acute grave mathring"
_WIDE = "widehat widetilde overline underline overrightarrow overleftarrow overbrace underbrace overleftrightarrow"
ACCENTS = dict.fromkeys(_NARROW.split(), False) | dict.fromkeys(_WIDE.split(), True)
ALPHABETS = {
    "mathbf": "bf",
    "mathrm": "rm",
    "mathit": "wit",
    "mathsf": "sf",
    "mathtt": "tt",
    "mathcal": "cal",
    "mathscr": "cal",
    "mathfrak": "frak",
    "mathbb": "bb",
    "mathnormal": "it",
    "boldsymbol": "bi",
    "bm": "bi",
    "pmb": "bi",
    "mathbfit": "bi",
    "mathbfsf": "bsf",
    "mathsfit": "sfit",
}
TEXTS = {
    "text": "rm",
    "textrm": "rm",
    "textnormal": "rm",
    "mbox": "rm",
    "textbf": "bf",
    "textit": "wit",
    "textsf": "sf",
    "texttt": "tt",
    "emph": "wit",
}
SIZES = {"big": 1.2, "Big": 1.8, "bigg": 2.4, "Bigg": 3.0}
NEGATED = {
    "=": "≠",
    "∈": "∉",
    "⊂": "⊄",
    "⊆": "⊈",
    "≡": "≢",
    "<": "≮",
    ">": "≯",
    "≤": "≰",
    "≥": "≱",
    "∼": "≁",
    "≈": "≉",
    "∥": "∦",
    "∣": "∤",
    "∋": "∌",
    "⊃": "⊅",
    "⊇": "⊉",
    "≅": "≇",
    "≃": "≄",
    "→": "↛",
}
ASCII = {
    "+": ("+", "bin"),
    "-": ("−", "bin"),
    "−": ("−", "bin"),
    "*": ("∗", "bin"),
    "/": ("/", "ord"),
    "=": ("=", "rel"),
    "<": ("<", "rel"),
    ">": (">", "rel"),
    ":": (":", "rel"),
    ",": (",", "punct"),
    ";": (";", "punct"),
    ".": (".", "ord"),
    "!": ("!", "close"),
    "?": ("?", "close"),
    "(": ("(", "open"),
    "[": ("[", "open"),
    ")": (")", "close"),
    "]": ("]", "close"),
    "@": ("@", "ord"),
}
REFUSED = {
    "newcommand": "write the formula out in full",
    "renewcommand": "write the formula out in full",
    "def": "write the formula out in full",
    "DeclareMathOperator": "use \\operatorname{…}",
    "color": "colour carries no meaning in a package; use a word or an underbrace",
    "textcolor": "colour carries no meaning in a package; use a word or an underbrace",
    "prescript": "write {}^{B}_{A}R",
    "SI": "write the number and \\mathrm{unit}",
    "si": "write \\mathrm{unit}",
    "unit": "write \\mathrm{unit}",
    "qty": "write the number and \\mathrm{unit}",
    "ang": "write 30^{\\circ}",
    "ce": "chemistry is not set here",
    "ref": "write a Markdown link [words](#eq:name) outside the formula",
    "eqref": "write a Markdown link [words](#eq:name) outside the formula",
    "cancel": "show the step before and the step after instead",
    "middle": "\\middle belongs between \\left and \\right",
    "limits": "\\limits follows an operator such as \\sum",
    "nolimits": "\\nolimits follows an operator such as \\sum",
}


def _alphabet(upper: int, lower: int | None, digit: int | None) -> dict[str, str]:
    table = {chr(65 + i): chr(upper + i) for i in range(26)}
    if lower is not None:
        table |= {chr(97 + i): chr(lower + i) for i in range(26)}
    if digit is not None:
        table |= {chr(48 + i): chr(digit + i) for i in range(10)}
    return table


def _greek(start: int) -> dict[str, str]:
    """Mathematical Greek blocks (Unicode 16, U+1D6A8 ff.): capitals, nabla, small letters, six variants."""
    table = {chr(0x391 + i): chr(start + i) for i in range(25) if i != 17}
    table["∇"] = chr(start + 25)
    table |= {chr(0x3B1 + i): chr(start + 26 + i) for i in range(25)}
    for offset, char in enumerate("∂ϵϑϰϕϱϖ"):
        table[char] = chr(start + 51 + offset)
    return table


STYLES: dict[str, dict[str, str]] = {
    "bf": _alphabet(0x1D400, 0x1D41A, 0x1D7CE) | _greek(0x1D6A8),
    "it": _alphabet(0x1D434, 0x1D44E, None) | {"h": "ℎ", "ı": "𝚤", "ȷ": "𝚥"} | _greek(0x1D6E2),
    "bi": _alphabet(0x1D468, 0x1D482, 0x1D7CE) | _greek(0x1D71C),
    "sf": _alphabet(0x1D5A0, 0x1D5BA, 0x1D7E2),
    "bsf": _alphabet(0x1D5D4, 0x1D5EE, 0x1D7EC),
    "sfit": _alphabet(0x1D608, 0x1D622, None),
    "tt": _alphabet(0x1D670, 0x1D68A, 0x1D7F6),
    "cal": _alphabet(0x1D49C, 0x1D4B6, None) | dict(zip("BEFHILMRego", "ℬℰℱℋℐℒℳℛℯℊℴ", strict=True)),
    "frak": _alphabet(0x1D504, 0x1D51E, None) | dict(zip("CHIRZ", "ℭℌℑℜℨ", strict=True)),
    "bb": _alphabet(0x1D538, 0x1D552, 0x1D7D8) | dict(zip("CHNPQRZ", "ℂℍℕℙℚℝℤ", strict=True)),
}
STYLES["wit"] = STYLES["it"]


def styled(text: str, variant: str) -> str | None:
    """`text` in a mathematical alphabet, or None when that alphabet lacks one of its letters."""
    if variant == "rm":
        return text
    table = STYLES[variant]
    chars = [table.get(char) for char in text]
    return None if None in chars else "".join(char for char in chars if char)
