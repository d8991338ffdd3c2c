//! Sums of levels with the derivatives that the model gives them (Hellmann–Feynman).
//!
//! With the coefficients c_G of a level held, its energy is a sum of numbers that the model knows with derivatives:
//!
//! ```text
//! E = (ħ²/2m) Σ_ab K_ab b_a·b_b + Σ_G S_G V(G) + Σ_r ρ(r) V_profile(r)/N
//! K_ab = Σ_G |c_G|² (k+G)_a (k+G)_b,   S_G = Σ_G' c*_{G'+G} c_G',   ρ = |ψ|²
//! ```
//!
//! k and r are in fractions of the cell, and c varies in second order only. K, S and ρ of a weighted sum of levels are the
//! sums of theirs.

use crate::model::{Dual, Scalar};
use crate::numerics::planewaves::Density;

use super::Unsolved;
use super::zone_cell::{ZoneCell, dot};
use super::zone_solve::Zone;

/// Grid points along each vector at which a profile's derivatives are summed, in two and three dimensions.
const GRID: [usize; 2] = [96, 32];

impl Zone<'_> {
    /// What a density stands for, in joule times the unit of its weights, with its derivatives.
    pub fn dual(&self, density: &Density) -> Result<Dual, Unsolved> {
        let cell = ZoneCell::<Dual>::new(self.field.crystal).ok_or(Unsolved::BrokenModel)?;
        let mut parts = self.kinetic(&cell, density);
        parts.extend(self.potential(&cell, density));
        parts.extend(self.profile(&cell, density));
        Ok(Dual::sum(&parts))
    }

    fn kinetic(&self, cell: &ZoneCell<Dual>, density: &Density) -> Vec<Dual> {
        let scale = self.field.scale;
        // ħ²/2 over the mass with its derivatives.
        let factor = Dual::constant(scale.energy * scale.length * scale.length * scale.mass)
            .over(&self.field.crystal.mass);
        let rows = cell.reciprocal.iter().zip(&density.kinetic);
        rows.flat_map(|(first, row)| {
            let factor = &factor;
            let pairs = cell.reciprocal.iter().zip(row);
            pairs.map(move |(second, share)| dot(first, second).times(factor).scaled(*share))
        })
        .collect()
    }

    fn potential(&self, cell: &ZoneCell<Dual>, density: &Density) -> Vec<Dual> {
        let reach = self.field.ends.unwrap_or(f64::INFINITY) * (1.0 + 1e-9);
        // One of ±G: V(−G)·S(−G) is the conjugate of V(G)·S(G).
        let half = density.components().into_iter();
        half.filter(|(n, _)| self.field.length_of(*n) <= reach)
            .map(|(n, response)| {
                let twice = if n == [0; 3] { 1.0 } else { 2.0 };
                let (real, imaginary) = self.field.component(cell, n);
                real.scaled(twice * response.re)
                    .minus(&imaginary.scaled(twice * response.im))
            })
            .collect()
    }

    fn profile(&self, cell: &ZoneCell<Dual>, density: &Density) -> Vec<Dual> {
        let Some(piece) = self.field.crystal.potential.profile.first() else {
            return Vec::new();
        };
        let dimension = self.field.dimension;
        let size = GRID.get(dimension - 2).copied().unwrap_or(1);
        let grid = density.on_grid(dimension, size);
        let share = 1.0 / grid.len() as f64;
        let points = grid.iter().enumerate();
        points
            .map(|(index, density)| {
                let at = |axis: usize| {
                    if axis >= dimension {
                        return 0.0;
                    }
                    let power = u32::try_from(dimension - 1 - axis).unwrap_or(0);
                    (index / size.pow(power) % size) as f64 / size as f64
                };
                let place = cell.place([at(0), at(1), at(2)]);
                piece.formula.dual_at(&place).scaled(share * density)
            })
            .collect()
    }
}
