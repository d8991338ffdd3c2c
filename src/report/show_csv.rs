//! `show --format csv`: a row a band, energies in eV, masses in electron masses.

use super::analysis::FileAnalysis;
use super::units::{self, ELECTRON_MASS, ELECTRONVOLT};
use super::words;
use crate::bands::{Extremum, Measured, Solution};

/// The columns.
pub const HEADER: [&str; 10] = [
    "file",
    "crystal",
    "band",
    "bottom_eV",
    "top_eV",
    "width_eV",
    "gap_above_eV",
    "gap_kind",
    "mass_bottom_me",
    "mass_top_me",
];

/// The columns as one line.
#[must_use]
pub fn header() -> String {
    line(&HEADER.map(str::to_owned))
}

/// One row as a line, quoted where it needs to be.
#[must_use]
pub fn line(fields: &[String]) -> String {
    let mut writer = csv::Writer::from_writer(Vec::new());
    let written = writer.write_record(fields).is_ok();
    let bytes = writer.into_inner().unwrap_or_default();
    match written {
        true => String::from_utf8(bytes).unwrap_or_default(),
        false => String::new(),
    }
}

/// The rows of a file's crystals; crystals without bands have none.
#[must_use]
pub fn rows(analysed: &FileAnalysis, file: &str, only: &[String]) -> String {
    let mut text = String::new();
    for (section, crystal) in analysed.crystals(only) {
        let Some(solution) = section.solution() else {
            continue;
        };
        for fields in band_rows(solution) {
            let mut row = vec![file.to_owned(), crystal.name.clone()];
            row.extend(fields);
            text += &line(&row);
        }
    }
    text
}

/// The fields of each band, from its number on.
#[must_use]
pub fn band_rows(solution: &Solution) -> Vec<Vec<String>> {
    let numbered = solution.bands.iter().enumerate();
    let row = |(index, band): (usize, &crate::bands::Band)| {
        let gap = solution.gaps.get(index);
        vec![
            (index + 1).to_string(),
            number(band.bottom.energy, ELECTRONVOLT),
            number(band.top.energy, ELECTRONVOLT),
            number(band.width, ELECTRONVOLT),
            gap.map(|gap| number(gap.size, ELECTRONVOLT))
                .unwrap_or_default(),
            gap.map(|gap| words::gap_kind(gap.kind).to_owned())
                .unwrap_or_default(),
            mass(&band.bottom),
            mass(&band.top),
        ]
    };
    numbered.map(row).collect()
}

fn mass(extremum: &Extremum) -> String {
    extremum
        .mass
        .map(|mass| number(mass, ELECTRON_MASS))
        .unwrap_or_default()
}

fn number(value: Measured, unit: f64) -> String {
    let told = units::machine(Measured {
        value: value.value / unit,
        uncertainty: value.uncertainty / unit,
    });
    serde_json::to_string(&told.value).unwrap_or_default()
}
