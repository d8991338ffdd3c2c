//! What an editor can have drawn or scanned, and where it offers to.

use std::path::Path;

use super::analysis::{Analysis, FileAnalysis};
use super::analyst::Analyst;
use super::paint::Paint;
use super::scan::{Range, scan};
use super::svg;
use crate::model::{Crystal, FileSource, Parameter, ParameterKind};
use crate::text::Span;

/// Values of an offered scan.
const STEPS: usize = 11;
/// How far an offered scan goes to either side, as a part of the value.
const REACH: f64 = 0.1;

/// What an offer is for.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum OfferSort {
    /// A picture of a crystal.
    Draw,
    /// Its bands against this named value.
    Scan(String),
}

/// Something that an editor offers beside the text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Offer {
    /// Beside which bytes.
    pub span: Span,
    /// In a few words.
    pub title: String,
    /// The crystal.
    pub crystal: String,
    /// What for.
    pub sort: OfferSort,
}

/// The offers of a file in order: each crystal's picture, and a scan over each named value of its own.
#[must_use]
pub fn offers(analysis: &Analysis, path: &Path) -> Vec<Offer> {
    let Some(file) = analysis.file(path) else {
        return Vec::new();
    };
    let mut offers = Vec::new();
    for (section, crystal) in file.crystals(&[]) {
        let at = |place| analysis.absolute(place).map(|(_, span)| span);
        let draw = at(&crystal.place).map(|span| Offer {
            span,
            title: "draw".to_owned(),
            crystal: crystal.name.clone(),
            sort: OfferSort::Draw,
        });
        offers.extend(draw);
        let own = crystal
            .parameters
            .iter()
            .filter(|parameter| parameter.place.file == file.file)
            .filter(|parameter| parameter.place.section == section.section);
        for parameter in own {
            if let (ParameterKind::Name(name), Some(span)) = (&parameter.kind, at(&parameter.place))
            {
                offers.push(Offer {
                    span,
                    title: format!("scan {name} by ±{:.0} %", 100.0 * REACH),
                    crystal: crystal.name.clone(),
                    sort: OfferSort::Scan(name.clone()),
                });
            }
        }
    }
    offers
}

/// The name of the crystal whose section holds a byte.
#[must_use]
pub fn crystal_at(analysis: &Analysis, path: &Path, offset: u32) -> Option<String> {
    let (_, section) = analysis.file(path)?.section_at(offset)?;
    section.crystal.as_ref().map(|crystal| crystal.name.clone())
}

/// The picture of a crystal, as SVG.
///
/// # Errors
/// In words, where there is no such crystal or nothing to draw.
pub fn picture(
    analyst: &Analyst,
    analysis: &Analysis,
    path: &Path,
    crystal: &str,
    cancel: &(dyn Fn() -> bool + Sync),
) -> Result<String, String> {
    let (_, crystal) = find(analysis, path, crystal)?;
    svg::draw(analyst, crystal, cancel)
}

/// The table of a crystal's bands against one of its named values.
///
/// # Errors
/// In words, where there is no such crystal or no such value.
pub fn scanned(
    analyst: &Analyst,
    source: &dyn FileSource,
    analysis: &Analysis,
    path: &Path,
    crystal: &str,
    name: &str,
) -> Result<String, String> {
    let (file, found) = find(analysis, path, crystal)?;
    let mut parameters = found.parameters.iter();
    let parameter = parameters
        .find(|parameter| matches!(&parameter.kind, ParameterKind::Name(known) if known == name))
        .ok_or_else(|| format!("`{crystal}` does not depend on `{name}`"))?;
    let (from, to) = (
        scaled(parameter, 1.0 - REACH),
        scaled(parameter, 1.0 + REACH),
    );
    let range = Range {
        name,
        from: &from,
        to: &to,
        steps: STEPS,
    };
    let scans = scan(
        analyst,
        source,
        analysis,
        file,
        &[crystal.to_owned()],
        &range,
    )?;
    Ok(scans
        .iter()
        .map(|scan| scan.text(Paint::default()))
        .collect())
}

/// A multiple of a parameter's value, as a file would write it; its tolerance left out.
fn scaled(parameter: &Parameter, factor: f64) -> String {
    let text = parameter.text.split('±').next().unwrap_or_default();
    let text = text.split("+/-").next().unwrap_or_default();
    format!("{factor} * ({})", text.trim())
}

fn find<'a>(
    analysis: &'a Analysis,
    path: &Path,
    name: &str,
) -> Result<(&'a FileAnalysis, &'a Crystal), String> {
    let missing = || format!("there is no crystal `{name}`");
    let file = analysis.file(path).ok_or_else(missing)?;
    let mut crystals = file.crystals(&[]).map(|(_, crystal)| crystal);
    let found = crystals.find(|crystal| crystal.name == name);
    Ok((file, found.ok_or_else(missing)?))
}
