//! The words of the format, in one list that the grammar, the editor and the
//! format's reference share; a test holds it against `grammar/crenate.pest`.

use super::SectionKind;

/// A word that begins a statement.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct StatementWord {
    /// The word.
    pub word: &'static str,
    /// The kinds of section that it may stand in.
    pub sections: &'static [SectionKind],
    /// The dimensions (1, 2, 3) of the crystals that it serves.
    pub dimensions: &'static [u8],
    /// How it is written, in the notation of the format's reference: `[ ]` optional, `|` or.
    pub form: &'static str,
    /// What it says, in one clause.
    pub summary: &'static str,
}

const PREAMBLE: &[SectionKind] = &[SectionKind::Preamble];
const MATERIAL: &[SectionKind] = &[SectionKind::Material];
const CRYSTAL: &[SectionKind] = &[SectionKind::Crystal];
const SECTIONS: &[SectionKind] = &[SectionKind::Material, SectionKind::Crystal];
const ANYWHERE: &[SectionKind] = &[
    SectionKind::Preamble,
    SectionKind::Material,
    SectionKind::Crystal,
];
const ALL: &[u8] = &[1, 2, 3];
const ONE: &[u8] = &[1];
const TWO_THREE: &[u8] = &[2, 3];

const fn word(
    word: &'static str,
    sections: &'static [SectionKind],
    dimensions: &'static [u8],
    form: &'static str,
    summary: &'static str,
) -> StatementWord {
    StatementWord {
        word,
        sections,
        dimensions,
        form,
        summary,
    }
}

/// The two words that open a section.
pub const HEADINGS: &[&str] = &["material", "crystal"];

/// Every statement word, in the order of the format's reference.
pub const STATEMENTS: &[StatementWord] = &[
    word(
        "use",
        PREAMBLE,
        ALL,
        "use \"FILE\"",
        "takes the materials, crystals and names of another file",
    ),
    word("let", ANYWHERE, ALL, "let NAME = VALUE", "names a value"),
    word(
        "waive",
        ANYWHERE,
        ALL,
        "waive RULE because \"REASON\"",
        "silences a rule here, with the reason",
    ),
    word(
        "mass",
        SECTIONS,
        ALL,
        "mass M",
        "the carrier's effective mass",
    ),
    word(
        "edge",
        MATERIAL,
        ALL,
        "edge E",
        "the potential that the carrier sees in this material",
    ),
    word(
        "monolayer",
        SECTIONS,
        ALL,
        "monolayer L",
        "the thickness of one monolayer, the unit `ML`",
    ),
    word(
        "nonparabolic",
        MATERIAL,
        ALL,
        "nonparabolic E",
        "the gap that makes the mass grow with energy",
    ),
    word(
        "rate",
        MATERIAL,
        ALL,
        "rate F",
        "a factor on the thickness of all layers of this material",
    ),
    word(
        "source",
        MATERIAL,
        ALL,
        "source \"CITATION\"",
        "where the numbers come from",
    ),
    word("title", SECTIONS, ALL, "title \"TEXT\"", "a name to show"),
    word(
        "degeneracy",
        CRYSTAL,
        ALL,
        "degeneracy N",
        "states per level, 2 unless said",
    ),
    word(
        "carriers",
        CRYSTAL,
        ALL,
        "carriers fermions|bosons",
        "what moves in the crystal, fermions unless said",
    ),
    word(
        "filling",
        CRYSTAL,
        ALL,
        "filling Q",
        "particles per primitive cell",
    ),
    word(
        "temperature",
        CRYSTAL,
        ALL,
        "temperature T",
        "the temperature that gaps are held against",
    ),
    word(
        "recoil",
        CRYSTAL,
        ALL,
        "recoil L",
        "the wavelength whose recoil energy is the unit `Er`",
    ),
    word(
        "bands",
        CRYSTAL,
        ALL,
        "bands N",
        "how many bands to solve for, 4 unless more are needed",
    ),
    word(
        "lattice",
        CRYSTAL,
        ALL,
        "lattice KIND L …",
        "the cell and its lengths",
    ),
    word(
        "layer",
        CRYSTAL,
        ONE,
        "layer L of MATERIAL [to MATERIAL] | layer L at E [to E] [mass M]",
        "the next stretch of the cell",
    ),
    word(
        "stack",
        CRYSTAL,
        ONE,
        "stack N times L of M, L of M …",
        "a sequence of layers, repeated",
    ),
    word(
        "delta",
        CRYSTAL,
        ONE,
        "delta S at X",
        "an infinitely thin wall or well; S is an energy times a length",
    ),
    word(
        "profile",
        CRYSTAL,
        ALL,
        "profile [X to X] = EXPR",
        "the potential as an expression in `x`, `y`, `z`",
    ),
    word(
        "table",
        CRYSTAL,
        ONE,
        "table \"FILE\" in UNIT, UNIT [by line|spline]",
        "the potential as samples from a file",
    ),
    word(
        "cosine",
        CRYSTAL,
        ALL,
        "cosine [star] G = E [phase A]",
        "one wave, E·cos(G·r + A)",
    ),
    word(
        "depth",
        CRYSTAL,
        ALL,
        "depth [star] G = E [phase A]",
        "one standing wave from 0 to E, E·sin²((G·r + A)/2)",
    ),
    word(
        "fourier",
        CRYSTAL,
        ALL,
        "fourier G = E [phase A]",
        "one complex component, E·e^{iA}·e^{iG·r}",
    ),
    word(
        "site",
        CRYSTAL,
        ALL,
        "site SHAPE E … at R",
        "a bump or dip at a place and all its images",
    ),
    word(
        "atom",
        CRYSTAL,
        TWO_THREE,
        "atom NAME at R",
        "an atom that has form factors",
    ),
    word(
        "formfactor",
        CRYSTAL,
        TWO_THREE,
        "formfactor NAME Q = E | formfactor NAME and NAME Q = E, E | formfactor NAME curve = EXPR",
        "what the atoms of a name add to the Fourier components",
    ),
    word(
        "measure",
        CRYSTAL,
        ALL,
        "measure NAME = EXPR",
        "names a number made of the bands, to show and to require",
    ),
    word(
        "require",
        CRYSTAL,
        ALL,
        "require EXPR >= V | require gap N direct | require insulator",
        "a target that the bands must meet",
    ),
];

/// Words that join the parts of statements; never units or named values.
pub const CLAUSES: &[&str] = &[
    "of", "at", "to", "by", "and", "in", "within", "between", "phase", "sigma", "width", "size",
    "radius", "angle", "angles", "axis", "mass", "like", "because",
];

/// Other words with a place of their own inside one statement.
pub const FIXED: &[&str] = &[
    "times", "star", "curve", "fermions", "bosons", "line", "spline", "direct", "indirect",
    "closed",
];

/// Classes that `require` may name.
pub const CLASSES: &[&str] = &["metal", "semimetal", "semiconductor", "insulator"];

/// First words of the quantities of the bands (`mass` is followed by `bottom` or `top`).
pub const QUANTITIES: &[&str] = &[
    "gap", "width", "bottom", "top", "level", "mass", "hopping", "fermi",
];

/// Shapes of `site`.
pub const SHAPES: &[&str] = &["gaussian", "sech2", "lorentzian", "box", "disk", "sphere"];

/// A kind of lattice.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct LatticeKind {
    /// The word after `lattice`.
    pub word: &'static str,
    /// Its dimension for each way to write it; `hexagonal` has two.
    pub dimensions: &'static [u8],
    /// How it is written after `lattice`.
    pub form: &'static str,
}

const fn kind(word: &'static str, dimensions: &'static [u8], form: &'static str) -> LatticeKind {
    LatticeKind {
        word,
        dimensions,
        form,
    }
}

/// Every kind of lattice.
pub const LATTICES: &[LatticeKind] = &[
    kind("chain", &[1], "chain L"),
    kind("square", &[2], "square L"),
    kind("rectangular", &[2], "rectangular L by L"),
    kind("centred-rectangular", &[2], "centred-rectangular L by L"),
    kind("hexagonal", &[2, 3], "hexagonal L [axis L]"),
    kind("oblique", &[2], "oblique L by L angle A"),
    kind("cubic", &[3], "cubic L"),
    kind("fcc", &[3], "fcc L"),
    kind("bcc", &[3], "bcc L"),
    kind("tetragonal", &[3], "tetragonal L axis L"),
    kind("body-tetragonal", &[3], "body-tetragonal L axis L"),
    kind("rhombohedral", &[3], "rhombohedral L angle A"),
    kind("orthorhombic", &[3], "orthorhombic L by L by L"),
    kind("base-orthorhombic", &[3], "base-orthorhombic L by L by L"),
    kind("body-orthorhombic", &[3], "body-orthorhombic L by L by L"),
    kind("face-orthorhombic", &[3], "face-orthorhombic L by L by L"),
    kind("monoclinic", &[3], "monoclinic L by L by L angle A"),
    kind(
        "base-monoclinic",
        &[3],
        "base-monoclinic L by L by L angle A",
    ),
    kind("triclinic", &[3], "triclinic L by L by L angles A, A, A"),
    kind("vectors", &[1, 2, 3], "vectors (…) (…) …"),
];

/// Functions of expressions. Any `word(` reads as a call; these are the ones with a meaning.
pub const FUNCTIONS: &[&str] = &[
    "sqrt", "exp", "log", "log10", "sin", "cos", "tan", "asin", "acos", "atan", "sinh", "cosh",
    "tanh", "sech", "abs", "min", "max", "floor", "ceil", "round",
];

/// The entry of a statement word.
#[must_use]
pub fn statement(word: &str) -> Option<&'static StatementWord> {
    STATEMENTS.iter().find(|entry| entry.word == word)
}

/// The entry of a lattice kind.
#[must_use]
pub fn lattice(word: &str) -> Option<&'static LatticeKind> {
    LATTICES.iter().find(|entry| entry.word == word)
}

/// Whether `word` is a clause word.
#[must_use]
pub fn is_clause(word: &str) -> bool {
    CLAUSES.contains(&word)
}

/// The statement words that may stand in a kind of section, in the order of the reference.
pub fn statements_in(section: SectionKind) -> impl Iterator<Item = &'static StatementWord> {
    STATEMENTS
        .iter()
        .filter(move |entry| entry.sections.contains(&section))
}
