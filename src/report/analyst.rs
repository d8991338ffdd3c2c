//! The one pipeline: files → model → bands → rules.
//!
//! A section's result is kept under the hash of all that it depends on, so that
//! an edit is answered by building and solving only what it touched.
//!
//! *Invariant*: results and their order depend on the files alone, never on
//! threads or on what was analysed before.

use std::path::PathBuf;
use std::sync::atomic::{AtomicU64, Ordering};
use std::sync::{Arc, Mutex, PoisonError};

use rayon::prelude::*;
use rustc_hash::{FxHashMap, FxHashSet};

use super::analysis::{Analysis, FileAnalysis, SectionAnalysis};
use crate::bands::{Sensitivity, Solver, Unsolved};
use crate::model::{
    Crystal, CrystalRef, FileId, FileSource, Reference, Setting, World, WorldFile, build_crystal,
    build_material, build_preamble, normalise,
};
use crate::rules::{self, FileSubject, Finding, Subject, Tier};
use crate::syntax::{Entry, SectionId, SectionKind};

/// Sections kept beyond those of the analysis at hand: while one types, and where each file is looked at once.
const SPARE_SECTIONS: usize = 4096;
const SPARE_SECTIONS_ONCE: usize = 64;
/// A section that this many analyses did not touch may go.
const LONG_AGO: u64 = 16;
/// Bands whose sensitivities are worked out.
const FEATURED_BANDS: usize = 3;
/// From this many sections to build, threads share them.
const WORTH_SHARING: usize = 4;

/// What to analyse, and how far.
#[derive(Clone, Copy)]
pub struct Request<'a> {
    /// Where files come from.
    pub source: &'a dyn FileSource,
    /// The files to analyse.
    pub roots: &'a [PathBuf],
    /// [`Tier::Model`] for cheap findings (with the bands that are known already), [`Tier::Bands`] for all.
    pub depth: Tier,
    /// Whether the work is not wanted any more.
    pub cancel: &'a (dyn Fn() -> bool + Sync),
}

/// Analyses files, and remembers what it found.
#[derive(Default)]
pub struct Analyst {
    solver: Solver,
    kept: Mutex<FxHashMap<(FileId, SectionId), Kept>>,
    clock: AtomicU64,
    /// Files that others use; known where each file is looked at once.
    used: Option<FxHashSet<PathBuf>>,
}

/// A section's result, and what it holds for.
struct Kept {
    hash: u64,
    touched: u64,
    section: Arc<SectionAnalysis>,
}

/// How much work a crystal's bands may be.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Effort {
    Quick,
    Whole,
}

/// One section to look at.
#[derive(Clone, Copy)]
struct Task<'a> {
    world: &'a World,
    file: FileId,
    entry: &'a Entry,
    hash: u64,
}

impl Analyst {
    /// An analyst that looks at each file once, and knows that others use these (normalised), though those others may
    /// not be at hand. It keeps little, so that memory does not grow with the number of files.
    #[must_use]
    pub fn knowing_used(used: FxHashSet<PathBuf>) -> Self {
        Self {
            used: Some(used),
            ..Self::default()
        }
    }

    /// Analyses files. When cancelled, sections that were not reached stay at [`Tier::Model`].
    #[must_use]
    pub fn analyse(&self, request: &Request<'_>) -> Analysis {
        let world = World::gather(request.source, request.roots);
        self.walk(Arc::new(world), request, Effort::Whole, None)
    }

    /// The same, but a crystal whose bands take long gets a quick answer with wider error bounds, without targets,
    /// measures and what the rules say of bands; its section stays at [`Tier::Model`].
    #[must_use]
    pub fn analyse_quickly(&self, request: &Request<'_>) -> Analysis {
        let world = World::gather(request.source, request.roots);
        self.walk(Arc::new(world), request, Effort::Quick, None)
    }

    /// Analyses the same state of the same files further than `before` did, which saves looking at them again.
    #[must_use]
    pub fn deepen(&self, before: &Analysis, request: &Request<'_>) -> Analysis {
        self.walk(
            Arc::clone(&before.world),
            request,
            Effort::Whole,
            Some(before),
        )
    }

    /// [`Analyst::deepen`], as far as [`Analyst::analyse_quickly`] goes.
    #[must_use]
    pub fn deepen_quickly(&self, before: &Analysis, request: &Request<'_>) -> Analysis {
        self.walk(
            Arc::clone(&before.world),
            request,
            Effort::Quick,
            Some(before),
        )
    }

    fn walk(
        &self,
        world: Arc<World>,
        request: &Request<'_>,
        effort: Effort,
        before: Option<&Analysis>,
    ) -> Analysis {
        let now = self.clock.fetch_add(1, Ordering::Relaxed) + 1;
        let mut seen = Vec::new();
        let mut files = Vec::new();
        for root in request.roots {
            let id = FileId::of(&normalise(root));
            if seen.contains(&id) {
                continue;
            }
            seen.push(id);
            let before = before.and_then(|before| before.file_by_id(id));
            let before = before.map(AsRef::as_ref);
            let file = self.file(&world, id, (request, effort), now, before);
            files.extend(file.map(Arc::new));
        }
        self.forget(now);
        Analysis { world, files }
    }

    /// How gaps, widths and edges of a crystal move with each of its parameters.
    #[must_use]
    pub fn sensitivities(&self, crystal: &Crystal) -> Vec<Sensitivity> {
        let none = |_| Vec::new();
        self.solver
            .sensitivities(crystal, FEATURED_BANDS, &|| false)
            .unwrap_or_else(none)
    }

    /// The band solver, with its cache.
    #[must_use]
    pub fn solver(&self) -> &Solver {
        &self.solver
    }

    fn file(
        &self,
        world: &World,
        id: FileId,
        (request, effort): (&Request<'_>, Effort),
        now: u64,
        before: Option<&FileAnalysis>,
    ) -> Option<FileAnalysis> {
        let file = world.file(id)?;
        let entries = &file.tree.entries;
        let hashes: Vec<u64> = match before {
            Some(before) => before.hashes.clone(),
            None => entries
                .iter()
                .map(|entry| world.dependency_hash(id, entry.id))
                .collect(),
        };
        let tasks: Vec<Task<'_>> = entries
            .iter()
            .zip(&hashes)
            .map(|(entry, hash)| Task {
                world,
                file: id,
                entry,
                hash: *hash,
            })
            .collect();
        let known = match before {
            Some(before) => before
                .sections
                .iter()
                .map(|section| Known::of(Some(Arc::clone(section)), request.depth, effort))
                .collect(),
            None => self.known(&tasks, request.depth, effort, now),
        };
        let sections = self.sections(&tasks, known, (request, effort), now);
        let depth = sections
            .iter()
            .map(|section| section.depth)
            .min()
            .unwrap_or(request.depth);
        let whole = match before {
            Some(before) => before.whole.clone(),
            None => {
                let used = self.used_by_others(world, file) || request.source.is_used(&file.path);
                of_whole(file, &sections, used)
            }
        };
        let findings = findings(file, &sections, &whole, depth);
        Some(FileAnalysis {
            file: id,
            path: file.path.clone(),
            tree: Arc::clone(&file.tree),
            depth,
            sections,
            findings,
            whole,
            hashes,
        })
    }

    /// Whether a file that is known uses this one.
    fn used_by_others(&self, world: &World, file: &WorldFile) -> bool {
        let mut others = world.files().iter().filter(|other| other.id != file.id);
        let known = self.used.as_ref();
        known.is_some_and(|used| used.contains(&file.path))
            || others.any(|other| other.uses.contains(&file.id))
    }

    /// The sections of the tasks, in order: kept ones where they still hold, the others made now.
    fn sections(
        &self,
        tasks: &[Task<'_>],
        mut found: Vec<Known>,
        (request, effort): (&Request<'_>, Effort),
        now: u64,
    ) -> Vec<Arc<SectionAnalysis>> {
        let missing: Vec<usize> = (0..tasks.len())
            .filter(|index| found.get(*index).is_some_and(|known| !known.done))
            .collect();
        let make = |index: &usize| {
            let known = found.get(*index).and_then(|known| known.section.clone());
            tasks
                .get(*index)
                .map(|task| self.make(task, known, request, effort))
        };
        let made: Vec<Option<Arc<SectionAnalysis>>> = match missing.len() >= WORTH_SHARING {
            true => missing.par_iter().map(make).collect(),
            false => missing.iter().map(make).collect(),
        };
        let mut kept = self.kept.lock().unwrap_or_else(PoisonError::into_inner);
        for (index, section) in missing.iter().zip(made) {
            if let (Some(task), Some(section), Some(slot)) =
                (tasks.get(*index), section, found.get_mut(*index))
            {
                slot.section = Some(Arc::clone(&section));
                let fresh = Kept {
                    hash: task.hash,
                    touched: now,
                    section,
                };
                kept.insert((task.file, task.entry.id), fresh);
            }
        }
        found
            .into_iter()
            .filter_map(|known| known.section)
            .collect()
    }

    /// What is kept of each task, and whether that is all that is asked for.
    fn known(&self, tasks: &[Task<'_>], depth: Tier, effort: Effort, now: u64) -> Vec<Known> {
        let mut kept = self.kept.lock().unwrap_or_else(PoisonError::into_inner);
        let look = |task: &Task<'_>| {
            let current = kept
                .get_mut(&(task.file, task.entry.id))
                .filter(|kept| kept.hash == task.hash)?;
            current.touched = now;
            Some(Arc::clone(&current.section))
        };
        let sections: Vec<Option<Arc<SectionAnalysis>>> = tasks.iter().map(look).collect();
        sections
            .into_iter()
            .map(|section| Known::of(section, depth, effort))
            .collect()
    }

    fn make(
        &self,
        task: &Task<'_>,
        known: Option<Arc<SectionAnalysis>>,
        request: &Request<'_>,
        effort: Effort,
    ) -> Arc<SectionAnalysis> {
        let model = known.unwrap_or_else(|| Arc::new(modelled(task, request.source)));
        if request.depth < Tier::Bands || (request.cancel)() {
            return model;
        }
        if effort == Effort::Quick && self.takes_long(&model) {
            return self.sketched(&model, request).map_or(model, Arc::new);
        }
        match self.solved(task, &model, request) {
            Some(section) => Arc::new(section),
            None => model,
        }
    }

    /// Whether a section's bands are not known and not had at once.
    fn takes_long(&self, model: &SectionAnalysis) -> bool {
        let crystal = model.crystal.as_ref();
        crystal.is_some_and(|crystal| crystal.dimension > 1 && self.solver.known(crystal).is_none())
    }

    /// The same section with a quick answer for its bands; `None` where there is none.
    fn sketched(&self, model: &SectionAnalysis, request: &Request<'_>) -> Option<SectionAnalysis> {
        let crystal = model.crystal.as_ref()?;
        let bands = self.solver.solve_coarse(crystal, request.cancel).ok()?;
        Some(SectionAnalysis {
            bands: Some(Ok(bands)),
            findings: model.findings.clone(),
            ..bare(model, Tier::Model)
        })
    }

    /// The same section with its bands; `None` where the work was cancelled.
    fn solved(
        &self,
        task: &Task<'_>,
        model: &SectionAnalysis,
        request: &Request<'_>,
    ) -> Option<SectionAnalysis> {
        let mut section = bare(model, Tier::Bands);
        if let Some(crystal) = &model.crystal {
            let bands = self.solver.solve(crystal, request.cancel);
            if matches!(bands, Err(Unsolved::Cancelled)) {
                return None;
            }
            let rebuild = |of: CrystalRef, setting: &Setting| {
                Some(Arc::new(
                    build_crystal(task.world, of, setting, request.source).crystal,
                ))
            };
            let of = CrystalRef {
                file: task.file,
                section: task.entry.id,
            };
            let assessed = self.solver.assess(of, crystal, &rebuild, request.cancel);
            (section.targets, section.measures) = assessed.ok()?;
            section.bands = Some(bands);
        }
        if (request.cancel)() {
            return None;
        }
        section.findings = check(task, &section, Tier::Bands);
        Some(section)
    }

    /// Lets go of sections that have not been asked for in a while.
    fn forget(&self, now: u64) {
        let mut kept = self.kept.lock().unwrap_or_else(PoisonError::into_inner);
        let spare = match self.used {
            Some(_) => SPARE_SECTIONS_ONCE,
            None => SPARE_SECTIONS,
        };
        if kept.len() <= spare {
            return;
        }
        kept.retain(|_, section| section.touched + LONG_AGO > now);
    }
}

/// What is kept of a section.
struct Known {
    section: Option<Arc<SectionAnalysis>>,
    done: bool,
}

/// What a section's model gives, without bands and findings.
fn bare(model: &SectionAnalysis, depth: Tier) -> SectionAnalysis {
    SectionAnalysis {
        section: model.section,
        troubles: model.troubles.clone(),
        references: model.references.clone(),
        parameters: model.parameters.clone(),
        crystal: model.crystal.clone(),
        bands: None,
        targets: Vec::new(),
        measures: Vec::new(),
        findings: Vec::new(),
        depth,
    }
}

impl Known {
    fn of(section: Option<Arc<SectionAnalysis>>, depth: Tier, effort: Effort) -> Self {
        let settled = |section: &Arc<SectionAnalysis>| {
            let quick = effort == Effort::Quick && section.solution().is_some();
            section.settled(depth) || quick
        };
        Self {
            done: section.as_ref().is_some_and(settled),
            section,
        }
    }
}

/// A section's model and the findings that need no more.
fn modelled(task: &Task<'_>, source: &dyn FileSource) -> SectionAnalysis {
    let nominal = Setting::nominal();
    let (world, file, section) = (task.world, task.file, task.entry.id);
    let mut analysis = SectionAnalysis {
        section,
        troubles: Vec::new(),
        references: Vec::new(),
        parameters: Vec::new(),
        crystal: None,
        bands: None,
        targets: Vec::new(),
        measures: Vec::new(),
        findings: Vec::new(),
        depth: Tier::Model,
    };
    match task.entry.section.kind {
        SectionKind::Preamble => {
            let built = build_preamble(world, file, &nominal);
            analysis.troubles = built.troubles;
            analysis.references = built.references;
            analysis.parameters = built.parameters;
        }
        SectionKind::Material => {
            let built = build_material(world, file, section, &nominal);
            analysis.troubles = built.troubles;
            analysis.references = built.references;
            analysis.parameters = built.parameters;
        }
        SectionKind::Crystal => {
            let built = build_crystal(world, CrystalRef { file, section }, &nominal, source);
            analysis.troubles = built.troubles;
            analysis.references = built.references;
            analysis.parameters = built.crystal.parameters.clone();
            analysis.crystal = Some(Arc::new(built.crystal));
        }
    }
    analysis.findings = check(task, &analysis, Tier::Model);
    analysis
}

/// Runs the rules of a section up to a tier.
fn check(task: &Task<'_>, section: &SectionAnalysis, depth: Tier) -> Vec<Arc<Finding>> {
    let subject = Subject {
        world: task.world,
        file: task.file,
        entry: task.entry,
        troubles: &section.troubles,
        references: &section.references,
        crystal: section.crystal.as_deref(),
        bands: section.bands.as_ref(),
        targets: &section.targets,
        measures: &section.measures,
    };
    let findings = rules::section_findings(&subject, depth);
    findings.into_iter().map(Arc::new).collect()
}

/// What shows only in the whole file.
fn of_whole(
    file: &WorldFile,
    sections: &[Arc<SectionAnalysis>],
    used_by_others: bool,
) -> Vec<Arc<Finding>> {
    let references: Vec<&[Reference]> = sections
        .iter()
        .map(|section| section.references.as_slice())
        .collect();
    let subject = FileSubject {
        file: file.id,
        tree: &file.tree,
        references: &references,
        used_by_others,
    };
    let findings = rules::file_findings(&subject);
    findings.into_iter().map(Arc::new).collect()
}

/// What is found in a file, waivers applied, in order of place.
fn findings(
    file: &WorldFile,
    sections: &[Arc<SectionAnalysis>],
    whole: &[Arc<Finding>],
    depth: Tier,
) -> Vec<Arc<Finding>> {
    let of_sections = sections.iter().flat_map(|section| &section.findings);
    let findings = of_sections.chain(whole).cloned().collect();
    rules::apply_waivers(file.id, &file.tree, findings, depth)
}
