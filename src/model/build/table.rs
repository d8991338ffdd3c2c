//! Tables: samples of position and potential.

use std::sync::Arc;

use super::crystal::CrystalBuild;
use super::takeover::Taken;
use crate::model::evaluate::Context;
use crate::model::world::{TableFile, TableSamples, beside};
use crate::model::{Dimension, FileSource, NameSort, Table, Trouble, TroubleKind};
use crate::syntax::{Expression, Quoted, StatementKind, Word};

/// Samples that close the cell do so within this share of the period.
const CLOSED: f64 = 1e-6;
/// A last sample that is left out leaves at most this many times the widest spacing.
const WIDEST: f64 = 1.5;

impl<'w> CrystalBuild<'_, 'w> {
    /// Reads the table.
    pub(super) fn table(&mut self) {
        let Some(taken) = self.statements.single("table") else {
            return;
        };
        let StatementKind::Table {
            file,
            position_unit,
            energy_unit,
            by,
        } = &taken.statement.kind
        else {
            return;
        };
        if !self.allowed(taken, &[1], "a lattice of one dimension") {
            return;
        }
        let context = self.context(taken);
        let position_size = self.size_of(position_unit, Dimension::LENGTH, &context);
        let energy_size = self.size_of(energy_unit, Dimension::ENERGY, &context);
        let straight = self.straight(by.as_ref(), &context);
        let samples = self.samples(file, &context);
        let (Some(position_size), Some(energy_size)) = (position_size, energy_size) else {
            return;
        };
        let (Some(straight), Some(samples)) = (straight, samples) else {
            return;
        };
        let table = Table {
            place: taken.home.place(taken.statement.span),
            path: file.text.clone(),
            positions: samples
                .positions
                .iter()
                .map(|x| x * position_size)
                .collect(),
            energies: samples.energies.iter().map(|v| v * energy_size).collect(),
            straight,
            closing: None,
        };
        self.crystal.potential.table = self.checked(table, &samples, taken);
    }

    fn size_of(
        &mut self,
        unit: &'w Expression,
        wanted: Dimension,
        context: &Context<'_, 'w>,
    ) -> Option<f64> {
        let typed = self.evaluator.expression(unit, context)?;
        let typed = self.evaluator.settle(typed, unit, Some(wanted), context)?;
        typed.term.value().map(|value| value.value)
    }

    fn straight(&mut self, by: Option<&'w Word>, context: &Context<'_, 'w>) -> Option<bool> {
        let Some(word) = by else { return Some(false) };
        match word.text.as_str() {
            "line" => Some(true),
            "spline" => Some(false),
            other => {
                let what = format!("samples are joined by `line` or `spline`, not `{other}`");
                self.evaluator.bad(context.place(word.span), what)
            }
        }
    }

    fn samples(
        &mut self,
        file: &'w Quoted,
        context: &Context<'_, 'w>,
    ) -> Option<Arc<TableSamples>> {
        let place = context.place(file.span);
        self.evaluator
            .refer(place, &file.text, NameSort::File, None);
        let world = self.evaluator.world;
        let home = world.file(context.spot.file)?;
        let path = beside(&home.path, &file.text);
        let table = world.table(&path)?;
        if let Err(why) = &table.readable {
            let kind = TroubleKind::MissingFile {
                path: file.text.clone(),
                why: why.clone(),
            };
            return self.evaluator.fail(kind, place);
        }
        match table.samples(self.source, &path) {
            Ok(samples) => Some(samples),
            Err(what) => self.evaluator.fail(TroubleKind::BadTable { what }, place),
        }
    }

    /// Order, number and period of the samples.
    fn checked(&mut self, table: Table, samples: &TableSamples, taken: Taken<'w>) -> Option<Table> {
        let place = table.place;
        let least = if table.straight { 2 } else { 3 };
        if let Some(what) = disorder(samples) {
            return self.evaluator.fail(TroubleKind::BadTable { what }, place);
        }
        let Some(period) = self.one_period().map(|period| period.value) else {
            // Where the lattice is missing or broken, that is said elsewhere.
            self.evaluator.broken = true;
            return None;
        };
        let table = match self.closed(table, period) {
            Ok(table) => table,
            Err(sum) => {
                let kind = TroubleKind::OpenCell {
                    sum,
                    period,
                    parts: "samples",
                };
                let trouble = Trouble::new(kind, taken.home.place(taken.statement.span));
                self.evaluator.report(trouble);
                return None;
            }
        };
        let rows = table.positions.len();
        if rows < least {
            let what = format!("{rows} different samples are too few: at least {least} are needed");
            return self.evaluator.fail(TroubleKind::BadTable { what }, place);
        }
        Some(table)
    }

    /// The samples of one period, a last one that repeats the first apart; or what they span.
    #[expect(clippy::unused_self, reason = "reads as a step of the table")]
    fn closed(&self, mut table: Table, period: f64) -> Result<Table, f64> {
        let (Some(first), Some(last)) = (table.positions.first(), table.positions.last()) else {
            return Ok(table);
        };
        let span = last - first;
        if (span - period).abs() <= CLOSED * period {
            table.positions.pop();
            table.closing = table.energies.pop();
            return Ok(table);
        }
        let spacings = table.positions.windows(2).map(|pair| match pair {
            [a, b] => b - a,
            _ => 0.0,
        });
        let widest = spacings.fold(0.0, f64::max);
        let left = period - span;
        if left <= 0.0 || left > WIDEST * widest {
            return Err(span);
        }
        Ok(table)
    }
}

fn disorder(samples: &TableSamples) -> Option<String> {
    let rows = samples
        .positions
        .windows(2)
        .zip(samples.lines.iter().skip(1));
    for (pair, line) in rows {
        let [before, here] = pair else { continue };
        if here == before {
            return Some(format!(
                "line {line} repeats the position {here} of the line before"
            ));
        }
        if here < before {
            return Some(format!(
                "line {line} goes back from {before} to {here}; positions must ascend"
            ));
        }
    }
    None
}

impl TableFile {
    /// The samples, read when first asked for; else what is wrong with them.
    pub(super) fn samples(
        &self,
        source: &dyn FileSource,
        path: &std::path::Path,
    ) -> Result<Arc<TableSamples>, String> {
        let read = || {
            let bytes = source.bytes(path).map_err(|failure| failure.words())?;
            read_samples(&bytes).map(Arc::new)
        };
        self.samples.get_or_init(read).clone()
    }
}

/// Two columns of numbers, with or without a header line.
fn read_samples(bytes: &[u8]) -> Result<TableSamples, String> {
    let bytes = bytes.strip_prefix(b"\xef\xbb\xbf").unwrap_or(bytes);
    let mut reader = csv::ReaderBuilder::new()
        .has_headers(false)
        .flexible(true)
        .trim(csv::Trim::All)
        .comment(Some(b'#'))
        .from_reader(bytes);
    let mut samples = TableSamples::default();
    for (index, record) in reader.records().enumerate() {
        let record = record.map_err(|error| format!("it cannot be read: {error}"))?;
        let line = record
            .position()
            .map_or(index as u64 + 1, csv::Position::line);
        match (column(&record, 0), column(&record, 1)) {
            (Ok(position), Ok(energy)) => {
                samples.positions.push(position);
                samples.energies.push(energy);
                samples.lines.push(line);
            }
            // A first line that holds no numbers is the header.
            (Err(_), Err(_)) if index == 0 => {}
            (Err(what), _) | (_, Err(what)) => return Err(format!("line {line}: {what}")),
        }
    }
    if samples.positions.is_empty() {
        return Err("it has no samples".to_owned());
    }
    Ok(samples)
}

fn column(record: &csv::StringRecord, index: usize) -> Result<f64, String> {
    let text = record.get(index).unwrap_or("");
    if text.is_empty() {
        return Err(format!("column {} is empty", index + 1));
    }
    match text.parse::<f64>() {
        Ok(value) if value.is_finite() => Ok(value),
        Ok(_) => Err(format!("`{text}` is not a finite number")),
        Err(_) => Err(format!("`{text}` is no number")),
    }
}
