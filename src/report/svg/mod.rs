//! Pictures of crystals as SVG.

mod chain;
mod lattice;
mod parts;

use super::analyst::Analyst;
use super::words;
use crate::bands::Unsolved;
use crate::model::Crystal;

/// Points along a line of a chain's picture.
const POINTS: usize = 96;

/// The picture of a crystal: of a chain its potential with the bands, E(k), and |ψ|² at the edges; of a lattice its
/// bands along the standard path and the density of states.
///
/// # Errors
/// In words, where it has no bands to draw.
pub fn draw(
    analyst: &Analyst,
    crystal: &Crystal,
    cancel: &(dyn Fn() -> bool + Sync),
) -> Result<String, String> {
    let told = |why: Unsolved| words::unsolved(&why);
    let solver = analyst.solver();
    let solution = solver.solve(crystal, cancel).map_err(told)?;
    let document = if crystal.dimension == 1 {
        let picture = solver.picture(crystal, POINTS, cancel).map_err(told)?;
        chain::draw(crystal, &solution, &picture)
    } else {
        let picture = solver.lattice_picture(crystal, cancel).map_err(told)?;
        lattice::draw(crystal, &solution, &picture)
    };
    let document = document.ok_or("there is nothing to draw")?;
    Ok(document.to_string() + "\n")
}
