//! A small picture of a one-dimensional cell in plain characters: where the potential stands above an
//! energy, and which energies are bands.
//!
//! Energy runs upward. `░` is below the potential, `━` a band where the carrier may be, `╌` the
//! same band inside a wall, where it tunnels. Two cells are drawn, as walls only show between wells.

use super::units::Trade;
use crate::bands::{Solution, potential_line};
use crate::model::{Crystal, Dimension};

/// Characters for two cells.
const COLUMNS: usize = 44;
/// Lines.
const ROWS: usize = 9;
/// Bands drawn at most.
const BANDS: usize = 3;

/// Samples of a cell's potential, two for each character.
const SAMPLES: usize = COLUMNS;

/// The picture of a one-dimensional crystal, or nothing.
#[must_use]
pub fn of_crystal(crystal: &Crystal, solution: &Solution) -> Vec<String> {
    if crystal.dimension != 1 {
        return Vec::new();
    }
    let bands: Vec<(f64, f64)> = solution
        .bands
        .iter()
        .map(|band| (band.bottom.energy.value, band.top.energy.value))
        .collect();
    draw(&samples(crystal), &bands, &Trade::of(crystal))
}

/// The potential at even distances over one cell; a repulsive delta stands as an infinite wall, an attractive one
/// as an infinite well.
fn samples(crystal: &Crystal) -> Vec<f64> {
    let line = potential_line(crystal, 8 * SAMPLES);
    let (Some(first), Some(last)) = (line.first(), line.last()) else {
        return Vec::new();
    };
    let period = last.0 - first.0;
    let place = |sample: usize| first.0 + (sample as f64 + 0.5) / SAMPLES as f64 * period;
    let mut samples: Vec<f64> = (0..SAMPLES)
        .map(|sample| at(&line, place(sample)))
        .collect();
    for delta in &crystal.potential.deltas {
        let share = (delta.at.value - first.0).rem_euclid(period) / period;
        // The sample that is drawn for the delta's character.
        let character = (share * (COLUMNS / 2) as f64) as usize;
        let sample = samples.get_mut(character * SAMPLES / (COLUMNS / 2));
        if let Some(sample) = sample {
            *sample = delta.strength.value.signum() * f64::INFINITY;
        }
    }
    samples
}

/// The value of a line of points at a position.
fn at(line: &[(f64, f64)], position: f64) -> f64 {
    let after = line.partition_point(|point| point.0 <= position);
    let right = line.get(after).or(line.last());
    let left = after
        .checked_sub(1)
        .and_then(|index| line.get(index))
        .or(line.first());
    match (left, right) {
        (Some(left), Some(right)) if right.0 > left.0 => {
            left.1 + (right.1 - left.1) * (position - left.0) / (right.0 - left.0)
        }
        (Some(left), _) => left.1,
        _ => f64::NAN,
    }
}

/// The picture, at most 60 columns wide and 10 lines high, or nothing where there is nothing to see.
///
/// `potential` samples one cell evenly, `bands` are (bottom, top); all in joule.
#[must_use]
fn draw(potential: &[f64], bands: &[(f64, f64)], trade: &Trade) -> Vec<String> {
    let bands = bands.get(..BANDS.min(bands.len())).unwrap_or(bands);
    let Some(frame) = Frame::around(potential, bands) else {
        return Vec::new();
    };
    (0..ROWS)
        .map(|row| {
            let line = frame.line(row, potential, bands);
            let label = frame.label(row, bands, trade);
            format!("{line} {label}").trim_end().to_owned()
        })
        .collect()
}

/// The energies shown.
struct Frame {
    lowest: f64,
    step: f64,
}

impl Frame {
    fn around(potential: &[f64], bands: &[(f64, f64)]) -> Option<Self> {
        // The walls and two bands; the third shows only where it is near.
        let second = bands.get(1).or(bands.first())?.1;
        let finite = potential.iter().copied().filter(|value| value.is_finite());
        let floor = finite.clone().fold(bands.first()?.0, f64::min);
        let roof = finite.fold(second, f64::max);
        // A wall far above the bands is cut, so that the bands stay apart.
        let roof = roof.min(second + 0.5 * (second - floor));
        let step = (roof - floor) / (ROWS as f64 - 0.5);
        (step > 0.0 && step.is_finite()).then_some(Self {
            lowest: floor - 0.25 * step,
            step,
        })
    }

    /// The energies of a row, counted from the top.
    fn span(&self, row: usize) -> (f64, f64) {
        let from_below = (ROWS - 1 - row) as f64;
        let low = self.lowest + from_below * self.step;
        (low, low + self.step)
    }

    /// The bands that a row shows: those that reach its middle, or lie wholly between two middles.
    fn bands_in(&self, row: usize, bands: &[(f64, f64)]) -> Vec<usize> {
        let (low, high) = self.span(row);
        let middle = 0.5 * (low + high);
        let numbered = bands.iter().enumerate();
        numbered
            .filter(|(_, (bottom, top))| {
                let centre = 0.5 * (bottom + top);
                (*bottom <= middle && middle <= *top) || (low <= centre && centre < high)
            })
            .map(|(index, _)| index)
            .collect()
    }

    fn line(&self, row: usize, potential: &[f64], bands: &[(f64, f64)]) -> String {
        let (low, high) = self.span(row);
        let middle = 0.5 * (low + high);
        let band = !self.bands_in(row, bands).is_empty();
        let cell = COLUMNS / 2;
        (0..COLUMNS)
            .map(|column| {
                let sample = (column % cell) * potential.len() / cell;
                let wall = potential.get(sample).is_some_and(|value| *value > middle);
                match (band, wall) {
                    (true, true) => '╌',
                    (true, false) => '━',
                    (false, true) => '░',
                    (false, false) => ' ',
                }
            })
            .collect()
    }

    /// The band whose middle a row holds, with its middle energy.
    fn label(&self, row: usize, bands: &[(f64, f64)], trade: &Trade) -> String {
        let (low, high) = self.span(row);
        let numbered = bands.iter().enumerate();
        let here: Vec<String> = numbered
            .filter(|(_, (bottom, top))| {
                let centre = 0.5 * (bottom + top);
                low <= centre && centre < high
            })
            .map(|(index, _)| (index + 1).to_string())
            .collect();
        let told = match here.as_slice() {
            [] => return String::new(),
            [one] => bands
                .get(one.parse::<usize>().unwrap_or(1) - 1)
                .map(|(bottom, top)| trade.tell_exact(0.5 * (bottom + top), Dimension::ENERGY)),
            _ => None,
        };
        match told {
            Some(told) => format!("{} {told}", here.join(" ")),
            None => here.join(" "),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::units::ELECTRONVOLT;

    fn wells() -> Vec<f64> {
        let wall = 0.235 * ELECTRONVOLT;
        (0..120)
            .map(|sample| if sample < 81 { 0.0 } else { wall })
            .collect()
    }

    #[test]
    fn a_picture_fits_a_hover() {
        let bands = [(0.048, 0.080), (0.19, 0.32), (0.41, 0.80)];
        let joule: Vec<(f64, f64)> = bands
            .iter()
            .map(|(bottom, top)| (bottom * ELECTRONVOLT, top * ELECTRONVOLT))
            .collect();
        let lines = draw(&wells(), &joule, &Trade::default());
        assert!(!lines.is_empty() && lines.len() <= 10, "{lines:#?}");
        assert!(
            lines.iter().all(|line| line.chars().count() <= 60),
            "{lines:#?}"
        );
        let text = lines.join("\n");
        for band in ["1 64 meV", "2 255 meV"] {
            assert!(text.contains(band), "{band} in\n{text}");
        }
        assert!(
            !text.contains("3 605 meV"),
            "a band far above the walls\n{text}"
        );
        assert!(
            text.contains('╌') && text.contains('━') && text.contains('░'),
            "{text}"
        );
    }

    #[test]
    fn nothing_is_drawn_of_nothing() {
        assert!(draw(&[0.0; 8], &[], &Trade::default()).is_empty());
        assert!(draw(&[f64::NAN], &[(0.0, 0.0)], &Trade::default()).is_empty());
    }
}
