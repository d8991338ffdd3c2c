//! What quantities usually are in this trade, for electrons and for atoms.
//!
//! The ranges are wide: inside them nothing is said. All of them are common practice, not physics.

use crate::model::constants::{ATOMIC_MASS, ELECTRON_MASS, ELECTRONVOLT as EV, PLANCK};

/// What a quantity is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Kind {
    /// The mass of the carrier.
    Mass,
    /// The thickness of a layer.
    Thickness,
    /// A length of the lattice.
    LatticeLength,
    /// The wavelength of a recoil.
    Recoil,
    /// One monolayer.
    Monolayer,
    /// A temperature.
    Temperature,
    /// An energy of the potential.
    Energy,
    /// An energy that the bands are held against.
    TargetEnergy,
    /// The gap of an energy-dependent mass.
    NonparabolicGap,
    /// A factor on thicknesses.
    Rate,
    /// The size of a site.
    SiteSize,
}

/// Who moves, and over what distance.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Setting {
    /// The carrier's mass in kg.
    pub mass: f64,
    /// A length of the cell in metre, where it is known.
    pub period: Option<f64>,
    /// Whether atoms with form factors make the potential.
    pub atoms: bool,
    /// Whether a recoil is stated.
    pub recoil: bool,
    /// Whether the layers are the steps of a staircase, which may be as thin as they like.
    pub staircase: bool,
}

impl Default for Setting {
    fn default() -> Self {
        Self {
            mass: ELECTRON_MASS,
            period: None,
            atoms: false,
            recoil: false,
            staircase: false,
        }
    }
}

/// A closed interval of SI values.
pub type Range = (f64, f64);

/// Electrons in solids have up to this (heavy bands); atoms begin at [`LIGHTEST_ATOM`].
const HEAVIEST_ELECTRON: f64 = 20.0 * ELECTRON_MASS;
/// In a lattice of light, an electron this heavy is an atom whose unit is wrong.
const HEAVIEST_IN_LIGHT: f64 = 1.5 * ELECTRON_MASS;
/// Light carriers such as polaritons lie below this.
const HEAVIEST_POLARITON: f64 = 1e-3 * ELECTRON_MASS;
/// The lightest mass that anything is described with.
const LIGHTEST: f64 = 1e-6 * ELECTRON_MASS;
const LIGHTEST_ATOM: f64 = 0.9 * ATOMIC_MASS;
const HEAVIEST_MOLECULE: f64 = 1e4 * ATOMIC_MASS;
/// Layers are no thinner than this.
pub const THINNEST: f64 = 0.09e-9;
/// Lattices of light have at least this spacing.
const OPTICAL: f64 = 80e-9;
/// An electron's potential rarely exceeds this, or so many times the kinetic scale of its cell.
const HIGHEST_ELECTRON_ENERGY: f64 = 30.0 * EV;
const HIGHEST_ELECTRON_RATIO: f64 = 50.0;
/// Below this part of the kinetic scale a potential does nothing.
const LOWEST_ELECTRON_RATIO: f64 = 1e-7;
/// An atom's potential rarely exceeds so many times the kinetic scale of its cell.
const HIGHEST_ATOM_RATIO: f64 = 1e7;

#[derive(Clone, Copy, PartialEq)]
enum Carrier {
    Light,
    Electron,
    Atom,
    Neither,
}

impl Setting {
    fn carrier(&self) -> Carrier {
        match self.mass {
            mass if mass < HEAVIEST_POLARITON => Carrier::Light,
            mass if mass <= HEAVIEST_ELECTRON => Carrier::Electron,
            mass if mass >= LIGHTEST_ATOM => Carrier::Atom,
            _ => Carrier::Neither,
        }
    }

    /// h²/(8·m·a²): the kinetic energy at the edge of the zone.
    #[must_use]
    pub fn kinetic(&self) -> Option<f64> {
        let period = self.period?;
        let momentum = PLANCK / period;
        let energy = momentum * (momentum / (8.0 * self.mass));
        (energy.is_finite() && energy > 0.0).then_some(energy)
    }

    /// Whether electrons of a solid move.
    #[must_use]
    pub fn moves_electrons(&self) -> bool {
        self.carrier() == Carrier::Electron
    }

    fn is_optical(&self) -> bool {
        self.recoil && self.period.is_some_and(|period| period > OPTICAL)
    }
}

/// The range inside which nothing is said; nothing where anything goes.
#[must_use]
pub fn allowed(kind: Kind, setting: &Setting) -> Option<Range> {
    let carrier = setting.carrier();
    match kind {
        // Two ranges: see `is_plausible`.
        Kind::Mass => None,
        Kind::Rate => Some((0.2, 5.0)),
        Kind::Monolayer => Some((0.09e-9, 2.0e-9)),
        Kind::NonparabolicGap => Some((5e-3 * EV, 20.0 * EV)),
        Kind::Thickness => {
            let thinnest = if setting.staircase { 0.0 } else { THINNEST };
            match carrier {
                Carrier::Electron => Some((thinnest, 1.001e-6)),
                Carrier::Light | Carrier::Atom => Some((thinnest, 1e-3)),
                Carrier::Neither => None,
            }
        }
        Kind::LatticeLength => match carrier {
            Carrier::Electron if setting.atoms => Some((0.1e-9, 3e-9)),
            Carrier::Electron => Some((0.09e-9, 20e-6)),
            Carrier::Light => Some((0.09e-9, 1e-3)),
            Carrier::Atom if setting.recoil => Some((OPTICAL, 100e-6)),
            Carrier::Atom => Some((0.09e-9, 100e-6)),
            Carrier::Neither => None,
        },
        Kind::Recoil => setting.period.map(|period| (0.1 * period, 50.0 * period)),
        Kind::SiteSize => setting.period.map(|period| (2e-4 * period, 20.0 * period)),
        Kind::Temperature => match (carrier, setting.period) {
            (Carrier::Electron, _) => Some((0.0, 3000.0)),
            (Carrier::Atom, Some(period)) if period > OPTICAL => Some((0.0, 1e-2)),
            _ => None,
        },
        Kind::Energy => {
            let highest = highest_energy(setting)?;
            let lowest = match carrier {
                Carrier::Electron => setting
                    .kinetic()
                    .map_or(0.0, |kinetic| LOWEST_ELECTRON_RATIO * kinetic),
                _ => 0.0,
            };
            Some((lowest, highest))
        }
        Kind::TargetEnergy => Some((0.0, highest_energy(setting)?)),
    }
}

fn highest_energy(setting: &Setting) -> Option<f64> {
    let kinetic = setting.kinetic();
    match setting.carrier() {
        Carrier::Electron => {
            let by_cell = kinetic.map_or(0.0, |kinetic| HIGHEST_ELECTRON_RATIO * kinetic);
            Some(HIGHEST_ELECTRON_ENERGY.max(by_cell))
        }
        Carrier::Atom => kinetic.map(|kinetic| HIGHEST_ATOM_RATIO * kinetic),
        Carrier::Light | Carrier::Neither => None,
    }
}

/// Whether a value is what such a quantity may be. Zero and negative values are judged by their size; zero is.
#[must_use]
pub fn is_plausible(kind: Kind, value: f64, setting: &Setting) -> bool {
    let size = value.abs();
    if size == 0.0 || !size.is_finite() {
        return true;
    }
    if kind == Kind::Mass {
        return plausible_mass(size, setting);
    }
    allowed(kind, setting).is_none_or(|(lowest, highest)| lowest <= size && size <= highest)
}

fn plausible_mass(mass: f64, setting: &Setting) -> bool {
    let heaviest = if setting.is_optical() {
        HEAVIEST_IN_LIGHT
    } else {
        HEAVIEST_ELECTRON
    };
    (LIGHTEST..=heaviest).contains(&mass) || (LIGHTEST_ATOM..=HEAVIEST_MOLECULE).contains(&mass)
}

/// Whether a value is one that is often written: what a guess at the right unit has to give.
#[must_use]
pub fn is_typical(kind: Kind, value: f64, setting: &Setting) -> bool {
    let size = value.abs();
    let within = |lowest: f64, highest: f64| lowest <= size && size <= highest;
    if !is_plausible(kind, value, setting) {
        return false;
    }
    match kind {
        Kind::Mass => {
            let electron = within(0.005 * ELECTRON_MASS, 5.0 * ELECTRON_MASS);
            let atom = within(0.9 * ATOMIC_MASS, 300.0 * ATOMIC_MASS);
            atom || (electron && !setting.is_optical())
        }
        Kind::Rate => within(0.5, 2.0),
        Kind::Monolayer => within(0.1e-9, 1.5e-9),
        Kind::NonparabolicGap => within(0.05 * EV, 10.0 * EV),
        Kind::Thickness => within(0.2e-9, 300e-9),
        Kind::LatticeLength => match setting.carrier() {
            Carrier::Atom => within(100e-9, 5e-6),
            _ if setting.atoms => within(0.2e-9, 1.5e-9),
            _ => within(0.2e-9, 300e-9),
        },
        Kind::Recoil => setting
            .period
            .is_some_and(|period| within(0.9 * period, 4.0 * period)),
        Kind::SiteSize => setting
            .period
            .is_some_and(|period| within(0.02 * period, period)),
        Kind::Temperature => match setting.carrier() {
            Carrier::Atom => within(1e-9, 1e-3),
            _ => within(1e-3, 1000.0),
        },
        Kind::Energy | Kind::TargetEnergy => typical_energy(size, setting),
    }
}

fn typical_energy(size: f64, setting: &Setting) -> bool {
    match (setting.carrier(), setting.kinetic()) {
        (Carrier::Atom, Some(kinetic)) => (0.01 * kinetic..=1e4 * kinetic).contains(&size),
        (Carrier::Electron, _) => (1e-4 * EV..=10.0 * EV).contains(&size),
        _ => false,
    }
}

/// Units that are mixed up for such a quantity, the likeliest first.
#[must_use]
pub fn usual_units(kind: Kind, setting: &Setting) -> &'static [&'static str] {
    let atom = setting.carrier() == Carrier::Atom;
    match kind {
        Kind::Mass => &["me", "u"],
        Kind::Rate => &["%"],
        Kind::Monolayer => &["nm", "angstrom", "pm"],
        Kind::NonparabolicGap => &["eV", "meV"],
        Kind::LatticeLength if setting.atoms => &["angstrom", "nm", "bohr", "pm"],
        Kind::Thickness | Kind::LatticeLength | Kind::Recoil | Kind::SiteSize => {
            &["nm", "um", "angstrom", "pm"]
        }
        Kind::Temperature if atom => &["nK", "uK", "mK"],
        Kind::Temperature => &["K", "mK"],
        Kind::Energy | Kind::TargetEnergy if atom => &["neV", "ueV"],
        Kind::Energy | Kind::TargetEnergy => &["meV", "eV", "ueV"],
    }
}

/// What a quantity is, in words.
#[must_use]
pub fn in_words(kind: Kind) -> &'static str {
    match kind {
        Kind::Mass => "the mass of a carrier",
        Kind::Thickness => "the thickness of a layer",
        Kind::LatticeLength => "the length of a cell",
        Kind::Recoil => "the wavelength of a recoil in this lattice",
        Kind::Monolayer => "a monolayer",
        Kind::Temperature => "a temperature here",
        Kind::Energy => "a potential in this cell",
        Kind::TargetEnergy => "an energy of these bands",
        Kind::NonparabolicGap => "the gap of a material",
        Kind::Rate => "a growth rate's factor",
        Kind::SiteSize => "the size of a site in this cell",
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn atoms(period: f64) -> Setting {
        Setting {
            mass: 87.0 * ATOMIC_MASS,
            period: Some(period),
            recoil: true,
            ..Setting::default()
        }
    }

    #[test]
    fn electrons_and_atoms_are_told_apart() {
        assert!(is_plausible(Kind::Energy, 0.235 * EV, &Setting::default()));
        assert!(is_plausible(Kind::Energy, 1e-11 * EV, &atoms(400e-9)));
        assert!(!is_plausible(Kind::Energy, 0.235 * EV, &atoms(400e-9)));
        assert!(!is_plausible(Kind::Temperature, 77.0, &atoms(400e-9)));
        assert!(is_plausible(Kind::Temperature, 77.0, &Setting::default()));
    }

    #[test]
    fn lattices_of_light_may_be_400_to_2000_nanometre() {
        for period in [400e-9, 532e-9, 1e-6, 2e-6] {
            assert!(is_plausible(Kind::LatticeLength, period, &atoms(period)));
            assert!(is_plausible(Kind::Recoil, 2.0 * period, &atoms(period)));
        }
    }

    #[test]
    fn masses_between_electrons_and_atoms_are_nobodys() {
        let plain = Setting::default();
        for (mass, plausible) in [
            (0.0135, true),
            (2.0, true),
            (122.0, false),
            (1837.0, true),
            (2.4e5, true),
        ] {
            assert_eq!(
                is_plausible(Kind::Mass, mass * ELECTRON_MASS, &plain),
                plausible,
                "{mass}"
            );
        }
    }
}
