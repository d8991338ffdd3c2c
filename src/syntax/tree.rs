//! The typed statements of a file.
//!
//! *Invariant*: every [`Span`] inside a [`Section`] is relative to the first
//! byte of that section; only [`Entry::start`] is absolute.

use std::sync::Arc;

use crate::text::Span;

/// What a whole text reads as.
#[derive(Clone, Debug, Default)]
pub struct Tree {
    /// The text itself.
    pub text: Arc<str>,
    /// Its sections in order; the first is always the preamble (possibly empty).
    pub entries: Vec<Entry>,
}

/// A section and where it stands.
#[derive(Clone, Debug)]
pub struct Entry {
    /// Absolute byte offset of the section's first byte.
    pub start: u32,
    /// Its stable name within the file (see [`SectionId`]).
    pub id: SectionId,
    /// The section; shared with earlier trees when its text has not changed.
    pub section: Arc<Section>,
}

/// Names a section by its kind, its name and how many of the same kind and name stand before it,
/// so that it survives edits elsewhere in the file.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct SectionId(pub u64);

/// The kinds of section.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum SectionKind {
    /// What stands before the first heading.
    Preamble,
    /// `material …`
    Material,
    /// `crystal …`
    Crystal,
}

/// One section: its heading, if any, and the statements up to the next heading.
#[derive(Clone, Debug)]
pub struct Section {
    /// What it describes.
    pub kind: SectionKind,
    /// The name in its heading; `None` in the preamble and under an unreadable heading.
    pub name: Option<Word>,
    /// The `like NAME` of its heading.
    pub like: Option<Word>,
    /// The logical line of the heading (empty in the preamble).
    pub heading: Span,
    /// Its text, from the heading's first byte to the next heading (or the end).
    pub text: Arc<str>,
    /// A hash of its text.
    pub hash: u64,
    /// Its readable statements in order, the heading not among them.
    pub statements: Vec<Statement>,
    /// Its logical lines in order, heading, blank and comment lines included; their texts add up to `text`.
    pub lines: Vec<Line>,
    /// What could not be read.
    pub problems: Vec<Problem>,
    /// The crystals that its measures and targets speak of (the `of NAME` of a quantity), in order.
    pub mentions: Vec<Word>,
}

/// A logical line: a physical line and those that continue it, terminator included.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Line {
    /// All its bytes.
    pub span: Span,
    /// Its statement or heading, without indent, comment and terminator; empty when it has none.
    pub content: Span,
    /// Its last comment, from `#` to before the terminator; empty when it has none.
    pub comment: Span,
}

/// Something in a line that cannot be read.
#[derive(Clone, Debug, PartialEq)]
pub struct Problem {
    /// Where.
    pub span: Span,
    /// What is wrong.
    pub kind: ProblemKind,
}

/// The kinds of reading problem.
#[derive(Clone, Debug, PartialEq)]
pub enum ProblemKind {
    /// The line's first word is a statement's, but the rest does not read; what was expected there, in plain words
    /// ("a length", "`of` or `at`").
    Unreadable {
        /// What would have been readable at the span's start, in words.
        expected: String,
        /// What stands there instead, shortened ("`off`", "the end of the line").
        found: String,
    },
    /// The first word is no statement.
    UnknownStatement {
        /// The word.
        word: String,
    },
    /// A character that the format does not use.
    StrayCharacter {
        /// The character.
        character: char,
        /// What to write instead, where that is plain (`×` → `*`).
        instead: Option<String>,
    },
    /// A statement that does not belong in this kind of section.
    Misplaced {
        /// The statement word.
        word: String,
        /// Where it stands.
        found_in: SectionKind,
    },
    /// `\` with nothing after it to continue with.
    DanglingContinuation,
    /// Brackets nested past the limit.
    TooDeep,
}

/// A word with its place; compared in NFC.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub struct Word {
    /// The word in NFC.
    pub text: String,
    /// Where.
    pub span: Span,
}

/// A string in quotes.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Quoted {
    /// What stands between the quotes.
    pub text: String,
    /// Where, quotes included.
    pub span: Span,
}

/// A literal integer.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Integer {
    /// Its value.
    pub value: i64,
    /// Where.
    pub span: Span,
}

/// A statement and where it stands.
#[derive(Clone, Debug, PartialEq)]
pub struct Statement {
    /// The whole of it, from its first word to its last character.
    pub span: Span,
    /// Its first word.
    pub word: Span,
    /// What it says.
    pub kind: StatementKind,
}

/// What a statement says.
#[derive(Clone, Debug, PartialEq)]
pub enum StatementKind {
    /// `use "other.cren"`
    Use(Quoted),
    /// `let NAME = VALUE`
    Let {
        /// The name.
        name: Word,
        /// Its value.
        value: Value,
    },
    /// `waive RULE because "reason"`
    Waive {
        /// The rule's name.
        rule: Word,
        /// The reason, if one is given.
        reason: Option<Quoted>,
    },
    /// `mass M`
    Mass(Value),
    /// `edge E`
    Edge(Value),
    /// `monolayer L`
    Monolayer(Value),
    /// `nonparabolic E`
    Nonparabolic(Value),
    /// `rate F`
    Rate(Value),
    /// `source "citation"`
    Source(Quoted),
    /// `title "…"`
    Title(Quoted),
    /// `degeneracy N`
    Degeneracy(Integer),
    /// `carriers fermions` or `carriers bosons`
    Carriers {
        /// The word, `fermions` or `bosons`.
        word: Word,
    },
    /// `filling Q`
    Filling(Value),
    /// `temperature T`
    Temperature(Value),
    /// `recoil L`
    Recoil(Value),
    /// `bands N`
    Bands(Integer),
    /// `lattice …`
    Lattice(LatticeForm),
    /// `layer …`
    Layer(LayerPart),
    /// `stack N times …`
    Stack {
        /// How often.
        times: Integer,
        /// The layers of one repeat.
        parts: Vec<LayerPart>,
    },
    /// `delta S at X`
    Delta {
        /// An energy times a length.
        strength: Value,
        /// Where.
        at: Position,
    },
    /// `profile [X to X] = EXPR`
    Profile {
        /// The ends of the piece; `None` for the whole cell.
        range: Option<(Value, Value)>,
        /// The potential in `x`, `y`, `z`.
        expression: Expression,
    },
    /// `table "file.csv" in UNIT, UNIT [by line|spline]`
    Table {
        /// The file.
        file: Quoted,
        /// Unit of the positions.
        position_unit: Expression,
        /// Unit of the potential.
        energy_unit: Expression,
        /// `line` or `spline`, when said.
        by: Option<Word>,
    },
    /// `cosine`, `depth`, `fourier`, with or without `star`.
    Wave {
        /// Which of the three.
        kind: WaveKind,
        /// The word `star`, when it stands there.
        star: Option<Span>,
        /// The reciprocal vector.
        index: Index,
        /// Its energy.
        energy: Value,
        /// Its phase.
        phase: Option<Value>,
    },
    /// `site SHAPE …`
    Site {
        /// The shape and its sizes.
        shape: Shape,
        /// Its energy.
        energy: Value,
        /// Where.
        at: Position,
    },
    /// `atom NAME at R`
    Atom {
        /// The atom's name.
        name: Word,
        /// Where.
        at: Position,
    },
    /// `formfactor NAME [and NAME] …`
    Formfactor {
        /// The atom, or the first of two.
        name: Word,
        /// The second atom of the symmetric and antisymmetric form.
        second: Option<Word>,
        /// Its values.
        form: FormfactorForm,
    },
    /// `measure NAME = EXPR`
    Measure {
        /// The name.
        name: Word,
        /// The expression over quantities and values.
        expression: Expression,
    },
    /// `require …`
    Require(Requirement),
}

/// The three single-wave statements.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum WaveKind {
    /// E·cos(G·r + A)
    Cosine,
    /// E·sin²((G·r + A)/2)
    Depth,
    /// E·e^{iA}·e^{iG·r}
    Fourier,
}

/// What follows `lattice`.
#[derive(Clone, Debug, PartialEq)]
pub struct LatticeForm {
    /// The kind's word (`chain`, `fcc`, `vectors` …).
    pub kind: Word,
    /// Lengths joined by `by`.
    pub lengths: Vec<Value>,
    /// The length after `axis`.
    pub axis: Option<Value>,
    /// The values after `angle` or `angles`.
    pub angles: Vec<Value>,
    /// The tuples after `vectors`.
    pub vectors: Vec<Position>,
}

/// One stretch of a layered cell.
#[derive(Clone, Debug, PartialEq)]
pub struct LayerPart {
    /// The whole part.
    pub span: Span,
    /// Its thickness.
    pub length: Value,
    /// What fills it.
    pub content: LayerContent,
}

/// What fills a layer.
#[derive(Clone, Debug, PartialEq)]
pub enum LayerContent {
    /// `of MATERIAL [to MATERIAL]`
    Of {
        /// The material, or that at the left end.
        from: Word,
        /// The material at the right end of a graded stretch.
        to: Option<Word>,
    },
    /// `at E [to E] [mass M]`
    At {
        /// The potential, or that at the left end.
        from: Value,
        /// The potential at the right end of a ramp.
        to: Option<Value>,
        /// The mass, where said here.
        mass: Option<Value>,
    },
}

/// A position or other tuple: one entry without brackets, or several within.
#[derive(Clone, Debug, PartialEq)]
pub struct Position {
    /// The whole of it, brackets included.
    pub span: Span,
    /// Its entries.
    pub entries: Vec<Value>,
    /// Whether it is written as a tuple.
    pub bracketed: bool,
}

/// An integer index or a tuple of them.
#[derive(Clone, Debug, PartialEq)]
pub struct Index {
    /// The whole of it.
    pub span: Span,
    /// Its entries.
    pub entries: Vec<Integer>,
}

/// The shape of a site, with its sizes.
#[derive(Clone, Debug, PartialEq)]
pub enum Shape {
    /// `gaussian E sigma L`
    Gaussian {
        /// σ
        sigma: Value,
    },
    /// `sech2 E width L`
    Sech2 {
        /// w
        width: Value,
    },
    /// `lorentzian E width L`
    Lorentzian {
        /// w
        width: Value,
    },
    /// `box E size L [by L [by L]]`
    Box {
        /// The edge lengths.
        sizes: Vec<Value>,
    },
    /// `disk E radius L`
    Disk {
        /// The radius.
        radius: Value,
    },
    /// `sphere E radius L`
    Sphere {
        /// The radius.
        radius: Value,
    },
}

/// The forms of `formfactor`.
#[derive(Clone, Debug, PartialEq)]
pub enum FormfactorForm {
    /// `Q = E` or `Q = E, E`
    At {
        /// |G|² in (2π/a)².
        q: Value,
        /// One energy, or two for the symmetric and antisymmetric parts.
        energies: Vec<Value>,
    },
    /// `curve = EXPR` in `q`
    Curve(Expression),
}

/// What follows `require`.
#[derive(Clone, Debug, PartialEq)]
pub enum Requirement {
    /// `EXPR RELATION`
    Compare {
        /// The left side.
        expression: Expression,
        /// The relation and its limits.
        relation: Relation,
    },
    /// `metal`, `semimetal`, `semiconductor`, `insulator`
    Class(Word),
    /// `gap N [of CRYSTAL] direct|indirect|closed`
    GapIs {
        /// The gap.
        quantity: BandQuantity,
        /// The wanted kind.
        kind: Word,
    },
}

/// A relation and its limits.
#[derive(Clone, Debug, PartialEq)]
pub enum Relation {
    /// `>= V`
    AtLeast(Value),
    /// `<= V`
    AtMost(Value),
    /// `> V`
    Above(Value),
    /// `< V`
    Below(Value),
    /// `= V within V`
    Near {
        /// The wanted value.
        value: Value,
        /// How far off it may be; a literal in `%` is relative to `value`.
        within: Value,
    },
    /// `between V and V`
    Between(Value, Value),
}

/// A value with, possibly, a tolerance.
#[derive(Clone, Debug, PartialEq)]
pub struct Value {
    /// The whole of it.
    pub span: Span,
    /// The nominal value.
    pub expression: Expression,
    /// What stands after `±`.
    pub tolerance: Option<Box<Expression>>,
}

/// An expression and where it stands.
#[derive(Clone, Debug, PartialEq)]
pub struct Expression {
    /// The whole of it, brackets around it excluded.
    pub span: Span,
    /// What it is.
    pub kind: ExpressionKind,
}

/// What an expression is.
#[derive(Clone, Debug, PartialEq)]
pub enum ExpressionKind {
    /// A number, with the unit written directly after it, if any.
    Number {
        /// The number.
        value: f64,
        /// The digits alone.
        digits: Span,
        /// The unit bound to it.
        unit: Option<UnitUse>,
    },
    /// A word: a named value, a constant, a position variable, or a unit alone.
    Name(String),
    /// `-e`
    Negative(Box<Expression>),
    /// `a ∘ b`
    Binary {
        /// Which.
        operator: Operator,
        /// Left side.
        left: Box<Expression>,
        /// Right side.
        right: Box<Expression>,
        /// Where the operator itself stands.
        operator_span: Span,
    },
    /// `f(a, …)`
    Call {
        /// The function's name.
        function: Word,
        /// Its arguments.
        arguments: Vec<Expression>,
    },
    /// A quantity of the bands, in `measure` and `require`.
    Quantity(BandQuantity),
}

/// A unit after a number, with its power.
#[derive(Clone, Debug, PartialEq)]
pub struct UnitUse {
    /// The unit's word.
    pub name: Word,
    /// Its power (1 when none is written).
    pub power: i32,
    /// Unit and power.
    pub span: Span,
}

/// The five operators.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Operator {
    /// `+`
    Add,
    /// `-`
    Subtract,
    /// `*`
    Multiply,
    /// `/`
    Divide,
    /// `^`
    Power,
}

/// A quantity of the bands of a crystal.
#[derive(Clone, Debug, PartialEq)]
pub struct BandQuantity {
    /// The whole of it.
    pub span: Span,
    /// Which.
    pub kind: BandQuantityKind,
    /// The crystal it speaks of, when not its own.
    pub of: Option<Word>,
}

/// The quantities.
#[derive(Clone, Debug, PartialEq)]
pub enum BandQuantityKind {
    /// `gap N`
    Gap(Integer),
    /// `width N`
    Width(Integer),
    /// `bottom N`
    Bottom(Integer),
    /// `top N`
    Top(Integer),
    /// `level N at POINT`
    Level {
        /// The band.
        band: Integer,
        /// The point.
        at: Point,
    },
    /// `mass bottom N`
    MassBottom(Integer),
    /// `mass top N`
    MassTop(Integer),
    /// `hopping N by R`
    Hopping {
        /// The band.
        band: Integer,
        /// The hop, in cells.
        by: Index,
    },
    /// `fermi`
    Fermi,
}

/// A point of the zone.
#[derive(Clone, Debug, PartialEq)]
pub enum Point {
    /// `centre`, `edge` or a zone point's name.
    Named(Word),
    /// A tuple in fractions of the primitive reciprocal vectors.
    Fractions(Position),
}
