//! Quantities of bands: which crystal, which band, which point.

use super::{Context, Evaluator, Term, Typed};
use crate::model::build::{LatticeSummary, nominal_lattice, summarise};
use crate::model::shape::zone::{depends_on_sizes, zone_point, zone_points};
use crate::model::words::nearest;
use crate::model::{
    CrystalRef, Dimension, NameSort, Quantity, QuantityKind, SectionRef, TroubleKind,
};
use crate::syntax::{
    BandQuantity, BandQuantityKind, Index, Integer, Point, Position, SectionKind, Word,
};

/// No crystal has more bands than this worked out.
pub(crate) const MOST_BANDS: i64 = 1000;

/// Hoppings farther than this are slips of the keyboard.
const FARTHEST_HOP: u64 = 10_000;

impl<'w> Evaluator<'w> {
    pub(super) fn quantity(
        &mut self,
        quantity: &'w BandQuantity,
        context: &Context<'_, 'w>,
    ) -> Option<Typed> {
        let place = context.place(quantity.span);
        if !context.bands {
            return self.bad(
                place,
                "a quantity of the bands stands only in `measure` and `require`",
            );
        }
        let section = self.crystal_meant(quantity.of.as_ref(), context)?;
        let (kind, dimension) = self.quantity_kind(quantity, section, context)?;
        let of = CrystalRef {
            file: section.file,
            section: section.id,
        };
        let term = Term::Quantity(Box::new(Quantity { of, place, kind }));
        Some(Typed::new(term, dimension))
    }

    /// The crystal after `of`, or the one that is built.
    pub(crate) fn crystal_meant(
        &mut self,
        of: Option<&'w Word>,
        context: &Context<'_, 'w>,
    ) -> Option<SectionRef<'w>> {
        let Some(word) = of else {
            return Some(self.home);
        };
        let found = self.world.crystal(context.spot.file, &word.text);
        let definition = found.map(|found| found.name_place());
        let place = context.place(word.span);
        self.refer(place, &word.text, NameSort::Crystal, definition);
        if found.is_some() {
            return found;
        }
        let names = self
            .world
            .section_names(context.spot.file, SectionKind::Crystal);
        let kind = TroubleKind::UnknownName {
            name: word.text.clone(),
            wanted: "crystal",
            nearest: nearest(&word.text, names),
        };
        self.fail(kind, place)
    }

    fn quantity_kind(
        &mut self,
        quantity: &'w BandQuantity,
        section: SectionRef<'w>,
        context: &Context<'_, 'w>,
    ) -> Option<(QuantityKind, Dimension)> {
        use BandQuantityKind as Written;
        let energy = Dimension::ENERGY;
        Some(match &quantity.kind {
            Written::Gap(band) => (QuantityKind::Gap(self.band(*band, context)?), energy),
            Written::Width(band) => (QuantityKind::Width(self.band(*band, context)?), energy),
            Written::Bottom(band) => (QuantityKind::Bottom(self.band(*band, context)?), energy),
            Written::Top(band) => (QuantityKind::Top(self.band(*band, context)?), energy),
            Written::Fermi => (QuantityKind::Fermi, energy),
            Written::MassBottom(band) => {
                let band = self.band(*band, context)?;
                (QuantityKind::MassBottom(band), Dimension::MASS)
            }
            Written::MassTop(band) => {
                let band = self.band(*band, context)?;
                (QuantityKind::MassTop(band), Dimension::MASS)
            }
            Written::Level { band, at } => {
                let point = self.point(at, section, context);
                let band = self.band(*band, context)?;
                (QuantityKind::Level(band, point?), energy)
            }
            Written::Hopping { band, by } => {
                let hop = self.hop(by, section, context);
                let band = self.band(*band, context)?;
                (QuantityKind::Hopping(band, hop?), energy)
            }
        })
    }

    /// The number of a band, from 1.
    pub(crate) fn band(&mut self, band: Integer, context: &Context<'_, 'w>) -> Option<usize> {
        if band.value < 1 || band.value > MOST_BANDS {
            let what = format!(
                "bands count from 1 to {MOST_BANDS}, and {} is none",
                band.value
            );
            return self.bad(context.place(band.span), what);
        }
        usize::try_from(band.value).ok()
    }

    /// What is known about the lattice of a crystal; where nothing is, that crystal's own build says so.
    fn lattice_of(&mut self, section: SectionRef<'w>) -> Option<LatticeSummary> {
        let summary = summarise(self.world, section);
        self.broken |= summary.is_none();
        summary
    }

    fn point(
        &mut self,
        point: &'w Point,
        section: SectionRef<'w>,
        context: &Context<'_, 'w>,
    ) -> Option<Vec<f64>> {
        let lattice = self.lattice_of(section)?;
        match point {
            Point::Named(word) => self.named_point(word, section, &lattice, context),
            Point::Fractions(tuple) => self.fractions(tuple, &lattice, context),
        }
    }

    fn named_point(
        &mut self,
        word: &'w Word,
        section: SectionRef<'w>,
        lattice: &LatticeSummary,
        context: &Context<'_, 'w>,
    ) -> Option<Vec<f64>> {
        if matches!(word.text.as_str(), "centre" | "Γ" | "gamma") {
            return Some(vec![0.0; lattice.dimension]);
        }
        let sized = lattice.kind.is_some_and(depends_on_sizes);
        let conventional = if sized {
            nominal_lattice(self.world, section)
        } else {
            Vec::new()
        };
        if sized && conventional.is_empty() {
            // What is wrong with the lattice is said where it stands.
            self.broken = true;
            return None;
        }
        let kind = lattice.kind;
        if let Some(point) = kind.and_then(|kind| zone_point(kind, &conventional, &word.text)) {
            return Some(point);
        }
        let known = kind.map(|kind| zone_points(kind, &conventional));
        let known = known.unwrap_or_default();
        let kind = TroubleKind::UnknownName {
            name: word.text.clone(),
            wanted: "zone point",
            nearest: nearest(&word.text, known.iter().map(|(name, _)| *name)),
        };
        self.fail(kind, context.place(word.span))
    }

    fn fractions(
        &mut self,
        tuple: &'w Position,
        lattice: &LatticeSummary,
        context: &Context<'_, 'w>,
    ) -> Option<Vec<f64>> {
        if tuple.entries.len() != lattice.dimension {
            let needs = format!("{} fractions here", lattice.dimension);
            return self.wrong_dimension("level", needs, context.place(tuple.span));
        }
        let mut fractions = Vec::with_capacity(tuple.entries.len());
        for entry in &tuple.entries {
            let fraction = self.quantity_of(entry, Dimension::NUMBER, context)?;
            fractions.push(fraction.value);
        }
        Some(fractions)
    }

    fn hop(
        &mut self,
        by: &'w Index,
        section: SectionRef<'w>,
        context: &Context<'_, 'w>,
    ) -> Option<Vec<i64>> {
        let lattice = self.lattice_of(section)?;
        if by.entries.len() != lattice.dimension {
            let needs = match lattice.dimension {
                1 => "one whole number of cells here".to_owned(),
                several => format!("{several} whole numbers of cells here"),
            };
            return self.wrong_dimension("hopping", needs, context.place(by.span));
        }
        if let Some(far) = by
            .entries
            .iter()
            .find(|entry| entry.value.unsigned_abs() > FARTHEST_HOP)
        {
            let what = format!("a hop goes over at most {FARTHEST_HOP} cells");
            return self.bad(context.place(far.span), what);
        }
        Some(by.entries.iter().map(|entry| entry.value).collect())
    }

    pub(crate) fn wrong_dimension<T>(
        &mut self,
        word: &str,
        needs: String,
        place: crate::model::Place,
    ) -> Option<T> {
        let kind = TroubleKind::WrongDimension {
            word: word.to_owned(),
            needs,
        };
        self.fail(kind, place)
    }
}
