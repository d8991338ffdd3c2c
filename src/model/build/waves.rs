//! Cosines, depths and Fourier components.

use super::crystal::CrystalBuild;
use super::takeover::Taken;
use crate::model::evaluate::Context;
use crate::model::shape::symmetry::{point_operations, star};
use crate::model::{Dimension, Dual, Place, Trouble, TroubleKind, Wave};
use crate::syntax::{Index, StatementKind, Value, WaveKind};
use crate::text::Span;

/// A component and its partner agree within this share of their size.
const SAME_COMPONENT: f64 = 1e-9;
/// Larger indices are slips of the keyboard, and would not be exact further on.
const LARGEST_INDEX: u64 = 10_000;

impl<'w> CrystalBuild<'_, 'w> {
    /// Reads all waves and checks that Fourier components have their partners.
    pub(super) fn waves(&mut self) {
        let mut fouriers = Vec::new();
        let mut complete = true;
        for taken in self.statements.waves.clone() {
            let StatementKind::Wave {
                kind,
                star,
                index,
                energy,
                phase,
            } = &taken.statement.kind
            else {
                continue;
            };
            let parts = (index, energy, phase.as_ref());
            let wave = self.wave(taken, *kind, *star, parts);
            complete &= wave.is_some() || *kind != WaveKind::Fourier;
            if let Some(wave) = wave {
                if *kind == WaveKind::Fourier {
                    fouriers.push((taken, self.crystal.potential.waves.len()));
                }
                self.crystal.potential.waves.push(wave);
            }
        }
        if complete && self.evaluator.setting.is_nominal() {
            self.partners(&fouriers);
        }
    }

    fn wave(
        &mut self,
        taken: Taken<'w>,
        kind: WaveKind,
        star: Option<Span>,
        (index, energy, phase): (&'w Index, &'w Value, Option<&'w Value>),
    ) -> Option<Wave> {
        let context = self.context(taken);
        let energy = self
            .evaluator
            .quantity_of(energy, Dimension::ENERGY, &context);
        let phase = match phase {
            Some(phase) => self
                .evaluator
                .quantity_of(phase, Dimension::NUMBER, &context),
            None => Some(Dual::constant(0.0)),
        };
        let indices = self.index(taken, index, &context);
        if star.is_some()
            && !self.allowed(
                taken,
                &[2, 3],
                "a lattice of two or three dimensions for a `star`",
            )
        {
            return None;
        }
        let indices = indices?;
        let members = match star {
            Some(_) => self.members(&indices),
            None => vec![indices],
        };
        Some(Wave {
            place: taken.home.place(taken.statement.span),
            kind,
            star: star.is_some(),
            indices: members,
            energy: energy?,
            phase: phase?,
        })
    }

    /// The indices of a wave, as many as the dimension, and such as the centring allows.
    fn index(
        &mut self,
        taken: Taken<'w>,
        index: &'w Index,
        context: &Context<'_, 'w>,
    ) -> Option<Vec<i64>> {
        let dimension = self.crystal.dimension;
        let place = context.place(index.span);
        let indices: Vec<i64> = index.entries.iter().map(|entry| entry.value).collect();
        if dimension == 0 {
            return None;
        }
        if indices.len() != dimension {
            let needs = match dimension {
                1 => "one index".to_owned(),
                several => format!("{several} indices"),
            };
            let word = taken.home.text(taken.statement.word).to_owned();
            return self.evaluator.wrong_dimension(&word, needs, place);
        }
        if indices.iter().any(|one| one.unsigned_abs() > LARGEST_INDEX) {
            let what = format!("an index is at most {LARGEST_INDEX}");
            return self.evaluator.bad(place, what);
        }
        let centring = self.centring();
        if centring.to_primitive(&indices).is_none() {
            let kind = TroubleKind::ForbiddenWave {
                index: indices,
                condition: centring.condition(dimension).to_owned(),
            };
            return self.evaluator.fail(kind, place);
        }
        Some(indices)
    }

    /// All equivalents of a wave under the lattice's own symmetry.
    fn members(&self, indices: &[i64]) -> Vec<Vec<i64>> {
        let vectors = if self.evaluator.setting.draws.is_empty() {
            self.crystal.primitive_values()
        } else {
            self.undrawn_vectors()
        };
        let operations = point_operations(&vectors);
        star(indices, self.centring(), &operations)
    }

    /// Every Fourier component needs its complex conjugate at −G: the potential is real.
    fn partners(&mut self, fouriers: &[(Taken<'w>, usize)]) {
        let sum_at = |crystal: &crate::model::Crystal, wanted: &[i64]| {
            let mut sum = (0.0, 0.0);
            let mut size = 0.0_f64;
            for (_, position) in fouriers {
                let wave = crystal.potential.waves.get(*position);
                let Some(wave) = wave.filter(|wave| wave.indices.iter().any(|one| one == wanted))
                else {
                    continue;
                };
                sum.0 += wave.energy.value * wave.phase.value.cos();
                sum.1 += wave.energy.value * wave.phase.value.sin();
                size = size.max(wave.energy.value.abs());
            }
            (sum, size)
        };
        for (taken, position) in fouriers {
            let Some(wave) = self.crystal.potential.waves.get(*position) else {
                continue;
            };
            let Some(index) = wave.indices.first().cloned() else {
                continue;
            };
            let opposite: Vec<i64> = index.iter().map(|one| -one).collect();
            let (here, size) = sum_at(&self.crystal, &index);
            let (there, _) = sum_at(&self.crystal, &opposite);
            let off = (here.0 - there.0).hypot(here.1 + there.1);
            if off > SAME_COMPONENT * size {
                self.lone(*taken, index, &opposite, fouriers);
            }
        }
    }

    fn lone(
        &mut self,
        taken: Taken<'w>,
        index: Vec<i64>,
        opposite: &[i64],
        fouriers: &[(Taken<'w>, usize)],
    ) {
        let kind = TroubleKind::LoneComponent {
            partner: partner_text(&taken, opposite),
            index,
        };
        let mut trouble = Trouble::new(kind, taken.home.place(taken.statement.span));
        for place in self.others_at(opposite, fouriers) {
            if place != trouble.place {
                trouble = trouble.beside(place, "not its complex conjugate");
            }
        }
        self.evaluator.report(trouble);
    }

    fn others_at(&self, wanted: &[i64], fouriers: &[(Taken<'w>, usize)]) -> Vec<Place> {
        let waves = fouriers
            .iter()
            .filter_map(|(_, position)| self.crystal.potential.waves.get(*position));
        waves
            .filter(|wave| wave.indices.iter().any(|one| one == wanted))
            .map(|wave| wave.place)
            .collect()
    }
}

/// The statement of the component at −G, with this one's values as written.
fn partner_text(taken: &Taken<'_>, opposite: &[i64]) -> String {
    let StatementKind::Wave { energy, phase, .. } = &taken.statement.kind else {
        return String::new();
    };
    let numbers: Vec<String> = opposite.iter().map(ToString::to_string).collect();
    let index = match numbers.as_slice() {
        [only] => only.clone(),
        several => format!("({})", several.join(", ")),
    };
    let energy = taken.home.text(energy.span);
    let Some(phase) = phase else {
        return format!("fourier {index} = {energy}");
    };
    let written = taken.home.text(phase.span);
    let turned = match written.strip_prefix('-') {
        Some(rest) if !rest.contains(['+', '-']) => rest.trim_start().to_owned(),
        _ if written.contains(['+', '-', ' ']) && written.contains(['+', '-']) => {
            format!("-({written})")
        }
        _ => format!("-{written}"),
    };
    format!("fourier {index} = {energy} phase {turned}")
}
