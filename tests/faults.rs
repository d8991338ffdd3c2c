//! Breaks sound models in many ways and counts how many of the faults are found, each by a rule made for it and on
//! the line that is to blame. The table stands in DEVELOPERS.md.
//!
//! Faults are made by letters alone, at every statement that offers itself, none picked by hand. A fault *without
//! effect* is not counted: one that leaves every gap and width of the models as it was (to a thousandth), and a
//! tolerance at neither end of which a target is missed.

#![allow(
    missing_docs,
    clippy::unwrap_used,
    clippy::indexing_slicing,
    clippy::print_stdout
)]

#[path = "faults/kinds.rs"]
mod kinds;
#[path = "faults/lines.rs"]
mod lines;
mod memory;
#[path = "faults/models.rs"]
mod models;

use std::collections::HashMap;
use std::fmt::Write as _;
use std::path::Path;

use crenate::bands::TargetState;
use crenate::report::analysis::{Analysis, FileAnalysis};
use crenate::report::analyst::{Analyst, Request};
use crenate::rules::{Finding, Level, Tier};
use kinds::{CLASSES, Class, Fault, Lines};
use models::Models;
use rayon::prelude::*;

/// Of all faults, at least this part is found.
const WANTED: f64 = 0.97;
/// Of the faults that need bands, one in so many is tried.
const EVERY: usize = 4;
/// Where the table stands.
const BEGIN: &str = "<!-- faults: begin -->\n";
const END: &str = "<!-- faults: end -->";
/// Rules that speak on a `require` where a size is wrong.
const OF_TARGETS: [&str; 2] = ["target-missed", "target-at-risk"];

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Outcome {
    /// On its own line.
    Here,
    /// By a target that is not met any more.
    ByTarget,
    Missed,
    WithoutEffect,
}

fn analysed(analyst: &Analyst, models: &Models, depth: Tier) -> Analysis {
    analyst.analyse(&Request {
        source: &models.source(),
        roots: &models.roots(),
        depth,
        cancel: &|| false,
    })
}

/// File name and line, from 0.
fn place<'a>(analysis: &'a Analysis, finding: &Finding) -> (&'a str, usize) {
    let (path, span) = analysis.absolute(&finding.place).unwrap();
    let text = &analysis.tree(finding.place.file).unwrap().text;
    let line = text[..span.start as usize].matches('\n').count();
    (path.file_name().unwrap().to_str().unwrap(), line)
}

fn line_text(models: &Models, (file, line): (&str, usize)) -> String {
    let text = &models
        .files
        .iter()
        .find(|(name, _)| name == file)
        .unwrap()
        .1;
    text.lines().nth(line).unwrap_or("").trim().to_owned()
}

fn found(models: &Models, analysis: &Analysis, class: &Class, fault: &Fault) -> Option<Outcome> {
    let all = || analysis.files.iter().flat_map(|file| &file.findings);
    let here = |finding: &Finding| {
        let (file, line) = place(analysis, finding);
        let right = match &fault.lines {
            Lines::These(lines) => file == models.files[fault.file].0 && lines.contains(&line),
            Lines::Holding(text) => line_text(models, (file, line)).contains(text.as_str()),
        };
        right && class.rules.contains(&finding.rule)
    };
    if all().any(|finding| here(finding)) {
        return Some(Outcome::Here);
    }
    let by_target = class.by_target
        && all().any(|finding| {
            OF_TARGETS.contains(&finding.rule)
                && line_text(models, place(analysis, finding)).starts_with("require")
        });
    by_target.then_some(Outcome::ByTarget)
}

/// Whether every gap and width is what it was.
fn unchanged(sound: &Analysis, broken: &Analysis) -> bool {
    let numbers = |analysis: &Analysis| -> HashMap<String, Vec<f64>> {
        let crystals = analysis.files.iter().flat_map(|file| file.crystals(&[]));
        crystals
            .map(|(section, crystal)| {
                let solution = section.solution();
                let bands = solution.into_iter().flat_map(|solution| {
                    let gaps = solution.gaps.iter().map(|gap| gap.size.value);
                    let pairs = gaps.zip(solution.bands.iter().map(|band| band.width.value));
                    pairs.take(3).flat_map(|(gap, width)| [gap, width])
                });
                (crystal.name.clone(), bands.collect())
            })
            .collect()
    };
    let (before, after) = (numbers(sound), numbers(broken));
    let close = |one: &Vec<f64>, other: &Vec<f64>| {
        !one.is_empty()
            && one.len() == other.len()
            && one
                .iter()
                .zip(other)
                .all(|(one, other)| (one - other).abs() <= 1e-3 * one.abs())
    };
    before
        .iter()
        .all(|(name, one)| after.get(name).is_some_and(|other| close(one, other)))
}

fn outcome(analyst: &Analyst, sound: &Models, class: &Class, fault: &Fault) -> Outcome {
    let broken = sound.with(fault.file, &fault.text);
    let analysis = analysed(analyst, &broken, Tier::Model);
    if let Some(outcome) = found(&broken, &analysis, class, fault) {
        return outcome;
    }
    let analysis = analysed(analyst, &broken, Tier::Bands);
    if let Some(outcome) = found(&broken, &analysis, class, fault) {
        return outcome;
    }
    let harmless = match class.name {
        "tolerance too wide" => kinds::ends_of_tolerance(sound, fault).iter().all(|text| {
            let end = analysed(analyst, &sound.with(fault.file, text), Tier::Bands);
            let mut all = end.files.iter().flat_map(|file| &file.findings);
            all.all(|finding| finding.rule != "target-missed")
        }),
        _ => class.by_target && unchanged(&analysed(analyst, sound, Tier::Bands), &analysis),
    };
    if harmless {
        Outcome::WithoutEffect
    } else {
        Outcome::Missed
    }
}

/// Limits moved just past the values that the targets have, and wishes for another class.
fn moved_targets(models: &Models) -> Vec<Fault> {
    let analysis = analysed(&Analyst::default(), models, Tier::Bands);
    let mut faults = Vec::new();
    for file in &analysis.files {
        let index = models
            .files
            .iter()
            .position(|(name, _)| file.path.ends_with(name))
            .unwrap();
        let text = &models.files[index].1;
        for line in lines::statements(text)
            .iter()
            .filter(|line| line.word == "require")
        {
            for new in moved(&analysis, file, line) {
                faults.push(Fault {
                    file: index,
                    text: lines::replaced(text, line.index, Some(&new)),
                    lines: Lines::These(vec![line.index]),
                    what: format!("{} → {}", line.text.trim(), new.trim()),
                });
            }
        }
    }
    faults
}

fn moved(analysis: &Analysis, file: &FileAnalysis, line: &lines::Line) -> Vec<String> {
    let (before, last) = line.text.trim_end().rsplit_once(' ').unwrap_or_default();
    let others: &[&str] = match last {
        "semiconductor" | "insulator" => &["metal"],
        "metal" | "semimetal" => &["insulator"],
        "direct" => &["indirect", "closed"],
        "indirect" => &["direct", "closed"],
        "closed" => &["direct"],
        _ => &[],
    };
    if !others.is_empty() {
        let moved = others.iter();
        return moved.map(|other| format!("{before} {other}")).collect();
    }
    let mut targets = file.sections.iter().flat_map(|section| &section.targets);
    let target = targets.find(|target| {
        let (_, span) = analysis.absolute(&target.place).unwrap();
        file.tree.text[..span.start as usize].matches('\n').count() == line.index
    });
    let target = target.unwrap();
    assert_eq!(target.state, TargetState::Met, "{}", target.text);
    let value = target.value.unwrap().value;
    let numbers: Vec<_> = lines::numbers(&line.text)
        .into_iter()
        .filter(|number| !number.tolerance && !number.unit.is_empty())
        .collect();
    let scaled = |factor: f64| {
        numbers
            .iter()
            .rev()
            .fold(line.text.clone(), |text, number| {
                let new = format!("{:.9}", number.value * factor);
                lines::spliced(&text, number.start, number.end, &new)
            })
    };
    let (lower, upper) = target.limits;
    let raised = lower.map(|lower| scaled(value / lower * 1.03));
    let lowered = upper.map(|upper| scaled(value / upper * 0.97));
    let within = line.text.contains("within");
    // An absolute half width does not grow with the limit.
    let half = match (lower, upper) {
        (Some(lower), Some(upper)) if within => {
            Some(((lower + upper) / 2.0, (upper - lower) / 2.0))
        }
        _ => None,
    };
    match half {
        Some((middle, half)) if !line.text.contains('%') => {
            vec![
                scaled((value + 1.03 * half) / middle),
                scaled((value - 1.03 * half) / middle),
            ]
        }
        _ => [raised, lowered].into_iter().flatten().collect(),
    }
}

fn faults_of(class: &Class, models: &Models) -> Vec<Fault> {
    match class.name {
        "target missed" => moved_targets(models),
        // A size is known by what it does, and these models have no targets.
        _ if class.by_target && models.name == "flat" => Vec::new(),
        _ => (class.faults)(models),
    }
}

#[test]
fn sound_models_are_silent() {
    let mut loud = String::new();
    for models in models::all() {
        let analysis = analysed(&Analyst::default(), &models, Tier::Bands);
        for finding in analysis.files.iter().flat_map(|file| &file.findings) {
            let (file, line) = place(&analysis, finding);
            if finding.level >= Level::Warning {
                let (rule, message) = (finding.rule, &finding.message);
                let _ = writeln!(
                    loud,
                    "{}/{file}:{}: {rule} {message}",
                    models.name,
                    line + 1
                );
            }
        }
    }
    assert!(loud.is_empty(), "{loud}");
}

#[test]
fn faults_are_found_and_the_table_is_up_to_date() {
    let all = models::all();
    let mut tasks = Vec::new();
    for (class, kind) in CLASSES.iter().enumerate() {
        for (models, sound) in all.iter().enumerate() {
            let faults = faults_of(kind, sound).into_iter().enumerate();
            // Where bands are to be solved, every fourth: a blind choice that keeps the test short.
            let taken = faults.filter(|(number, _)| !kind.by_target || number % EVERY == EVERY / 2);
            tasks.extend(taken.map(|(_, fault)| (class, models, fault)));
        }
    }
    let outcomes: Vec<Outcome> = tasks
        .par_iter()
        .with_max_len(1)
        .map_init(
            HashMap::<usize, Analyst>::new,
            |analysts, (class, models, fault)| {
                let analyst = analysts.entry(*models).or_default();
                let told = outcome(analyst, &all[*models], &CLASSES[*class], fault);
                if let Outcome::Missed | Outcome::WithoutEffect = told {
                    println!(
                        "{told:?}: {}, {}: {}",
                        CLASSES[*class].name, all[*models].name, fault.what
                    );
                }
                told
            },
        )
        .collect();
    let counts = |class: Option<usize>| {
        let of = |wanted: Outcome| {
            let pairs = tasks.iter().zip(&outcomes);
            pairs
                .filter(|((own, ..), outcome)| {
                    class.is_none_or(|class| class == *own) && **outcome == wanted
                })
                .count()
        };
        Counts {
            here: of(Outcome::Here),
            by_target: of(Outcome::ByTarget),
            missed: of(Outcome::Missed),
            without_effect: of(Outcome::WithoutEffect),
        }
    };
    let mut table = String::from(
        "| fault | made | on its line | by a target | found |\n| --- | ---: | ---: | ---: | ---: |\n",
    );
    for (index, class) in CLASSES.iter().enumerate() {
        let counts = counts(Some(index));
        assert!(counts.made() > 0, "no fault of `{}` was made", class.name);
        table += &counts.row(class.name);
    }
    let total = counts(None);
    table += &total.row("**all**");
    let _ = writeln!(
        table,
        "\n{} more were without effect and are not counted.",
        total.without_effect
    );
    println!("{table}");
    assert!(
        total.share() >= WANTED,
        "only {:.1} % are found",
        100.0 * total.share()
    );
    hold_page(&table);
}

struct Counts {
    here: usize,
    by_target: usize,
    missed: usize,
    without_effect: usize,
}

impl Counts {
    fn made(&self) -> usize {
        self.here + self.by_target + self.missed
    }

    fn share(&self) -> f64 {
        let [found, made] =
            [self.here + self.by_target, self.made()].map(|count| u32::try_from(count).unwrap());
        f64::from(found) / f64::from(made)
    }

    fn row(&self, name: &str) -> String {
        let share = (1000.0 * self.share()).floor() / 10.0;
        format!(
            "| {name} | {} | {} | {} | {share:.1} % |\n",
            self.made(),
            self.here,
            self.by_target
        )
    }
}

fn hold_page(table: &str) {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("DEVELOPERS.md");
    let page = std::fs::read_to_string(&path).unwrap();
    let (before, rest) = page.split_once(BEGIN).unwrap();
    let (committed, after) = rest.split_once(END).unwrap();
    if std::env::var_os("CRENATE_WRITE_PAGES").is_some() {
        std::fs::write(&path, format!("{before}{BEGIN}{table}{END}{after}")).unwrap();
        return;
    }
    assert!(
        committed == table,
        "the table in DEVELOPERS.md is stale: run this test with CRENATE_WRITE_PAGES=1"
    );
}
