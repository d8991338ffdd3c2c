//! What a crystal's people measure energies and masses in.

use super::Crystal;
use super::constants::ELECTRON_MASS;

/// A mass above this is an atom's (the lightest atom has 1837 me).
pub const LIGHTEST_ATOM: f64 = 1000.0 * ELECTRON_MASS;

/// What a crystal's people measure energies and masses in.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Trade {
    /// One recoil energy in joule, where the crystal has a `recoil`.
    pub recoil: Option<f64>,
    /// Whether an atom moves, not an electron.
    pub atoms: bool,
}

impl Trade {
    /// The trade of a crystal, told by its `recoil` and its mass.
    #[must_use]
    pub fn of(crystal: &Crystal) -> Self {
        let recoil = crystal.recoil.as_ref().map(|recoil| recoil.energy.value);
        Self {
            recoil: recoil.filter(|energy| energy.is_finite() && *energy > 0.0),
            atoms: crystal.mass.value > LIGHTEST_ATOM,
        }
    }
}
