//! How carriers fill the bands: Fermi level and class (common practice for one-particle bands).

use super::{Class, Gap, GapKind};

/// The largest gap of a semiconductor, 4 eV in joule (common practice).
pub(super) const SEMICONDUCTOR_GAP: f64 = 4.0 * 1.602_176_634e-19;

/// A filling this close to whole bands counts as whole: particles are counted, not measured.
const WHOLE: f64 = 1e-9;

/// What a filling amounts to, in bands' worth of particles.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Filled {
    /// No particle at all.
    None,
    /// This many whole bands.
    Whole(usize),
    /// Whole bands and a part of the next.
    Part(f64),
}

impl Filled {
    /// Of `particles` per cell with `degeneracy` states a level.
    pub fn new(particles: f64, degeneracy: u32) -> Self {
        let bands = particles / f64::from(degeneracy.max(1));
        let whole = bands.round();
        if bands <= WHOLE {
            Self::None
        } else if (bands - whole).abs() <= WHOLE && whole < 1e6 {
            Self::Whole(whole as usize)
        } else {
            Self::Part(bands)
        }
    }
}

/// The class of a crystal whose `filled` bands' worth leaves `gap` above it.
pub(super) fn class(filled: Filled, gap: Option<&Gap>) -> Option<Class> {
    match (filled, gap) {
        (Filled::None, _) => None,
        (Filled::Part(_), _) => Some(Class::Metal),
        (Filled::Whole(_), None) => None,
        (Filled::Whole(_), Some(gap)) => Some(match gap.kind {
            GapKind::Closed | GapKind::Overlap => Class::Semimetal,
            _ if gap.size.value <= SEMICONDUCTOR_GAP => Class::Semiconductor,
            _ => Class::Insulator,
        }),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::bands::Measured;

    fn gap(electronvolt: f64, kind: GapKind) -> Gap {
        Gap {
            size: Measured {
                value: electronvolt * 1.602_176_634e-19,
                uncertainty: 0.0,
            },
            kind,
        }
    }

    /// Two states a level: one particle half-fills the first band, two fill it, three half-fill the
    /// second (common practice).
    #[test]
    fn particles_count_two_a_band() {
        assert_eq!(Filled::new(1.0, 2), Filled::Part(0.5));
        assert_eq!(Filled::new(2.0, 2), Filled::Whole(1));
        assert_eq!(Filled::new(3.0, 2), Filled::Part(1.5));
        assert_eq!(Filled::new(0.0, 2), Filled::None);
        assert_eq!(Filled::new(0.3 * 10.0, 1), Filled::Whole(3));
    }

    #[test]
    fn whole_bands_are_classed_by_their_gap() {
        let whole = Filled::Whole(1);
        assert_eq!(
            class(whole, Some(&gap(1.1, GapKind::Direct))),
            Some(Class::Semiconductor)
        );
        assert_eq!(
            class(whole, Some(&gap(4.0, GapKind::Indirect))),
            Some(Class::Semiconductor)
        );
        assert_eq!(
            class(whole, Some(&gap(4.1, GapKind::Direct))),
            Some(Class::Insulator)
        );
        assert_eq!(
            class(whole, Some(&gap(0.0, GapKind::Closed))),
            Some(Class::Semimetal)
        );
        assert_eq!(
            class(whole, Some(&gap(-0.1, GapKind::Overlap))),
            Some(Class::Semimetal)
        );
        assert_eq!(
            class(Filled::Part(1.5), Some(&gap(1.0, GapKind::Direct))),
            Some(Class::Metal)
        );
    }
}
