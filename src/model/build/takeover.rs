//! `like`: which statements a section has, its own and those it takes over.

use super::{SectionRef, World};
use crate::model::NameSort;
use crate::model::evaluate::Evaluator;
use crate::model::words::nearest;
use crate::model::{Trouble, TroubleKind};
use crate::syntax::{Requirement, SectionKind, Statement, StatementKind};

/// A statement and the section that says it.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Taken<'w> {
    pub(crate) home: SectionRef<'w>,
    pub(crate) statement: &'w Statement,
}

/// Why a chain of `like` ends early.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) enum ChainEnd {
    /// A section that is like nothing: as it should.
    Whole,
    /// A name that nothing defines, in the section of that place in the chain.
    Unknown(usize),
    /// It comes back to the section of that place in the chain.
    Circle(usize),
}

/// A section, what it is like, what that is like, and so on; each once.
pub(crate) fn chain_of<'w>(
    world: &'w World,
    start: SectionRef<'w>,
) -> (Vec<SectionRef<'w>>, ChainEnd) {
    let mut chain = vec![start];
    let mut current = start;
    while let Some(like) = &current.section.like {
        let next = match current.section.kind {
            SectionKind::Material => world.material(current.file, &like.text),
            _ => world.crystal(current.file, &like.text),
        };
        let Some(next) = next else {
            return (chain.clone(), ChainEnd::Unknown(chain.len() - 1));
        };
        if let Some(back) = chain.iter().position(|seen| seen.key() == next.key()) {
            return (chain, ChainEnd::Circle(back));
        }
        chain.push(next);
        current = next;
    }
    (chain, ChainEnd::Whole)
}

/// Reports what is wrong with the chain of the section that is built, and the names it uses.
pub(crate) fn check_chain<'w>(
    evaluator: &mut Evaluator<'w>,
    chain: &[SectionRef<'w>],
    end: &ChainEnd,
) {
    let Some(own) = chain.first() else { return };
    let Some(like) = &own.section.like else {
        return;
    };
    let material = own.section.kind == SectionKind::Material;
    let sort = if material {
        NameSort::Material
    } else {
        NameSort::Crystal
    };
    let place = own.place(like.span);
    let found = match own.section.kind {
        SectionKind::Material => evaluator.world.material(own.file, &like.text),
        _ => evaluator.world.crystal(own.file, &like.text),
    };
    evaluator.refer(
        place,
        &like.text,
        sort,
        found.map(|found| found.name_place()),
    );
    match end {
        ChainEnd::Whole => {}
        // Said by the section that stands there itself.
        ChainEnd::Unknown(behind) if *behind > 0 => evaluator.broken = true,
        ChainEnd::Unknown(_) => {
            let names = evaluator.world.section_names(own.file, own.section.kind);
            let kind = TroubleKind::UnknownName {
                name: like.text.clone(),
                wanted: if material { "material" } else { "crystal" },
                nearest: nearest(&like.text, names.filter(|name| *name != own.name())),
            };
            evaluator.report(Trouble::new(kind, place));
        }
        ChainEnd::Circle(back) if *back > 0 => evaluator.broken = true,
        ChainEnd::Circle(_) => {
            let names = chain
                .iter()
                .chain(std::iter::once(own))
                .map(|one| one.name().to_owned());
            let kind = TroubleKind::CircularName {
                circle: names.collect(),
            };
            evaluator.report(Trouble::new(kind, place));
        }
    }
    evaluator.broken |= chain
        .iter()
        .any(|section| !section.section.problems.is_empty());
}

/// Mistakes in statements of another section that only the taking over makes: says who takes them over.
pub(crate) fn mark_taken_over(home: SectionRef<'_>, troubles: &mut [Trouble]) {
    for trouble in troubles {
        if (trouble.place.file, trouble.place.section) != home.key() {
            let what = format!("as `{}` takes it over", home.name());
            trouble.related.push((home.name_place(), what));
        }
    }
}

/// The statements of a crystal or material, its own and those taken over, sorted by what they do.
#[derive(Debug, Default)]
pub(crate) struct Statements<'w> {
    singles: Vec<(&'static str, Taken<'w>)>,
    pub(crate) layers: Vec<Taken<'w>>,
    pub(crate) profiles: Vec<Taken<'w>>,
    pub(crate) deltas: Vec<Taken<'w>>,
    pub(crate) waves: Vec<Taken<'w>>,
    pub(crate) sites: Vec<Taken<'w>>,
    pub(crate) atoms: Vec<Taken<'w>>,
    pub(crate) formfactors: Vec<Taken<'w>>,
    pub(crate) measures: Vec<Taken<'w>>,
    pub(crate) requirements: Vec<Taken<'w>>,
}

impl<'w> Statements<'w> {
    /// Gathers the statements of a chain, the base of it first.
    pub(crate) fn gather(evaluator: &mut Evaluator<'w>, chain: &[SectionRef<'w>]) -> Self {
        let mut all = Self::default();
        for section in chain.iter().rev() {
            let own = Self::own(evaluator, *section);
            all.take(own);
        }
        all
    }

    /// The statement of a word that stands once.
    pub(crate) fn single(&self, word: &str) -> Option<Taken<'w>> {
        self.singles
            .iter()
            .find(|(known, _)| *known == word)
            .map(|(_, taken)| *taken)
    }

    fn own(evaluator: &mut Evaluator<'w>, home: SectionRef<'w>) -> Self {
        let mut own = Self::default();
        for statement in &home.section.statements {
            let taken = Taken { home, statement };
            if let Some(word) = single_word(&statement.kind) {
                match own.single(word) {
                    Some(first) => repeated(evaluator, word, first, taken),
                    None => own.singles.push((word, taken)),
                }
            } else if let Some(list) = own.list(&statement.kind) {
                list.push(taken);
            }
        }
        own
    }

    fn list(&mut self, kind: &StatementKind) -> Option<&mut Vec<Taken<'w>>> {
        Some(match kind {
            StatementKind::Layer(_) | StatementKind::Stack { .. } => &mut self.layers,
            StatementKind::Profile { .. } => &mut self.profiles,
            StatementKind::Delta { .. } => &mut self.deltas,
            StatementKind::Wave { .. } => &mut self.waves,
            StatementKind::Site { .. } => &mut self.sites,
            StatementKind::Atom { .. } => &mut self.atoms,
            StatementKind::Formfactor { .. } => &mut self.formfactors,
            StatementKind::Measure { .. } => &mut self.measures,
            StatementKind::Require(_) => &mut self.requirements,
            _ => return None,
        })
    }

    /// Puts the statements of a section over those that it takes over.
    fn take(&mut self, own: Self) {
        self.singles
            .retain(|(known, _)| own.single(known).is_none());
        append(&mut self.singles, own.singles);
        // A cell described anew is described wholly.
        if !own.layers.is_empty() {
            self.layers = own.layers;
        }
        if !own.profiles.is_empty() {
            self.profiles = own.profiles;
        }
        append(&mut self.deltas, own.deltas);
        append(&mut self.waves, own.waves);
        append(&mut self.sites, own.sites);
        append(&mut self.atoms, own.atoms);
        append(&mut self.formfactors, own.formfactors);
        for measure in own.measures {
            replace(&mut self.measures, measure, measure_name(&measure));
        }
        if !self.requirements.is_empty() && !own.requirements.is_empty() {
            let keys: Vec<Option<String>> = own.requirements.iter().map(wanted_quantity).collect();
            self.requirements
                .retain(|old| !keys.contains(&wanted_quantity(old)));
        }
        append(&mut self.requirements, own.requirements);
    }
}

/// Adds statements to a list; the list itself where there were none.
fn append<T>(list: &mut Vec<T>, mut more: Vec<T>) {
    if list.is_empty() {
        *list = more;
    } else {
        list.append(&mut more);
    }
}

/// A measure replaces the one of its name, in its place.
fn replace<'w>(measures: &mut Vec<Taken<'w>>, new: Taken<'w>, name: Option<&str>) {
    let of_other_section = |old: &&mut Taken<'w>| old.home.key() != new.home.key();
    let old = measures
        .iter_mut()
        .filter(of_other_section)
        .find(|old| measure_name(old) == name);
    match old {
        Some(old) => *old = new,
        None => measures.push(new),
    }
}

fn measure_name<'w>(taken: &Taken<'w>) -> Option<&'w str> {
    match &taken.statement.kind {
        StatementKind::Measure { name, .. } => Some(&name.text),
        _ => None,
    }
}

/// What a requirement is about, blanks folded.
fn wanted_quantity(taken: &Taken<'_>) -> Option<String> {
    let StatementKind::Require(requirement) = &taken.statement.kind else {
        return None;
    };
    let folded = |span| {
        let words: Vec<&str> = taken.home.text(span).split_whitespace().collect();
        words.join(" ")
    };
    Some(match requirement {
        Requirement::Compare { expression, .. } => folded(expression.span),
        Requirement::Class(_) => "a class".to_owned(),
        Requirement::GapIs { quantity, .. } => format!("kind of {}", folded(quantity.span)),
    })
}

fn repeated<'w>(evaluator: &mut Evaluator<'w>, word: &str, first: Taken<'w>, second: Taken<'w>) {
    if second.home.key() != evaluator.home.key() {
        evaluator.broken = true;
        return;
    }
    let kind = TroubleKind::Repeated {
        word: word.to_owned(),
    };
    let trouble = Trouble::new(kind, second.home.place(second.statement.span));
    let first = first.home.place(first.statement.span);
    evaluator.report(trouble.beside(first, "the first one"));
}

/// The word of a statement that stands once in a section.
fn single_word(kind: &StatementKind) -> Option<&'static str> {
    Some(match kind {
        StatementKind::Mass(_) => "mass",
        StatementKind::Edge(_) => "edge",
        StatementKind::Monolayer(_) => "monolayer",
        StatementKind::Nonparabolic(_) => "nonparabolic",
        StatementKind::Rate(_) => "rate",
        StatementKind::Source(_) => "source",
        StatementKind::Title(_) => "title",
        StatementKind::Degeneracy(_) => "degeneracy",
        StatementKind::Carriers { .. } => "carriers",
        StatementKind::Filling(_) => "filling",
        StatementKind::Temperature(_) => "temperature",
        StatementKind::Recoil(_) => "recoil",
        StatementKind::Bands(_) => "bands",
        StatementKind::Lattice(_) => "lattice",
        StatementKind::Table { .. } => "table",
        _ => return None,
    })
}
