//! Crystals: the order in which their parts are worked out.

use std::rc::Rc;

use rustc_hash::FxHashMap;

use super::scales::Scales;
use super::takeover::{Statements, Taken, chain_of, check_chain, mark_taken_over};
use super::{Built, BuiltMaterial, Key, SectionRef, World, check_lets, checks};
use crate::model::evaluate::{Context, Evaluator};
use crate::model::world::NoFiles;
use crate::model::{Crystal, CrystalRef, FileSource, Setting, Trouble};

/// A crystal that is being built.
pub(super) struct CrystalBuild<'c, 'w> {
    pub(super) evaluator: Evaluator<'w>,
    pub(super) source: &'c dyn FileSource,
    pub(super) chain: &'c [SectionRef<'w>],
    pub(super) statements: Statements<'w>,
    pub(super) crystal: Crystal,
    /// Whether every layer could be read.
    pub(super) layers_complete: bool,
    pub(super) materials: FxHashMap<Key, Rc<BuiltMaterial>>,
}

/// Builds a crystal at a setting. `source` is asked for the bytes of tables that have not been read yet.
#[must_use]
pub fn build_crystal(
    world: &World,
    of: CrystalRef,
    setting: &Setting,
    source: &dyn FileSource,
) -> Built {
    let Some(home) = world.crystal_section(of) else {
        let crystal = Crystal {
            broken: true,
            ..Crystal::default()
        };
        return Built {
            crystal,
            ..Built::default()
        };
    };
    let (chain, end) = chain_of(world, home);
    let mut evaluator = Evaluator::new(world, setting, home);
    check_chain(&mut evaluator, &chain, &end);
    checks::heading(&mut evaluator, home);
    let statements = Statements::gather(&mut evaluator, &chain);
    let mut build = CrystalBuild::new(evaluator, source, &chain, statements);
    build.run();
    let mut built = build.finish();
    if chain.len() > 1 {
        drop_known(world, &chain, setting, source, &mut built.troubles);
        mark_taken_over(home, &mut built.troubles);
    }
    built
}

/// What is wrong in taken-over statements by themselves is said by their own build.
fn drop_known(
    world: &World,
    chain: &[SectionRef<'_>],
    setting: &Setting,
    source: &dyn FileSource,
    troubles: &mut Vec<Trouble>,
) {
    for base in chain.iter().skip(1) {
        let foreign = |trouble: &Trouble| (trouble.place.file, trouble.place.section) == base.key();
        if troubles.iter().any(foreign) {
            let of = CrystalRef {
                file: base.file,
                section: base.id,
            };
            let known = build_crystal(world, of, setting, source).troubles;
            troubles.retain(|trouble| !known.contains(trouble));
        }
    }
}

/// The conventional vectors of a crystal as its file writes them, without its tolerances; none where they have mistakes.
pub(crate) fn nominal_lattice(world: &World, section: SectionRef<'_>) -> Vec<Vec<f64>> {
    let (chain, _) = chain_of(world, section);
    let setting = Setting::default();
    lattice_alone(Evaluator::new(world, &setting, section), &chain).conventional_values()
}

/// A crystal of which only the lattice is built.
fn lattice_alone<'w>(mut evaluator: Evaluator<'w>, chain: &[SectionRef<'w>]) -> Crystal {
    let statements = Statements::gather(&mut evaluator, chain);
    let mut build = CrystalBuild::new(evaluator, &NoFiles, chain, statements);
    build.scales();
    build.lattice();
    build.crystal
}

impl<'c, 'w> CrystalBuild<'c, 'w> {
    fn new(
        evaluator: Evaluator<'w>,
        source: &'c dyn FileSource,
        chain: &'c [SectionRef<'w>],
        statements: Statements<'w>,
    ) -> Self {
        Self {
            evaluator,
            source,
            chain,
            statements,
            crystal: Crystal::default(),
            layers_complete: true,
            materials: FxHashMap::default(),
        }
    }

    /// The primitive vectors at the middle of all tolerances: the symmetry of a lattice is that of its nominal values.
    pub(super) fn undrawn_vectors(&self) -> Vec<Vec<f64>> {
        let setting = Setting {
            draws: FxHashMap::default(),
            overrides: self.evaluator.setting.overrides.clone(),
        };
        let evaluator = Evaluator::new(self.evaluator.world, &setting, self.evaluator.home);
        lattice_alone(evaluator, self.chain).primitive_values()
    }

    fn run(&mut self) {
        let home = self.evaluator.home;
        self.crystal.place = home.name_place();
        home.name().clone_into(&mut self.crystal.name);
        self.scales();
        self.carriers();
        self.lattice();
        self.cell_descriptions();
        self.layers();
        self.period();
        self.profiles();
        self.table();
        self.waves();
        self.sites();
        self.deltas();
        self.atoms();
        self.formfactors();
        check_lets(&mut self.evaluator, &Context::of(self.chain, home));
        self.targets();
        self.count_bands();
    }

    fn finish(mut self) -> Built {
        let mut crystal = self.crystal;
        crystal.parameters = self.evaluator.sorted_parameters();
        crystal.broken = self.evaluator.broken;
        Built {
            crystal,
            troubles: self.evaluator.troubles,
            references: self.evaluator.references,
        }
    }

    /// The context of a statement: the names of all that this crystal is made of are in sight.
    pub(super) fn context(&self, taken: Taken<'w>) -> Context<'c, 'w> {
        Context::of(self.chain, taken.home)
    }

    /// `ML`, the mass and `Er`, in the order in which they need each other.
    fn scales(&mut self) {
        let scales = Scales::read(&mut self.evaluator, self.chain, &self.statements);
        self.crystal.monolayer = scales.monolayer;
        self.crystal.mass_place = scales.mass_place;
        self.crystal.mass = scales.mass;
        self.crystal.recoil = scales.recoil;
    }

    /// Whether a statement of this word may stand in a lattice of this dimension; says so where not.
    pub(super) fn allowed(&mut self, taken: Taken<'w>, allowed: &[usize], needs: &str) -> bool {
        let dimension = self.crystal.dimension;
        if dimension == 0 || allowed.contains(&dimension) {
            return true;
        }
        let word = taken.home.text(taken.statement.word).to_owned();
        let place = taken.home.place(taken.statement.span);
        self.evaluator
            .wrong_dimension::<()>(&word, needs.to_owned(), place);
        false
    }
}
