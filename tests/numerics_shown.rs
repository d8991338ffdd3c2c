//! What `show` prints of random crystals: every number holds to its last digit, or says how far it is in doubt.
#![allow(
    clippy::indexing_slicing,
    clippy::print_stdout,
    clippy::unwrap_used,
    missing_docs
)]

#[path = "report/mod.rs"]
mod support;

use crenate::bands::{Measured, Solution};
use crenate::report::locate::Locator;
use crenate::report::paint::Paint;
use crenate::report::units::digits;
use crenate::report::{Analyst, Tier, show_text};
use support::{Files, analysed};

/// A small generator (Marsaglia's xorshift, J. Stat. Softw. 8, 14 (2003)); uniform in [0, 1).
struct Random(u64);

impl Random {
    fn next(&mut self) -> f64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }

    fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.next()
    }
}

/// The number at the head of a cell: its value, what one of its last digit is worth, and the doubt it states.
fn parsed(cell: &str) -> (f64, f64, Option<f64>) {
    let number = |word: &str| word.replace('−', "-").parse::<f64>().unwrap();
    let words: Vec<&str> = cell.split_whitespace().collect();
    let (mantissa, power) = words[0].split_once('e').unwrap_or((words[0], "0"));
    let decimals = mantissa
        .split_once('.')
        .map_or(0, |(_, decimals)| decimals.len() as i32);
    let last = number(power) as i32 - decimals;
    let doubt = (words.get(1) == Some(&"±")).then(|| number(words[2]));
    // with a doubt told, zeros that fill up to the point are no digits
    let filled = mantissa.len() - mantissa.trim_end_matches('0').len();
    let last = match doubt {
        Some(_) if decimals == 0 => last + filled as i32,
        _ => last,
    };
    (number(words[0]), 10f64.powi(last), doubt)
}

/// What one of the cell's unit is in SI.
fn unit(cell: &str) -> f64 {
    const EV: f64 = 1.602_176_634e-19;
    match cell.split_whitespace().last().unwrap() {
        "eV" => EV,
        "meV" => 1e-3 * EV,
        "µeV" => 1e-6 * EV,
        "neV" => 1e-9 * EV,
        "me" => 9.109_383_713_9e-31,
        other => panic!("no unit {other} in {cell}"),
    }
}

/// A printed number against what is known: the truth, anywhere in the bound, lies within the stated doubt, or within one of
/// the last digit where no doubt is stated.
fn supported(cell: &str, value: f64, uncertainty: f64) -> Result<(), String> {
    let (told, last, doubt) = parsed(cell);
    let reach = (told - value).abs() + uncertainty;
    let allowed = match doubt {
        Some(doubt) => doubt,
        None => last,
    };
    let finest = doubt.is_none_or(|doubt| told == 0.0 || last > 0.02 * doubt);
    if reach <= allowed * (1.0 + 1e-9) && finest {
        Ok(())
    } else {
        Err(format!("`{cell}` for {value:e} ± {uncertainty:e}"))
    }
}

#[test]
fn digits_hold_for_any_value_and_uncertainty() {
    let mut random = Random(0x51ed_270b_9f3c_aa11);
    for _ in 0..200_000 {
        let value =
            10f64.powf(random.between(-30.0, 12.0)) * if random.next() < 0.5 { -1.0 } else { 1.0 };
        let uncertainty = value.abs() * 10f64.powf(random.between(-17.0, 2.0));
        let cell = digits(value, uncertainty);
        if let Err(why) = supported(&cell, value, uncertainty) {
            panic!("{why}");
        }
    }
    for unknown in [f64::INFINITY, f64::NAN] {
        assert_eq!(digits(3.0, unknown), "unknown", "a bound of {unknown}");
    }
}

fn model(random: &mut Random) -> String {
    let mut text = format!("crystal c\n  mass {:.4} me\n", random.between(0.02, 1.0));
    let count = 1 + (random.next() * 3.0) as usize;
    let mut layers = String::new();
    for _ in 0..=count {
        let thick = if random.next() < 0.2 { 30.0 } else { 6.0 };
        layers += &format!(
            "  layer {:.3} nm at {:.1} meV mass {:.3} me\n",
            random.between(0.3, thick),
            random.between(-400.0, 900.0),
            random.between(0.02, 1.0)
        );
    }
    // the same twice over: gaps that close, bands that share exponentially little
    let doubled = if random.next() < 0.3 { 2 } else { 1 };
    text += &layers.repeat(doubled);
    if random.next() < 0.2 {
        text += &format!("  delta {:.3} eV*nm at 0.2\n", random.between(-0.3, 0.3));
    }
    if random.next() < 0.15 {
        text += &format!("  cosine 1 = {:.2} meV\n", random.between(1.0, 300.0));
    }
    text
}

/// The rows of the table of bands.
fn rows(text: &str) -> Vec<Vec<&str>> {
    let cells = |line: &'_ str| -> usize {
        line.split("  ")
            .filter(|cell| !cell.trim().is_empty())
            .count()
    };
    text.lines()
        .skip_while(|line| !line.trim_start().starts_with("band "))
        .skip(1)
        .take_while(|line| cells(line) == 10)
        .map(|line| {
            line.split("  ")
                .map(str::trim)
                .filter(|cell| !cell.is_empty())
                .collect()
        })
        .collect()
}

fn check(solution: &Solution, text: &str) -> usize {
    let rows = rows(text);
    assert_eq!(rows.len(), solution.bands.len(), "{text}");
    let mut checked = 0;
    for ((row, band), gap) in rows.iter().zip(&solution.bands).zip(&solution.gaps) {
        let numbers: [(&str, Option<Measured>); 6] = [
            (row[1], Some(band.bottom.energy)),
            (row[3], Some(band.top.energy)),
            (row[5], Some(band.width)),
            (row[6], Some(gap.size)),
            (row[8], band.bottom.mass),
            (row[9], band.top.mass),
        ];
        for (cell, measured) in numbers {
            let Some(measured) = measured else {
                assert_eq!(cell, "–", "{text}");
                continue;
            };
            assert!(measured.uncertainty.is_finite(), "{text}");
            let unit = unit(cell);
            if let Err(why) = supported(cell, measured.value / unit, measured.uncertainty / unit) {
                panic!("{why}\n{text}");
            }
            checked += 1;
        }
    }
    checked
}

#[test]
fn every_number_of_a_random_crystal_holds_to_its_last_digit() {
    let mut random = Random(0x2545_f491_4f6c_dd1d);
    let (mut checked, mut doubtful) = (0, 0);
    for _ in 0..250 {
        let text = model(&mut random);
        let files = Files::default().with("a.cren", &text);
        let analysis = analysed(&Analyst::default(), &files, Tier::Bands);
        let file = analysis.file(std::path::Path::new("a.cren")).unwrap();
        let (section, _) = file.crystals(&[]).next().unwrap();
        let solution = section
            .solution()
            .unwrap_or_else(|| panic!("{:?} of {text}", section.unsolved()));
        let shown = show_text::file(&Locator::new(&analysis), file, &[], Paint::default());
        checked += check(solution, &shown);
        doubtful += usize::from(shown.contains('±'));
    }
    println!("{checked} numbers checked; {doubtful} crystals with a stated doubt");
    assert!(checked > 4000 && doubtful > 10, "{checked} {doubtful}");
}
