//! Byte ranges of a text.

/// A half-open range of bytes, `start..end`, in the text that its holder names.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Span {
    /// First byte of the range.
    pub start: u32,
    /// First byte past the range.
    pub end: u32,
}

impl Span {
    /// The range `start..end`.
    #[must_use]
    pub fn new(start: u32, end: u32) -> Self {
        Self {
            start,
            end: end.max(start),
        }
    }

    /// The smallest range that covers both.
    #[must_use]
    pub fn cover(self, other: Self) -> Self {
        Self {
            start: self.start.min(other.start),
            end: self.end.max(other.end),
        }
    }

    /// The same range, `offset` bytes further on.
    #[must_use]
    pub fn shifted(self, offset: u32) -> Self {
        Self {
            start: self.start + offset,
            end: self.end + offset,
        }
    }

    /// Whether `byte` lies in the range; the position just behind it counts, as a cursor there still touches the word.
    #[must_use]
    pub fn touches(self, byte: u32) -> bool {
        self.start <= byte && byte <= self.end
    }

    /// Its bytes of `text`, or nothing where it does not fit.
    #[must_use]
    pub fn of(self, text: &str) -> &str {
        text.get(self.start as usize..self.end as usize)
            .unwrap_or("")
    }

    /// Its length in bytes.
    #[must_use]
    pub fn len(self) -> u32 {
        self.end - self.start
    }

    /// Whether it holds no byte.
    #[must_use]
    pub fn is_empty(self) -> bool {
        self.start == self.end
    }
}
