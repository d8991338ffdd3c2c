//! What rules ask of a profile: its swing, and how far two of its ends are apart.

use crate::model::{Crystal, Dual, Formula, ParameterId, ProfilePiece};

/// Points at which a piece is sampled to learn its swing.
const SAMPLES: u32 = 64;

/// Two values closer than this part of the larger one are equal to rounding.
pub const ROUNDING: f64 = 1e-9;

/// The value and the slope of a formula at a position in metre, along x.
#[must_use]
pub fn value_and_slope(formula: &Formula, x: f64) -> (f64, f64) {
    let [along, across, up] = ParameterId::POSITION;
    let at = [
        Dual::parameter(x, along),
        Dual::parameter(0.0, across),
        Dual::parameter(0.0, up),
    ];
    let value = formula.dual_at(&at);
    (value.value, value.slope(along))
}

/// Positions spread evenly over a piece, ends included.
fn positions(piece: &ProfilePiece) -> impl Iterator<Item = f64> + '_ {
    let [from, to] = &piece.range;
    let (from, to) = (from.value, to.value);
    (0..=SAMPLES).map(move |step| from + (to - from) * f64::from(step) / f64::from(SAMPLES))
}

/// What a profile does over its cell.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Swing {
    /// Highest minus lowest, in joule.
    pub height: f64,
    /// The largest magnitude, in joule.
    pub magnitude: f64,
    /// The steepest slope, in joule per metre.
    pub slope: f64,
}

/// The swing of a one-dimensional profile; nothing where it is not finite.
#[must_use]
pub fn swing(crystal: &Crystal) -> Option<Swing> {
    let mut lowest = f64::INFINITY;
    let mut highest = f64::NEG_INFINITY;
    let mut slope: f64 = 0.0;
    for piece in &crystal.potential.profile {
        for x in positions(piece) {
            let (value, rise) = value_and_slope(&piece.formula, x);
            lowest = lowest.min(value);
            highest = highest.max(value);
            slope = slope.max(rise.abs());
        }
    }
    let swing = Swing {
        height: highest - lowest,
        magnitude: highest.abs().max(lowest.abs()),
        slope,
    };
    (swing.height.is_finite() && slope.is_finite()).then_some(swing)
}

/// Where one piece ends and another begins.
pub struct Joint<'a> {
    /// The piece that ends there.
    pub left: &'a ProfilePiece,
    /// The piece that begins there.
    pub right: &'a ProfilePiece,
    /// Value and slope at the end of the left one.
    pub before: (f64, f64),
    /// Value and slope at the beginning of the right one.
    pub after: (f64, f64),
    /// Whether it is the seam from the end of the cell to its beginning.
    pub seam: bool,
}

impl Joint<'_> {
    /// The step upwards over it, in joule.
    #[must_use]
    pub fn step(&self) -> f64 {
        self.after.0 - self.before.0
    }

    /// The change of slope over it, in joule per metre.
    #[must_use]
    pub fn kink(&self) -> f64 {
        self.after.1 - self.before.1
    }

    /// Whether its step is one, and not rounding.
    #[must_use]
    pub fn steps(&self, swing: &Swing) -> bool {
        self.step().abs() > ROUNDING * swing.magnitude
    }

    /// Whether its slopes differ by more than rounding.
    #[must_use]
    pub fn bends(&self, swing: &Swing) -> bool {
        let length = self.right.range[1].value - self.left.range[0].value;
        let rounding = swing.magnitude / length.abs().max(f64::MIN_POSITIVE);
        self.kink().abs() > 10.0 * ROUNDING * swing.slope.max(rounding)
    }

    /// The numbers that its step depends on.
    #[must_use]
    pub fn numbers(&self) -> [Dual; 2] {
        let at = |piece: &ProfilePiece, x: &Dual| {
            let zero = Dual::constant(0.0);
            piece.formula.dual_at(&[x.clone(), zero.clone(), zero])
        };
        [
            at(self.left, &self.left.range[1]),
            at(self.right, &self.right.range[0]),
        ]
    }
}

/// The joints of a one-dimensional profile, the seam last.
#[must_use]
pub fn joints(crystal: &Crystal) -> Vec<Joint<'_>> {
    let pieces = &crystal.potential.profile;
    let (Some(first), Some(last)) = (pieces.first(), pieces.last()) else {
        return Vec::new();
    };
    if crystal.dimension != 1 || !tiles(crystal) {
        return Vec::new();
    }
    let inner = pieces.iter().zip(pieces.iter().skip(1));
    let mut joints: Vec<_> = inner
        .map(|(left, right)| joint(left, right, false))
        .collect();
    joints.push(joint(last, first, true));
    joints.retain(|joint| {
        let numbers = [joint.before, joint.after];
        numbers
            .iter()
            .all(|(value, slope)| value.is_finite() && slope.is_finite())
    });
    joints
}

/// Whether the pieces cover one period; where they do not, that is another rule's matter.
fn tiles(crystal: &Crystal) -> bool {
    let pieces = &crystal.potential.profile;
    let Some(period) = crystal.period().map(|period| period.value) else {
        return false;
    };
    let near = |one: f64, other: f64| (one - other).abs() <= ROUNDING * period.abs();
    let mut pairs = pieces.iter().zip(pieces.iter().skip(1));
    let follow = pairs.all(|(left, right)| near(left.range[1].value, right.range[0].value));
    let ends = pieces.first().zip(pieces.last());
    follow
        && ends
            .is_some_and(|(first, last)| near(last.range[1].value - first.range[0].value, period))
}

fn joint<'a>(left: &'a ProfilePiece, right: &'a ProfilePiece, seam: bool) -> Joint<'a> {
    Joint {
        left,
        right,
        before: value_and_slope(&left.formula, left.range[1].value),
        after: value_and_slope(&right.formula, right.range[0].value),
        seam,
    }
}
