//! Which points of the zone have a name, up to the crystal's symmetry and reciprocal vectors.
//!
//! A potential may have less symmetry than its lattice. Points that only the lattice holds equal are then different
//! points, and one that merely looks like a named one has no name: whatever is called X has the levels of X.

use crate::model::Crystal;
use crate::numerics::planewaves::Waves;

/// The named points of one crystal.
pub(super) struct ZoneNames<'a> {
    points: Vec<(&'static str, [f64; 3])>,
    waves: &'a Waves<'a>,
}

impl<'a> ZoneNames<'a> {
    pub fn new(crystal: &Crystal, waves: &'a Waves<'a>) -> Self {
        let kernel = |k: &Vec<f64>| std::array::from_fn(|i| k.get(i).copied().unwrap_or(0.0));
        let points = crystal.zone_points();
        Self {
            points: points.iter().map(|(name, k)| (*name, kernel(k))).collect(),
            waves,
        }
    }

    /// The name of a point, in fractions of the primitive reciprocal vectors.
    pub fn name(&self, k: [f64; 3]) -> Option<String> {
        let mut points = self.points.iter();
        let found = points.find(|(_, point)| self.waves.same_point(*point, k));
        found.map(|(name, _)| (*name).to_string())
    }
}
