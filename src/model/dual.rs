//! Numbers that carry their exact derivatives with respect to what the file says.
//!
//! The derivatives are sparse: a crystal of a thousand layers has thousands of
//! parameters, yet each of its numbers depends on a handful.

/// Names something that a number can depend on: a literal, a named value, a material's field, a tolerance.
/// A hash of kind and place, so that the same literal has the same name wherever it is used.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct ParameterId(pub u64);

impl ParameterId {
    /// The position variables `x`, `y`, `z` of a profile, and `q` of a form factor (as the first).
    pub const POSITION: [Self; 3] = [Self(1), Self(2), Self(3)];
}

/// A value in SI units and its derivatives.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Dual {
    /// The value.
    pub value: f64,
    /// Derivatives with respect to parameters, sorted by parameter, zero where absent.
    pub slopes: Vec<(ParameterId, f64)>,
}

impl Dual {
    /// A number that depends on nothing.
    #[must_use]
    pub fn constant(value: f64) -> Self {
        Self {
            value,
            slopes: Vec::new(),
        }
    }
}
