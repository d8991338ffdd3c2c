//! Profiles: the potential as a formula, whole or in pieces.

use std::sync::Arc;

use super::crystal::CrystalBuild;
use super::layers::SAME_LENGTH;
use super::poles::find_pole;
use super::takeover::Taken;
use crate::model::evaluate::{Context, Variables};
use crate::model::{Dimension, Dual, Formula, ProfilePiece, Scalar, Trouble, TroubleKind};
use crate::syntax::{Expression, StatementKind, Value};

impl<'w> CrystalBuild<'_, 'w> {
    /// Reads all profiles and checks that their pieces tile one period.
    pub(super) fn profiles(&mut self) {
        let all = self.statements.profiles.clone();
        let mut complete = true;
        for taken in &all {
            let StatementKind::Profile { range, expression } = &taken.statement.kind else {
                continue;
            };
            match self.profile(*taken, range.as_ref(), expression) {
                Some(piece) => self.crystal.potential.profile.push(piece),
                None => complete = false,
            }
        }
        if all.is_empty() || !complete {
            return;
        }
        self.whole_profiles(&all);
        self.tile();
        self.poles();
    }

    fn profile(
        &mut self,
        taken: Taken<'w>,
        range: Option<&'w (Value, Value)>,
        expression: &'w Expression,
    ) -> Option<ProfilePiece> {
        let period = self.one_period();
        let context = Context {
            variables: Variables::Position(self.crystal.dimension.max(1)),
            ..self.context(taken).within(period.as_ref())
        };
        let in_chain =
            range.is_none() || self.allowed(taken, &[1], "a lattice of one dimension for pieces");
        let formula = self.formula(expression, &context);
        let ends = match range {
            _ if !in_chain => None,
            Some((from, to)) => self.piece_ends(from, to, &context),
            None => {
                let period = period.clone().unwrap_or_default();
                Some([Dual::constant(0.0), period])
            }
        };
        Some(ProfilePiece {
            place: context.place(taken.statement.span),
            formula_place: context.place(expression.span),
            range: ends?,
            whole: range.is_none(),
            formula: Arc::new(formula?),
        })
    }

    /// The period of a one-dimensional cell, where it is known.
    pub(super) fn one_period(&self) -> Option<Dual> {
        if self.crystal.dimension != 1 {
            return None;
        }
        self.crystal.conventional.first()?.first().cloned()
    }

    fn formula(
        &mut self,
        expression: &'w Expression,
        context: &Context<'_, 'w>,
    ) -> Option<Formula> {
        let typed = self.evaluator.expression(expression, context)?;
        let typed = self
            .evaluator
            .settle(typed, expression, Some(Dimension::ENERGY), context)?;
        typed.term.into_formula()
    }

    fn piece_ends(
        &mut self,
        from: &'w Value,
        to: &'w Value,
        context: &Context<'_, 'w>,
    ) -> Option<[Dual; 2]> {
        let inner = Context {
            variables: Variables::None,
            ..*context
        };
        let start = self.end_of_piece(from, &inner);
        let end = self.end_of_piece(to, &inner);
        let (start, end) = (start?, end?);
        if end.value > start.value {
            return Some([start, end]);
        }
        let place = context.place(from.span.cover(to.span));
        self.evaluator
            .bad(place, "a piece ends to the right of where it starts")
    }

    /// An end of a piece: a length, or a fraction of the period.
    fn end_of_piece(&mut self, value: &'w Value, context: &Context<'_, 'w>) -> Option<Dual> {
        let (end, is_length) = self.evaluator.length_or_number(value, context)?;
        if is_length || (end.value == 0.0 && end.slopes.is_empty()) {
            return Some(end);
        }
        Some(end.times(context.period?))
    }

    fn whole_profiles(&mut self, all: &[Taken<'w>]) {
        let pieces = &self.crystal.potential.profile;
        let whole = pieces.iter().filter(|piece| piece.whole).count();
        if whole == 0 || all.len() < 2 {
            return;
        }
        let (Some(first), Some(second)) = (all.first(), all.get(1)) else {
            return;
        };
        let kind = TroubleKind::Repeated {
            word: "profile".to_owned(),
        };
        let trouble = Trouble::new(kind, second.home.place(second.statement.span));
        let first = first.home.place(first.statement.span);
        self.evaluator
            .report(trouble.beside(first, "the first one"));
    }

    /// Sorts the pieces; they must follow on each other and add up to the period.
    fn tile(&mut self) {
        let pieces = &mut self.crystal.potential.profile;
        if pieces.iter().any(|piece| piece.whole) {
            return;
        }
        pieces.sort_by(|a, b| a.range[0].value.total_cmp(&b.range[0].value));
        let Some(period) = self.one_period() else {
            return;
        };
        let tolerance = SAME_LENGTH * period.value;
        let pieces = self.crystal.potential.profile.clone();
        let lengths = pieces
            .iter()
            .map(|piece| piece.range[1].value - piece.range[0].value);
        let sum: f64 = lengths.sum();
        let mut overlapping = false;
        for pair in pieces.windows(2) {
            let [left, right] = pair else { continue };
            let by = left.range[1].value - right.range[0].value;
            if by > tolerance {
                overlapping = true;
                let kind = TroubleKind::OverlappingPieces { by };
                let trouble = Trouble::new(kind, right.place);
                self.evaluator
                    .report(trouble.beside(left.place, "the piece before it"));
            }
        }
        let (Some(first), Some(last)) = (pieces.first(), pieces.last()) else {
            return;
        };
        let reach = last.range[1].value - first.range[0].value;
        let over = reach - period.value;
        if !overlapping && over > tolerance {
            let kind = TroubleKind::OverlappingPieces { by: over };
            let trouble = Trouble::new(kind, last.place);
            self.evaluator
                .report(trouble.beside(first.place, "the first piece, one period on"));
        } else if !overlapping && (sum - period.value).abs() > tolerance {
            let kind = TroubleKind::OpenCell {
                sum,
                period: period.value,
                parts: "pieces",
            };
            let open = first_open(&pieces, tolerance).unwrap_or(last);
            self.evaluator.report(Trouble::new(kind, open.place));
        }
    }

    /// A profile that blows up somewhere in its range.
    fn poles(&mut self) {
        if !self.evaluator.setting.is_nominal() {
            return;
        }
        for piece in self.crystal.potential.profile.clone() {
            let boxes = self.region_of(&piece);
            if let Some(at) = find_pole(&piece.formula, &boxes) {
                let kind = TroubleKind::Pole { at };
                self.evaluator
                    .report(Trouble::new(kind, piece.formula_place));
            }
        }
    }

    /// The box of positions that a piece covers; in two and three dimensions one around the conventional cell.
    fn region_of(&self, piece: &ProfilePiece) -> [[f64; 2]; 3] {
        let mut region = [[0.0, 0.0]; 3];
        if self.crystal.dimension == 1 {
            region[0] = [piece.range[0].value, piece.range[1].value];
            return region;
        }
        for (axis, bounds) in region.iter_mut().enumerate() {
            for edge in &self.crystal.conventional {
                let along = edge.get(axis).map_or(0.0, Scalar::value);
                bounds[0] += along.min(0.0);
                bounds[1] += along.max(0.0);
            }
        }
        region
    }
}

/// The piece after which the cell stays open.
fn first_open(pieces: &[ProfilePiece], tolerance: f64) -> Option<&ProfilePiece> {
    pieces.windows(2).find_map(|pair| match pair {
        [left, right] if right.range[0].value - left.range[1].value > tolerance => Some(left),
        _ => None,
    })
}
