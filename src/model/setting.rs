//! Where in its tolerances, and with which numbers replaced, a model is built.

use rustc_hash::FxHashMap;

use super::ParameterId;

/// A point at which a model is built; the default is the nominal one.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Setting {
    /// For a tolerance, where in it: −1 … 1, 0 where absent.
    pub draws: FxHashMap<ParameterId, f64>,
    /// For a literal, a named value or a field, its value in SI units instead.
    pub overrides: FxHashMap<ParameterId, f64>,
}

impl Setting {
    /// The nominal values.
    #[must_use]
    pub fn nominal() -> Self {
        Self::default()
    }

    /// Whether it is the nominal one.
    #[must_use]
    pub fn is_nominal(&self) -> bool {
        self.draws.is_empty() && self.overrides.is_empty()
    }

    /// Where in a tolerance.
    #[must_use]
    pub fn draw(&self, id: ParameterId) -> f64 {
        if self.draws.is_empty() {
            return 0.0;
        }
        self.draws.get(&id).copied().unwrap_or(0.0)
    }

    /// The value that replaces a parameter, if one does.
    #[must_use]
    pub fn replacement(&self, id: ParameterId) -> Option<f64> {
        if self.overrides.is_empty() {
            return None;
        }
        self.overrides.get(&id).copied()
    }
}
