//! Text in memory → solved crystals.
#![allow(dead_code, clippy::print_stdout)]

#[path = "../memory/mod.rs"]
mod memory;

use std::path::{Path, PathBuf};
use std::sync::Arc;

use crenate::bands::{Assessment, MeasureValue, Solution, Solver, Unsolved};
use crenate::model::{
    Built, CrystalRef, ParameterId, ParameterKind, Setting, World, build_crystal,
};
use memory::Memory;

/// One elementary charge: joule per electronvolt (exact in the SI).
pub const EV: f64 = 1.602_176_634e-19;

/// Ry in joule (CODATA 2022).
pub const RYDBERG: f64 = 13.605_693_122_990 * EV;

/// One row of the table of worst errors (`cargo test --test bands_zones -- --nocapture | grep '|'`, and so for its siblings).
pub fn row(case: &str, against: &str, worst: f64, bar: f64) {
    println!("| {case} | {against} | {worst:.1e} | {bar:.1e} |");
    assert!(worst <= bar, "{case}: {worst:e} above {bar:e}");
}

/// The crystals of a text.
pub struct Bench {
    world: World,
    source: Memory,
    pub solver: Solver,
}

impl Bench {
    pub fn new(text: &str) -> Self {
        let source = Memory::of([("model.cren", text)]);
        let world = World::gather(&source, &[PathBuf::from("model.cren")]);
        Self {
            world,
            source,
            solver: Solver::default(),
        }
    }

    pub fn crystal_ref(&self, index: usize) -> CrystalRef {
        let file = self
            .world
            .file_at(Path::new("model.cren"))
            .expect("the file")
            .id;
        let section = self.world.crystals(file)[index].0;
        CrystalRef { file, section }
    }

    pub fn build(&self, index: usize, setting: &Setting) -> Built {
        build_crystal(&self.world, self.crystal_ref(index), setting, &self.source)
    }

    pub fn solve_at(&self, index: usize, setting: &Setting) -> Arc<Solution> {
        let built = self.build(index, setting);
        assert!(!built.crystal.broken, "{:#?}", built.troubles);
        self.solver
            .solve(&built.crystal, &|| false)
            .expect("solved bands")
    }

    pub fn solve(&self, index: usize) -> Arc<Solution> {
        self.solve_at(index, &Setting::default())
    }

    /// The first answer to the first crystal.
    pub fn coarse(&self) -> Arc<Solution> {
        let built = self.build(0, &Setting::default());
        assert!(!built.crystal.broken, "{:#?}", built.troubles);
        self.solver
            .solve_coarse(&built.crystal, &|| false)
            .expect("coarse bands")
    }

    pub fn assess(&self, index: usize) -> (Vec<Assessment>, Vec<MeasureValue>) {
        self.assess_with(index, &|| false)
    }

    /// With a hook that is asked during the work.
    pub fn assess_with(
        &self,
        index: usize,
        cancelled: &(dyn Fn() -> bool + Sync),
    ) -> (Vec<Assessment>, Vec<MeasureValue>) {
        let built = self.build(index, &Setting::default());
        assert!(!built.crystal.broken, "{:#?}", built.troubles);
        let rebuild = |of: CrystalRef, setting: &Setting| {
            let built = build_crystal(&self.world, of, setting, &self.source);
            (!built.crystal.broken).then(|| Arc::new(built.crystal))
        };
        let assessed: Result<_, Unsolved> = self.solver.assess(
            self.crystal_ref(index),
            &Arc::new(built.crystal),
            &rebuild,
            cancelled,
        );
        assessed.expect("assessed targets")
    }
}

/// The tolerances of the first crystal.
pub fn draws(bench: &Bench) -> Vec<ParameterId> {
    let built = bench.build(0, &Setting::default());
    assert!(!built.crystal.broken, "{:#?}", built.troubles);
    let all = built.crystal.parameters.iter();
    all.filter(|parameter| parameter.kind == ParameterKind::Draw)
        .map(|parameter| parameter.id)
        .collect()
}
