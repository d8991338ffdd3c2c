//! Who moves, how much, how warm.

use super::crystal::CrystalBuild;
use super::takeover::Taken;
use crate::model::evaluate::Context;
use crate::model::words::nearest;
use crate::model::{Dimension, Dual, TroubleKind, Wish};
use crate::syntax::{Integer, StatementKind, Value, Word};

/// How many bands are worked out where nothing else is said.
const USUAL_BANDS: usize = 4;

impl<'w> CrystalBuild<'_, 'w> {
    /// `degeneracy`, `carriers`, `filling`, `temperature`, `title`.
    pub(super) fn carriers(&mut self) {
        self.crystal.degeneracy = 2;
        self.crystal.title = self.crystal.name.clone();
        for word in ["degeneracy", "carriers", "filling", "temperature", "title"] {
            let Some(taken) = self.statements.single(word) else {
                continue;
            };
            let context = self.context(taken);
            match &taken.statement.kind {
                StatementKind::Degeneracy(number) => self.degeneracy(*number, &context),
                StatementKind::Carriers { word } => self.carriers_word(word, &context),
                StatementKind::Filling(value) => self.filling(value, taken, &context),
                StatementKind::Temperature(value) => {
                    self.crystal.temperature =
                        self.not_negative(value, Dimension::TEMPERATURE, "a temperature", &context);
                }
                StatementKind::Title(title) => title.text.clone_into(&mut self.crystal.title),
                _ => {}
            }
        }
    }

    fn degeneracy(&mut self, number: Integer, context: &Context<'_, 'w>) {
        match u32::try_from(number.value) {
            Ok(states) if states > 0 => self.crystal.degeneracy = states,
            _ => {
                let what = format!("a level has at least one state, not {}", number.value);
                self.evaluator.bad::<()>(context.place(number.span), what);
            }
        }
    }

    fn carriers_word(&mut self, word: &'w Word, context: &Context<'_, 'w>) {
        match word.text.as_str() {
            "fermions" => self.crystal.bosons = false,
            "bosons" => self.crystal.bosons = true,
            other => {
                let kind = TroubleKind::UnknownName {
                    name: other.to_owned(),
                    wanted: "carrier",
                    nearest: nearest(other, ["fermions", "bosons"]),
                };
                self.evaluator.fail::<()>(kind, context.place(word.span));
            }
        }
    }

    fn filling(&mut self, value: &'w Value, taken: Taken<'w>, context: &Context<'_, 'w>) {
        let filling = self.not_negative(value, Dimension::NUMBER, "a filling", context);
        if self.crystal.bosons {
            let place = taken.home.place(taken.statement.span);
            self.evaluator.bad::<()>(place, "bosons have no filling");
            return;
        }
        self.crystal.filling = filling;
    }

    pub(super) fn not_negative(
        &mut self,
        value: &'w Value,
        wanted: Dimension,
        what: &str,
        context: &Context<'_, 'w>,
    ) -> Option<Dual> {
        let found = self.evaluator.quantity_of(value, wanted, context)?;
        if found.value >= 0.0 {
            return Some(found);
        }
        let text = context.spot.text(value.span);
        self.evaluator.bad(
            context.place(value.span),
            format!("{what} is not negative, and `{text}` is"),
        )
    }

    /// As many bands as are stated; else as many as filling and targets need, and four at least.
    pub(super) fn count_bands(&mut self) {
        self.crystal.bands = self.stated_bands().unwrap_or_else(|| {
            let by_filling = self.bands_by_filling();
            USUAL_BANDS.max(by_filling).max(self.bands_by_targets())
        });
    }

    fn stated_bands(&mut self) -> Option<usize> {
        let taken = self.statements.single("bands")?;
        let context = self.context(taken);
        match &taken.statement.kind {
            StatementKind::Bands(number) => self.evaluator.band(*number, &context),
            _ => None,
        }
    }

    /// The bands that the filling reaches, and one above.
    fn bands_by_filling(&self) -> usize {
        let Some(filling) = &self.crystal.filling else {
            return 0;
        };
        let full = filling.value / f64::from(self.crystal.degeneracy.max(1));
        let most = f64::from(i32::try_from(crate::model::evaluate::MOST_BANDS).unwrap_or(i32::MAX));
        #[expect(
            clippy::cast_possible_truncation,
            clippy::cast_sign_loss,
            reason = "clamped to a small positive range"
        )]
        let reached = (full - 1e-9).ceil().clamp(0.0, most) as usize;
        reached + 1
    }

    fn bands_by_targets(&self) -> usize {
        let own = self.evaluator.home.key();
        let mut most = 0;
        let mut count = |expression: &crate::model::TargetFormula| {
            for quantity in expression.quantities() {
                if (quantity.of.file, quantity.of.section) == own {
                    most = most.max(quantity.kind.bands_needed());
                }
            }
        };
        for measure in &self.crystal.measures {
            count(&measure.expression);
        }
        for target in &self.crystal.targets {
            if let Wish::Compare {
                expression, limits, ..
            } = &target.wish
            {
                count(expression);
                for (limit, _) in limits.lower.iter().chain(&limits.upper) {
                    count(limit);
                }
            }
        }
        for target in &self.crystal.targets {
            if let Wish::GapIs { of, band, .. } = &target.wish {
                if (of.file, of.section) == own {
                    most = most.max(band + 1);
                }
            }
        }
        most
    }
}
