//! `scan`: the bands of a crystal against one of its named values.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use rayon::prelude::*;

use super::analysis::{Analysis, FileAnalysis};
use super::analyst::Analyst;
use super::grid::{Stand, lay};
use super::paint::Paint;
use super::show_csv;
use super::show_json::machine_unit;
use super::units::Trade;
use super::words;
use crate::bands::{Solution, Unsolved};
use crate::model::{
    Crystal, CrystalRef, Dimension, FileId, FileSource, Parameter, ParameterKind, ReadFailure,
    Setting, World, build_crystal, build_preamble,
};
use crate::syntax::{Tree, read};

/// Gaps and widths in the table for people.
const SHOWN: usize = 2;

/// What to vary, and how far; the ends as written, units included.
#[derive(Clone, Debug)]
pub struct Range<'a> {
    /// A named value, or a field of a material as `material.field`.
    pub name: &'a str,
    /// The first value.
    pub from: &'a str,
    /// The last value.
    pub to: &'a str,
    /// How many, both ends included.
    pub steps: usize,
}

/// The bands of one crystal at each value.
pub struct Scan {
    /// The crystal.
    pub crystal: Arc<Crystal>,
    /// What was varied.
    pub parameter: Parameter,
    /// The values in SI units, with what came of each.
    pub points: Vec<(f64, Result<Arc<Solution>, Unsolved>)>,
}

/// Solves each crystal of a file that depends on the named value (with `only`, those of these names) along the range.
///
/// # Errors
/// In words, where the name, its ends or the number of steps make no scan.
pub fn scan(
    analyst: &Analyst,
    source: &dyn FileSource,
    analysis: &Analysis,
    file: &FileAnalysis,
    only: &[String],
    range: &Range<'_>,
) -> Result<Vec<Scan>, String> {
    let mut scans = Vec::new();
    for section in &file.sections {
        let Some(crystal) = &section.crystal else {
            continue;
        };
        let wanted = only.is_empty() || only.contains(&crystal.name);
        let Some(parameter) = find(crystal, range.name).filter(|_| wanted) else {
            continue;
        };
        let values = values(crystal, parameter, range)?;
        let of = CrystalRef {
            file: file.file,
            section: section.section,
        };
        let solve = |value: &f64| {
            let mut setting = Setting::nominal();
            setting.overrides.insert(parameter.id, *value);
            let built = build_crystal(&analysis.world, of, &setting, source);
            (*value, analyst.solver().solve(&built.crystal, &|| false))
        };
        scans.push(Scan {
            crystal: Arc::clone(crystal),
            parameter: parameter.clone(),
            points: values.par_iter().map(solve).collect(),
        });
    }
    match scans.is_empty() {
        true => Err(unknown(file, only, range.name)),
        false => Ok(scans),
    }
}

fn called(parameter: &Parameter) -> Option<String> {
    match &parameter.kind {
        ParameterKind::Name(name) => Some(name.clone()),
        ParameterKind::Field(material, field) => Some(format!("{material}.{field}")),
        ParameterKind::Literal | ParameterKind::Draw => None,
    }
}

fn find<'a>(crystal: &'a Crystal, name: &str) -> Option<&'a Parameter> {
    let mut all = crystal.parameters.iter();
    all.find(|parameter| called(parameter).as_deref() == Some(name))
}

fn unknown(file: &FileAnalysis, only: &[String], name: &str) -> String {
    let crystals = file.crystals(only);
    let all = crystals.flat_map(|(_, crystal)| crystal.parameters.iter().filter_map(called));
    let mut names: Vec<String> = all.collect();
    names.sort();
    names.dedup();
    match names.is_empty() {
        true => format!(
            "no crystal here depends on a named value, so none can vary; `{name}` is not known"
        ),
        false => format!(
            "no crystal here depends on `{name}`; what can vary: {}",
            names.join(", ")
        ),
    }
}

fn values(crystal: &Crystal, parameter: &Parameter, range: &Range<'_>) -> Result<Vec<f64>, String> {
    let from = value(crystal, parameter, range.from)?;
    let to = value(crystal, parameter, range.to)?;
    if range.steps == 0 {
        return Err("a scan has one step at least".to_owned());
    }
    let last = (range.steps - 1).max(1) as f64;
    let at = |step: usize| from + (to - from) * step as f64 / last;
    Ok((0..range.steps).map(at).collect())
}

/// A value as a file would write it; `Er` and `ML` are the crystal's.
fn value(crystal: &Crystal, parameter: &Parameter, text: &str) -> Result<f64, String> {
    let own = [
        (
            "Er",
            crystal.recoil.as_ref().map(|recoil| recoil.energy.value),
            Dimension::ENERGY,
        ),
        (
            "ML",
            crystal.monolayer.as_ref().map(|length| length.value),
            Dimension::LENGTH,
        ),
    ];
    for (unit, size, dimension) in own {
        let number = text
            .trim()
            .strip_suffix(unit)
            .and_then(|number| number.trim().parse::<f64>().ok());
        if let (Some(number), Some(size), true) = (number, size, dimension == parameter.dimension) {
            return Ok(number * size);
        }
    }
    let (value, dimension) = evaluate(text)?;
    let free_zero = value == 0.0 && dimension == Dimension::NUMBER;
    match dimension == parameter.dimension || free_zero {
        true => Ok(value),
        false => Err(format!(
            "`{}` is {}, and `{text}` is not of that kind",
            called(parameter).unwrap_or_default(),
            parameter.text
        )),
    }
}

/// The value of an expression that names nothing.
fn evaluate(text: &str) -> Result<(f64, Dimension), String> {
    let wrong = || format!("`{text}` is no value; write it as in a file, such as `5.4 nm`");
    if text.contains(['\n', '\r', '#', '\\']) {
        return Err(wrong());
    }
    let path = PathBuf::from("value");
    let scratch = Scratch(Arc::new(read(&format!("let value = {text}\n"))));
    let world = World::gather(&scratch, std::slice::from_ref(&path));
    let built = build_preamble(&world, FileId::of(&path), &Setting::nominal());
    let readable = scratch
        .0
        .entries
        .iter()
        .all(|entry| entry.section.problems.is_empty());
    match built.values.first() {
        Some(named) if readable && built.troubles.is_empty() && named.value.value.is_finite() => {
            Ok((named.value.value, named.dimension))
        }
        _ => Err(wrong()),
    }
}

/// One text as the only file.
struct Scratch(Arc<Tree>);

impl FileSource for Scratch {
    fn tree(&self, _: &Path) -> Result<Arc<Tree>, ReadFailure> {
        Ok(Arc::clone(&self.0))
    }

    fn bytes(&self, _: &Path) -> Result<Arc<[u8]>, ReadFailure> {
        Err(ReadFailure::NotFound)
    }

    fn inside(&self, _: &Path) -> bool {
        false
    }
}

impl Scan {
    /// The table for people: the value, and the lowest gaps and widths.
    #[must_use]
    pub fn text(&self, paint: Paint) -> String {
        let trade = Trade::of(&self.crystal);
        let mut headings = vec![called(&self.parameter).unwrap_or_default()];
        for band in 1..=SHOWN {
            headings.push(format!("gap {band}"));
            headings.push(format!("width {band}"));
        }
        let mut rows = vec![headings];
        for (value, outcome) in &self.points {
            let mut row = vec![self.told(*value, &trade)];
            match outcome {
                Ok(solution) => row.extend(numbers(solution, &trade)),
                Err(why) => row.push(words::unsolved(why)),
            }
            rows.push(row);
        }
        let stands = vec![Stand::Right; 1 + 2 * SHOWN];
        format!(
            "{}\n{}",
            paint.strong(&self.crystal.name),
            lay(&stands, &rows, 2)
        )
    }

    /// The value in the unit that it is written in.
    fn told(&self, value: f64, trade: &Trade) -> String {
        trade.tell_exact(value, self.parameter.dimension)
    }

    /// The value as machines are told it.
    fn machine_value(&self, value: f64) -> f64 {
        let (factor, _) = machine_unit(self.parameter.dimension);
        format!("{:.13e}", value / factor)
            .parse()
            .unwrap_or(f64::NAN)
    }

    /// The rows for `csv`: the varied name and its value (eV, nm, me), then those of `show`.
    #[must_use]
    pub fn csv(&self, file: &str) -> String {
        let mut text = String::new();
        for (value, outcome) in &self.points {
            let Ok(solution) = outcome else {
                continue;
            };
            for fields in show_csv::band_rows(solution) {
                let mut row = vec![
                    called(&self.parameter).unwrap_or_default(),
                    serde_json::to_string(&self.machine_value(*value)).unwrap_or_default(),
                    file.to_owned(),
                    self.crystal.name.clone(),
                ];
                row.extend(fields);
                text += &show_csv::line(&row);
            }
        }
        text
    }

    /// One record of `json`.
    #[must_use]
    pub fn json(&self, file: &str) -> serde_json::Value {
        let points = self.points.iter().map(|(value, outcome)| match outcome {
            Ok(solution) => serde_json::json!({
                "value": self.machine_value(*value),
                "bands": super::show_json::bands(solution),
                "gaps": super::show_json::gaps(solution),
                "unsolved": null,
            }),
            Err(why) => serde_json::json!({
                "value": self.machine_value(*value),
                "bands": [],
                "gaps": [],
                "unsolved": words::unsolved(why),
            }),
        });
        serde_json::json!({
            "file": file,
            "name": self.crystal.name,
            "varied": called(&self.parameter),
            "unit": machine_unit(self.parameter.dimension).1,
            "points": points.collect::<Vec<_>>(),
        })
    }
}

fn numbers(solution: &Solution, trade: &Trade) -> Vec<String> {
    let mut cells = Vec::new();
    for (band, gap) in solution.bands.iter().zip(&solution.gaps).take(SHOWN) {
        cells.push(match gap.kind {
            crate::bands::GapKind::Closed => "closed".to_owned(),
            _ => trade.tell(gap.size, Dimension::ENERGY),
        });
        cells.push(trade.tell(band.width, Dimension::ENERGY));
    }
    cells
}

/// The columns of `csv`.
#[must_use]
pub fn csv_header() -> String {
    let mut columns = vec!["varied".to_owned(), "value".to_owned()];
    columns.extend(show_csv::HEADER.map(str::to_owned));
    show_csv::line(&columns)
}
