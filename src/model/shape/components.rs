//! Waves as Fourier components.

use crate::model::{Dual, Scalar, Wave};
use crate::syntax::WaveKind;

/// One Fourier component: V(r) contains (real + i·imaginary)·e^{iG·r}.
#[derive(Clone, Debug, PartialEq)]
pub struct Component {
    /// G on the reciprocal vectors of the conventional cell.
    pub index: Vec<i64>,
    /// In joule.
    pub real: Dual,
    /// In joule.
    pub imaginary: Dual,
}

impl Wave {
    /// Its components, with their partners at −G; a `fourier` statement is one component alone.
    /// The same index may come more than once: they add up.
    #[must_use]
    pub fn components(&self) -> Vec<Component> {
        self.indices
            .iter()
            .flat_map(|index| self.components_of(index))
            .collect()
    }

    fn components_of(&self, index: &[i64]) -> Vec<Component> {
        let zero = vec![0; index.len()];
        match self.kind {
            // E·cos(u) = (E/2)·(e^{iu} + e^{−iu})
            WaveKind::Cosine => self.pair(index, 0.5).into(),
            // E·sin²(u/2) = E/2 − (E/4)·(e^{iu} + e^{−iu})
            WaveKind::Depth => {
                let mean = Component {
                    index: zero,
                    real: self.energy.scaled(0.5),
                    imaginary: Dual::constant(0.0),
                };
                let [plus, minus] = self.pair(index, -0.25);
                vec![mean, plus, minus]
            }
            WaveKind::Fourier => {
                let [plus, _] = self.pair(index, 1.0);
                vec![plus]
            }
        }
    }

    fn pair(&self, index: &[i64], factor: f64) -> [Component; 2] {
        let size = self.energy.scaled(factor);
        let real = size.times(&self.phase.cosine());
        let imaginary = size.times(&self.phase.sine());
        let opposite = index.iter().map(|one| -one).collect();
        [
            Component {
                index: index.to_vec(),
                real: real.clone(),
                imaginary: imaginary.clone(),
            },
            Component {
                index: opposite,
                real,
                imaginary: imaginary.negative(),
            },
        ]
    }

    /// Its value where G·r, without the phase, is each of `angles`, one for each of its indices.
    #[must_use]
    pub fn value_at<S: Scalar>(&self, angles: &[S]) -> S {
        let (energy, phase) = (S::lift(&self.energy), S::lift(&self.phase));
        let mut sum = S::number(0.0);
        for angle in angles {
            let turned = angle.plus(&phase);
            let shape = match self.kind {
                WaveKind::Cosine | WaveKind::Fourier => turned.cosine(),
                WaveKind::Depth => turned.scaled(0.5).sine().squared(),
            };
            sum = sum.plus(&energy.times(&shape));
        }
        sum
    }
}
