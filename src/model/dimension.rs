//! Dimensions of quantities: powers of length, mass, time and temperature.

use std::ops::{Div, Mul};

/// Exponents in twelfths, so that square, cube and fourth roots stay exact.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub struct Dimension {
    /// Of length.
    pub length: i16,
    /// Of mass.
    pub mass: i16,
    /// Of time.
    pub time: i16,
    /// Of temperature.
    pub temperature: i16,
}

impl Dimension {
    /// A bare number, an angle, a fraction.
    pub const NUMBER: Self = Self::of(0, 0, 0, 0);
    /// A length.
    pub const LENGTH: Self = Self::of(1, 0, 0, 0);
    /// A mass.
    pub const MASS: Self = Self::of(0, 1, 0, 0);
    /// A time.
    pub const TIME: Self = Self::of(0, 0, 1, 0);
    /// A temperature.
    pub const TEMPERATURE: Self = Self::of(0, 0, 0, 1);
    /// An energy.
    pub const ENERGY: Self = Self::of(2, 1, -2, 0);
    /// A frequency.
    pub const FREQUENCY: Self = Self::of(0, 0, -1, 0);
    /// An energy times a length.
    pub const ENERGY_LENGTH: Self = Self::of(3, 1, -2, 0);
    /// An inverse length.
    pub const INVERSE_LENGTH: Self = Self::of(-1, 0, 0, 0);

    /// Whole powers of length, mass, time, temperature.
    #[must_use]
    pub const fn of(length: i16, mass: i16, time: i16, temperature: i16) -> Self {
        Self {
            length: 12 * length,
            mass: 12 * mass,
            time: 12 * time,
            temperature: 12 * temperature,
        }
    }

    /// Whether it is that of a bare number.
    #[must_use]
    pub fn is_number(self) -> bool {
        self == Self::NUMBER
    }

    /// The dimension of a power; `None` where an exponent is no whole number of twelfths or out of range.
    #[must_use]
    pub fn power(self, exponent: f64) -> Option<Self> {
        let scaled = |part: i16| -> Option<i16> {
            let wanted = f64::from(part) * exponent;
            let whole = wanted.round();
            let fits = (wanted - whole).abs() < 1e-9 && whole.abs() <= f64::from(i16::MAX / 2);
            #[expect(clippy::cast_possible_truncation, reason = "checked to fit just above")]
            fits.then_some(whole as i16)
        };
        Some(Self {
            length: scaled(self.length)?,
            mass: scaled(self.mass)?,
            time: scaled(self.time)?,
            temperature: scaled(self.temperature)?,
        })
    }

    /// The dimension in words, with its article: "an energy", "an energy times a length", "a number".
    #[must_use]
    pub fn words(self) -> String {
        if let Some(plain) = self.plain() {
            return plain.to_owned();
        }
        if let Some(inverse) = (Self::NUMBER / self).plain() {
            return format!("an inverse {}", without_article(inverse));
        }
        let beside_energy = self / Self::ENERGY;
        if let Some(factor) = beside_energy.plain() {
            return format!("an energy times {factor}");
        }
        if let Some(divisor) = (Self::NUMBER / beside_energy).plain() {
            return format!("an energy per {}", without_article(divisor));
        }
        self.as_powers()
    }

    fn plain(self) -> Option<&'static str> {
        const PLAIN: [(Dimension, &str); 10] = [
            (Dimension::NUMBER, "a number"),
            (Dimension::LENGTH, "a length"),
            (Dimension::MASS, "a mass"),
            (Dimension::TIME, "a time"),
            (Dimension::TEMPERATURE, "a temperature"),
            (Dimension::ENERGY, "an energy"),
            (Dimension::FREQUENCY, "a frequency"),
            (Dimension::of(2, 0, 0, 0), "an area"),
            (Dimension::of(3, 0, 0, 0), "a volume"),
            (Dimension::of(1, 0, -1, 0), "a speed"),
        ];
        PLAIN
            .iter()
            .find(|(dimension, _)| *dimension == self)
            .map(|(_, words)| *words)
    }

    fn as_powers(self) -> String {
        let parts = [
            ("length", self.length),
            ("mass", self.mass),
            ("time", self.time),
            ("temperature", self.temperature),
        ];
        let factors: Vec<String> = parts
            .into_iter()
            .filter(|(_, twelfths)| *twelfths != 0)
            .map(|(name, twelfths)| match exponent_words(twelfths).as_str() {
                "1" => name.to_owned(),
                exponent => format!("{name}^{exponent}"),
            })
            .collect();
        format!("a quantity in {}", factors.join("·"))
    }
}

fn without_article(words: &str) -> &str {
    words.split_once(' ').map_or(words, |(_, noun)| noun)
}

/// Twelfths as a whole number or a reduced fraction in brackets.
fn exponent_words(twelfths: i16) -> String {
    let divisor = (1..=12)
        .rev()
        .find(|divisor| twelfths % divisor == 0 && 12 % divisor == 0)
        .unwrap_or(1);
    match 12 / divisor {
        1 => format!("{}", twelfths / divisor),
        below => format!("({}/{below})", twelfths / divisor),
    }
}

impl Mul for Dimension {
    type Output = Self;
    fn mul(self, other: Self) -> Self {
        Self {
            length: self.length.saturating_add(other.length),
            mass: self.mass.saturating_add(other.mass),
            time: self.time.saturating_add(other.time),
            temperature: self.temperature.saturating_add(other.temperature),
        }
    }
}

impl Div for Dimension {
    type Output = Self;
    fn div(self, other: Self) -> Self {
        Self {
            length: self.length.saturating_sub(other.length),
            mass: self.mass.saturating_sub(other.mass),
            time: self.time.saturating_sub(other.time),
            temperature: self.temperature.saturating_sub(other.temperature),
        }
    }
}
