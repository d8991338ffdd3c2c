//! Texts as test subjects: what one rule says on a text, and what its fix makes of it.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use super::{FileSubject, Finding, Level, Rule, Subject, Tier, apply_waivers, file_findings};
use crate::bands::{
    Assessment, Band, Extremum, Gap, GapKind, Measured, PotentialRange, Solution, TargetState,
    Unsolved,
};
use crate::model::constants::ELECTRONVOLT;
use crate::model::{
    Crystal, CrystalRef, Dimension, FileId, FileSource, Place, ReadFailure, Reference, Setting,
    Trouble, World, build_crystal, build_material, build_preamble, normalise,
};
use crate::syntax::{Entry, SectionKind, Tree, read};

/// The path of the text under test.
const MAIN: &str = "/example.cren";

/// Files in memory.
struct Memory(Vec<(PathBuf, String)>);

impl Memory {
    fn text(&self, path: &Path) -> Result<&str, ReadFailure> {
        let found = self.0.iter().find(|(known, _)| known == path);
        found
            .map(|(_, text)| text.as_str())
            .ok_or(ReadFailure::NotFound)
    }
}

impl FileSource for Memory {
    fn tree(&self, path: &Path) -> Result<Arc<Tree>, ReadFailure> {
        Ok(Arc::new(read(self.text(path)?)))
    }

    fn bytes(&self, path: &Path) -> Result<Arc<[u8]>, ReadFailure> {
        Ok(Arc::from(self.text(path)?.as_bytes()))
    }

    fn inside(&self, _: &Path) -> bool {
        true
    }
}

/// A section with its model.
struct Model {
    entry: Entry,
    troubles: Vec<Trouble>,
    references: Vec<Reference>,
    crystal: Option<Crystal>,
}

/// A text with its models.
struct Fixture {
    world: World,
    file: FileId,
    tree: Arc<Tree>,
    models: Vec<Model>,
}

impl Fixture {
    fn new(text: &str, others: &[(&str, &str)]) -> Self {
        let mut files = vec![(normalise(Path::new(MAIN)), text.to_owned())];
        let path = |name: &str| normalise(&Path::new("/").join(name));
        files.extend(
            others
                .iter()
                .map(|(name, text)| (path(name), (*text).to_owned())),
        );
        let source = Memory(files);
        let world = World::gather(&source, &[PathBuf::from(MAIN)]);
        let file = FileId::of(&normalise(Path::new(MAIN)));
        let tree = Arc::new(read(text));
        let models = tree
            .entries
            .iter()
            .map(|entry| model(&world, file, entry, &source))
            .collect();
        Self {
            world,
            file,
            tree,
            models,
        }
    }

    fn subject<'a>(&'a self, model: &'a Model) -> Subject<'a> {
        Subject {
            world: &self.world,
            file: self.file,
            entry: &model.entry,
            troubles: &model.troubles,
            references: &model.references,
            crystal: model.crystal.as_ref(),
            bands: None,
            targets: &[],
            measures: &[],
        }
    }

    fn crystal(&self) -> &Model {
        let mut crystals = self.models.iter().filter(|model| model.crystal.is_some());
        crystals.next().expect("the text has a crystal")
    }

    /// What a rule finds, in its section and in the file.
    fn findings(&self, rule: &Rule) -> Vec<Finding> {
        let mut findings = Vec::new();
        for model in &self.models {
            (rule.check)(&self.subject(model), &mut findings);
        }
        findings.extend(
            self.of_file()
                .into_iter()
                .filter(|finding| finding.rule == rule.name),
        );
        findings
    }

    fn of_file(&self) -> Vec<Finding> {
        let references: Vec<&[Reference]> = self
            .models
            .iter()
            .map(|model| model.references.as_slice())
            .collect();
        file_findings(&FileSubject {
            file: self.file,
            tree: &self.tree,
            references: &references,
            used_by_others: false,
        })
    }
}

fn model(world: &World, file: FileId, entry: &Entry, source: &dyn FileSource) -> Model {
    let nominal = Setting::nominal();
    let (troubles, references, crystal) = match entry.section.kind {
        SectionKind::Preamble => {
            let built = build_preamble(world, file, &nominal);
            (built.troubles, built.references, None)
        }
        SectionKind::Material => {
            let built = build_material(world, file, entry.id, &nominal);
            (built.troubles, built.references, None)
        }
        SectionKind::Crystal => {
            let of = CrystalRef {
                file,
                section: entry.id,
            };
            let built = build_crystal(world, of, &nominal, source);
            (built.troubles, built.references, Some(built.crystal))
        }
    };
    Model {
        entry: entry.clone(),
        troubles,
        references,
        crystal,
    }
}

fn words(findings: Vec<Finding>) -> Vec<String> {
    findings
        .into_iter()
        .map(|finding| finding.message)
        .collect()
}

/// What a rule says on a text.
pub fn messages(rule: &Rule, text: &str) -> Vec<String> {
    messages_with(rule, text, &[])
}

/// The same with other files beside it.
pub fn messages_with(rule: &Rule, text: &str, others: &[(&str, &str)]) -> Vec<String> {
    words(Fixture::new(text, others).findings(rule))
}

/// The levels of what a rule says on a text.
pub fn levels(rule: &Rule, text: &str) -> Vec<Level> {
    let findings = Fixture::new(text, &[]).findings(rule);
    findings.into_iter().map(|finding| finding.level).collect()
}

/// Holds that a rule says nothing on a text.
pub fn silent(rule: &Rule, text: &str) {
    silent_with(rule, text, &[]);
}

/// The same with other files beside it; none of the text may be unreadable to the model.
pub fn silent_with(rule: &Rule, text: &str, others: &[(&str, &str)]) {
    let found = messages_with(rule, text, others);
    assert!(found.is_empty(), "{found:?} on\n{text}");
}

/// The text after the first fix of the first finding.
pub fn fixed(rule: &Rule, text: &str) -> String {
    let fixture = Fixture::new(text, &[]);
    let findings = fixture.findings(rule);
    let mut fixes = findings.iter().flat_map(|finding| &finding.fixes);
    let fix = fixes.next().unwrap_or_else(|| panic!("no fix on\n{text}"));
    let mut edits: Vec<(usize, usize, &str)> = fix
        .edits
        .iter()
        .map(|edit| {
            let entry = fixture
                .tree
                .entries
                .iter()
                .find(|entry| entry.id == edit.place.section);
            let start = entry.expect("the edit's section").start;
            let span = edit.place.span.shifted(start);
            (span.start as usize, span.end as usize, edit.text.as_str())
        })
        .collect();
    edits.sort_unstable();
    let mut text = text.to_owned();
    for (start, end, new) in edits.into_iter().rev() {
        text.replace_range(start..end, new);
    }
    text
}

/// All findings of the model on a text, waivers applied: rules and messages.
pub fn after_waivers(text: &str) -> Vec<(&'static str, String)> {
    let fixture = Fixture::new(text, &[]);
    let mut findings = fixture.of_file();
    for model in &fixture.models {
        findings.extend(super::section_findings(
            &fixture.subject(model),
            Tier::Model,
        ));
    }
    let findings = findings.into_iter().map(std::sync::Arc::new).collect();
    let kept = apply_waivers(fixture.file, &fixture.tree, findings, Tier::Model);
    kept.into_iter()
        .map(|finding| (finding.rule, finding.message.clone()))
        .collect()
}

/// An energy that is known to 1e-15 eV.
pub fn electronvolts(value: f64) -> Measured {
    Measured {
        value: value * ELECTRONVOLT,
        uncertainty: 1e-15 * ELECTRONVOLT,
    }
}

/// What a rule says on a target that has been tested with that outcome.
pub fn assessed(rule: &Rule, change: impl Fn(&mut Assessment)) -> Vec<String> {
    let fixture = Fixture::new("crystal a\n  mass 1 me\n  lattice chain 1 nm\n", &[]);
    let model = fixture.crystal();
    let mut target = Assessment {
        place: Place {
            file: fixture.file,
            section: model.entry.id,
            ..Place::default()
        },
        text: "gap 1 >= 1 meV".to_owned(),
        state: TargetState::Met,
        reason: None,
        value: None,
        dimension: Dimension::ENERGY,
        limits: (None, None),
        worst: None,
        corner: Vec::new(),
        driver: None,
        found: None,
    };
    change(&mut target);
    let targets = [target];
    let subject = Subject {
        targets: &targets,
        ..fixture.subject(model)
    };
    said(rule, &subject)
}

fn said(rule: &Rule, subject: &Subject<'_>) -> Vec<String> {
    let mut findings = Vec::new();
    (rule.check)(subject, &mut findings);
    words(findings)
}

/// What a rule says on a chain with these further statements, the gap above `band` being as given and all others 1 eV.
pub fn solved(
    rule: &Rule,
    statements: &str,
    band: usize,
    kind: GapKind,
    size: f64,
    uncertainty: f64,
) -> Vec<String> {
    let text = format!("crystal a\n  mass 1 me\n  lattice chain 1 nm\n{statements}");
    let fixture = Fixture::new(&text, &[]);
    let mut solution = solution(0.0);
    let gap = band
        .checked_sub(1)
        .and_then(|index| solution.gaps.get_mut(index));
    *gap.expect("a gap of the solution") = Gap {
        size: Measured {
            value: size * ELECTRONVOLT,
            uncertainty: uncertainty * ELECTRONVOLT,
        },
        kind,
    };
    with_bands(rule, &fixture, Ok(Arc::new(solution)))
}

/// What a rule says on layers of that mass between 0 and 1 eV, the lowest band beginning at `bottom` electronvolts.
pub fn solved_layers(rule: &Rule, mass: &str, statements: &str, bottom: f64) -> Vec<String> {
    let layers = format!("  layer 4 nm at 0 mass {mass}\n  layer 4 nm at 1 eV mass {mass}\n");
    let fixture = Fixture::new(&format!("crystal a\n{layers}{statements}"), &[]);
    with_bands(rule, &fixture, Ok(Arc::new(solution(bottom))))
}

/// What a rule says on a crystal without bands.
pub fn unsolved(rule: &Rule, why: Unsolved) -> Vec<String> {
    let fixture = Fixture::new("crystal a\n  mass 1 me\n  lattice chain 1 nm\n", &[]);
    with_bands(rule, &fixture, Err(why))
}

fn with_bands(
    rule: &Rule,
    fixture: &Fixture,
    bands: Result<Arc<Solution>, Unsolved>,
) -> Vec<String> {
    let subject = Subject {
        bands: Some(&bands),
        ..fixture.subject(fixture.crystal())
    };
    said(rule, &subject)
}

/// Four bands, 10 meV wide and 1 eV apart.
fn solution(bottom: f64) -> Solution {
    let edge = |energy: f64| Extremum {
        energy: electronvolts(energy),
        k: vec![0.0],
        point: None,
        mass: None,
        axes: Vec::new(),
    };
    let bands = [0.0, 1.01, 2.02, 3.03].map(|above| Band {
        bottom: edge(bottom + above),
        top: edge(bottom + above + 0.01),
        width: electronvolts(0.01),
    });
    let gap = Gap {
        size: electronvolts(1.0),
        kind: GapKind::Direct,
    };
    Solution {
        bands: bands.to_vec(),
        gaps: vec![gap; 4],
        potential: PotentialRange::default(),
        fermi: None,
        class: None,
        fine: true,
    }
}
