//! Lines and columns, in the units that editors count.

/// What a column counts.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Encoding {
    /// Bytes.
    Utf8,
    /// UTF-16 code units: a character outside the basic plane counts two.
    Utf16,
    /// Characters (Unicode scalar values).
    Utf32,
}

/// A line and a column in it, both from 0; what the column counts is said beside it by an [`Encoding`].
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Place {
    /// The line.
    pub line: u32,
    /// The column.
    pub column: u32,
}

impl Place {
    /// The place at `line` and `column`.
    #[must_use]
    pub fn new(line: u32, column: u32) -> Self {
        Self { line, column }
    }
}
