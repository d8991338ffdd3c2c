//! `show --format json`: the schema `crenate-show-1`.
//!
//! Energies in eV, lengths in nm, masses in electron masses (negative at a top),
//! k in fractions of the primitive reciprocal vectors. A value that does not
//! exist is null. Numbers are cut where their uncertainty makes further digits
//! meaningless, and the uncertainty beside them covers the cut.

use serde::Serialize;

use super::analysis::{FileAnalysis, SectionAnalysis};
use super::locate::Locator;
use super::units::{self, ELECTRON_MASS, ELECTRONVOLT};
use super::words;
use crate::bands::{Assessment, Band, Extremum, Gap, MeasureValue, Measured, Solution};
use crate::model::{Crystal, Dimension};

/// The name of the schema.
pub const SCHEMA: &str = "crenate-show-1";

/// One crystal.
#[derive(Debug, Serialize)]
pub struct CrystalRecord {
    file: String,
    name: String,
    title: String,
    line: usize,
    dimension: usize,
    primitive_cell_nm: Vec<Vec<f64>>,
    #[serde(rename = "er_eV")]
    er_ev: Option<f64>,
    #[serde(rename = "temperature_K")]
    temperature_k: Option<f64>,
    #[serde(rename = "potential_eV")]
    potential_ev: Option<PotentialRecord>,
    bands: Vec<BandRecord>,
    gaps: Vec<GapRecord>,
    filling: Option<f64>,
    #[serde(rename = "fermi_eV")]
    fermi_ev: Option<f64>,
    #[serde(rename = "fermi_uncertainty_eV")]
    fermi_uncertainty_ev: Option<f64>,
    class: Option<&'static str>,
    measures: Vec<MeasureRecord>,
    targets: Vec<TargetRecord>,
    /// Why there are no bands; null where there are.
    unsolved: Option<String>,
}

#[derive(Debug, Serialize)]
struct PotentialRecord {
    lowest: f64,
    mean: f64,
    highest: f64,
}

/// One band.
#[derive(Debug, Serialize)]
pub(super) struct BandRecord {
    band: usize,
    #[serde(rename = "bottom_eV")]
    bottom_ev: f64,
    #[serde(rename = "top_eV")]
    top_ev: f64,
    #[serde(rename = "width_eV")]
    width_ev: f64,
    bottom_k: Vec<f64>,
    bottom_point: Option<String>,
    top_k: Vec<f64>,
    top_point: Option<String>,
    mass_bottom_me: Option<f64>,
    mass_top_me: Option<f64>,
    mass_uncertainty_me: Option<f64>,
    #[serde(rename = "uncertainty_eV")]
    uncertainty_ev: f64,
    #[serde(rename = "width_uncertainty_eV")]
    width_uncertainty_ev: f64,
}

/// One gap.
#[derive(Debug, Serialize)]
pub(super) struct GapRecord {
    above_band: usize,
    #[serde(rename = "size_eV")]
    size_ev: f64,
    #[serde(rename = "uncertainty_eV")]
    uncertainty_ev: f64,
    kind: &'static str,
}

#[derive(Debug, Serialize)]
struct MeasureRecord {
    name: String,
    value: Option<f64>,
    unit: Option<String>,
    uncertainty: Option<f64>,
    /// Why there is no value; null where there is.
    reason: Option<String>,
}

#[derive(Debug, Serialize)]
struct TargetRecord {
    line: usize,
    text: String,
    state: &'static str,
    reason: Option<String>,
    value: Option<f64>,
    uncertainty: Option<f64>,
    unit: Option<String>,
    worst: Option<f64>,
    driver: Option<String>,
    /// What the class or the kind of gap is, where the target is about one.
    found: Option<String>,
}

/// The records of a file's crystals, in order; `file` is the name to show, `only` picks one crystal.
#[must_use]
pub fn crystals(
    locator: &Locator<'_>,
    analysed: &FileAnalysis,
    file: &str,
    only: &[String],
) -> Vec<CrystalRecord> {
    let chosen = analysed.crystals(only);
    chosen
        .map(|(section, crystal)| record(locator, section, crystal, file))
        .collect()
}

/// The same, each as one line.
#[must_use]
pub fn lines(
    locator: &Locator<'_>,
    analysed: &FileAnalysis,
    file: &str,
    only: &[String],
) -> Vec<String> {
    let records = crystals(locator, analysed, file, only);
    records
        .iter()
        .map(|record| serde_json::to_string(record).unwrap_or_default())
        .collect()
}

fn record(
    locator: &Locator<'_>,
    section: &SectionAnalysis,
    crystal: &Crystal,
    file: &str,
) -> CrystalRecord {
    let solution = section.solution();
    let fermi = solution
        .and_then(|solution| solution.fermi)
        .map(electronvolt);
    CrystalRecord {
        file: file.to_owned(),
        name: crystal.name.clone(),
        title: crystal.title.clone(),
        line: locator.line(&crystal.place),
        dimension: crystal.dimension,
        primitive_cell_nm: cell(crystal),
        er_ev: crystal
            .recoil
            .as_ref()
            .and_then(|recoil| finite(recoil.energy.value / ELECTRONVOLT)),
        temperature_k: crystal
            .temperature
            .as_ref()
            .and_then(|dual| finite(dual.value)),
        potential_ev: solution.map(potential),
        bands: solution.map(bands).unwrap_or_default(),
        gaps: solution.map(gaps).unwrap_or_default(),
        filling: crystal.filling.as_ref().and_then(|dual| finite(dual.value)),
        fermi_ev: fermi.map(|level| level.value),
        fermi_uncertainty_ev: fermi.map(|level| level.uncertainty),
        class: solution
            .and_then(|solution| solution.class)
            .map(words::class),
        measures: section.measures.iter().map(measure).collect(),
        targets: section
            .targets
            .iter()
            .map(|assessment| target(locator, crystal, assessment))
            .collect(),
        unsolved: section.unsolved().map(words::unsolved),
    }
}

fn finite(value: f64) -> Option<f64> {
    value.is_finite().then_some(value)
}

fn electronvolt(energy: Measured) -> Measured {
    scaled(energy, ELECTRONVOLT)
}

fn scaled(value: Measured, unit: f64) -> Measured {
    units::machine(Measured {
        value: value.value / unit,
        uncertainty: value.uncertainty / unit,
    })
}

/// Lengths to the digits that a decimal input has: 8e-9/1e-9 is 8, not 8.000000000000002.
fn nanometre(length: f64) -> f64 {
    format!("{:.14e}", length / 1e-9).parse().unwrap_or(0.0)
}

fn cell(crystal: &Crystal) -> Vec<Vec<f64>> {
    let vectors = crystal.vectors.iter();
    vectors
        .map(|vector| vector.iter().map(|entry| nanometre(entry.value)).collect())
        .collect()
}

fn potential(solution: &Solution) -> PotentialRecord {
    let range = &solution.potential;
    let size = range.lowest.abs().max(range.highest.abs());
    // Digits that rounding leaves meaningless are cut; a mean that cancels is nought.
    let told = |joule: f64| match joule.abs() < 1e-13 * size {
        true => 0.0,
        false => format!("{:.13e}", joule / ELECTRONVOLT)
            .parse()
            .unwrap_or(0.0),
    };
    PotentialRecord {
        lowest: told(range.lowest),
        mean: told(range.mean),
        highest: told(range.highest),
    }
}

/// The bands of a solution.
pub(super) fn bands(solution: &Solution) -> Vec<BandRecord> {
    let numbered = solution.bands.iter().enumerate();
    numbered
        .map(|(index, band)| band_record(index + 1, band))
        .collect()
}

fn band_record(number: usize, band: &Band) -> BandRecord {
    let bottom = electronvolt(band.bottom.energy);
    let top = electronvolt(band.top.energy);
    let width = electronvolt(band.width);
    let masses = [mass(&band.bottom), mass(&band.top)];
    let uncertainties = masses.iter().flatten().map(|mass| mass.uncertainty);
    BandRecord {
        band: number,
        bottom_ev: bottom.value,
        top_ev: top.value,
        width_ev: width.value,
        bottom_k: band.bottom.k.clone(),
        bottom_point: band.bottom.point.clone(),
        top_k: band.top.k.clone(),
        top_point: band.top.point.clone(),
        mass_bottom_me: masses[0].map(|mass| mass.value),
        mass_top_me: masses[1].map(|mass| mass.value),
        mass_uncertainty_me: uncertainties.reduce(f64::max),
        uncertainty_ev: bottom.uncertainty.max(top.uncertainty),
        width_uncertainty_ev: width.uncertainty,
    }
}

fn mass(extremum: &Extremum) -> Option<Measured> {
    extremum.mass.map(|mass| scaled(mass, ELECTRON_MASS))
}

/// The gaps of a solution.
pub(super) fn gaps(solution: &Solution) -> Vec<GapRecord> {
    let numbered = solution.gaps.iter().enumerate();
    numbered
        .map(|(index, gap)| gap_record(index + 1, gap))
        .collect()
}

fn gap_record(above_band: usize, gap: &Gap) -> GapRecord {
    let size = electronvolt(gap.size);
    GapRecord {
        above_band,
        size_ev: size.value,
        uncertainty_ev: size.uncertainty,
        kind: words::gap_kind(gap.kind),
    }
}

/// The SI value and the name of the unit that machines are told a dimension in; no name for plain numbers.
#[must_use]
pub fn machine_unit(dimension: Dimension) -> (f64, Option<String>) {
    match dimension {
        Dimension::NUMBER => (1.0, None),
        Dimension::ENERGY => (ELECTRONVOLT, Some("eV".to_owned())),
        Dimension::LENGTH => (1e-9, Some("nm".to_owned())),
        Dimension::MASS => (ELECTRON_MASS, Some("me".to_owned())),
        other => {
            let scale = units::Trade::default().scale(other, 1.0);
            (scale.factor, Some(scale.name))
        }
    }
}

fn measure(measure: &MeasureValue) -> MeasureRecord {
    let (factor, unit) = machine_unit(measure.dimension);
    let value = measure
        .value
        .as_ref()
        .ok()
        .map(|value| scaled(*value, factor));
    MeasureRecord {
        name: measure.name.clone(),
        value: value.map(|value| value.value),
        unit,
        uncertainty: value.map(|value| value.uncertainty),
        reason: measure.value.as_ref().err().cloned(),
    }
}

fn target(locator: &Locator<'_>, crystal: &Crystal, assessment: &Assessment) -> TargetRecord {
    let (factor, unit) = machine_unit(words::target_dimension(assessment));
    let value = assessment.value.map(|value| scaled(value, factor));
    let reach = assessment.value.map_or(0.0, |value| value.uncertainty);
    let worst = assessment.worst.map(|value| {
        let worst = Measured {
            value,
            uncertainty: reach,
        };
        scaled(worst, factor).value
    });
    TargetRecord {
        line: locator.line(&assessment.place),
        text: assessment.text.clone(),
        state: words::target_state(assessment.state),
        reason: assessment.reason.clone(),
        value: value.map(|value| value.value),
        uncertainty: value.map(|value| value.uncertainty),
        unit: value.and(unit),
        worst,
        driver: words::driver(locator, crystal, assessment),
        found: assessment.found.clone(),
    }
}
