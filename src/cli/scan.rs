//! `crenate scan PATH --vary NAME --from V --to V --steps N`

use std::path::PathBuf;

use clap::{Args, ValueEnum};

use super::desk::Desk;
use super::{Status, output};
use crate::report::scan::{self, Range, Scan};
use crate::report::{Tier, locate};

#[derive(Debug, Args)]
pub struct Arguments {
    /// The file; `-` reads standard input.
    path: PathBuf,
    /// The value to vary: a `let`, or a material's field as `wall.edge`.
    #[arg(long, value_name = "NAME")]
    vary: String,
    /// The first value, as a file would write it: "5 nm".
    #[arg(long, value_name = "VALUE", allow_hyphen_values = true)]
    from: String,
    /// The last value.
    #[arg(long, value_name = "VALUE", allow_hyphen_values = true)]
    to: String,
    /// How many values, both ends included.
    #[arg(long, value_name = "N", default_value_t = 11)]
    steps: usize,
    /// How to show them.
    #[arg(long, value_enum, default_value_t = Format::Text)]
    format: Format,
    /// Scan only the crystal of this name; may be given several times.
    #[arg(long, value_name = "NAME")]
    only: Vec<String>,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
enum Format {
    /// A table for people.
    Text,
    /// One object, energies in eV.
    Json,
    /// A row a band and value.
    Csv,
}

/// Shows the bands against one named value.
pub fn run(arguments: &Arguments) -> Status {
    let desk = Desk::of(std::slice::from_ref(&arguments.path));
    match scanned(arguments, &desk) {
        Ok(text) => output::written(output::result(&text), Status::Clean),
        Err(why) => {
            output::message(&format!("{}: {why}", arguments.path.display()));
            Status::Failed
        }
    }
}

/// The table of a scan; why there is none, in words.
fn scanned(arguments: &Arguments, desk: &Desk) -> Result<String, String> {
    let (analysis, file) = desk.analysed(&arguments.path, Tier::Model, &|| false)?;
    let range = Range {
        name: &arguments.vary,
        from: &arguments.from,
        to: &arguments.to,
        steps: arguments.steps,
    };
    let scans = scan::scan(
        &desk.analyst,
        &desk.disk,
        &analysis,
        &file,
        &arguments.only,
        &range,
    )?;
    Ok(told(arguments, &scans, &locate::shown_path(&file.path)))
}

fn told(arguments: &Arguments, scans: &[Scan], file: &str) -> String {
    match arguments.format {
        Format::Text => {
            let tables: Vec<String> = scans
                .iter()
                .map(|scan| scan.text(output::paint()))
                .collect();
            tables.join("\n")
        }
        Format::Csv => {
            let rows: String = scans.iter().map(|scan| scan.csv(file)).collect();
            scan::csv_header() + &rows
        }
        Format::Json => {
            let crystals: Vec<serde_json::Value> =
                scans.iter().map(|scan| scan.json(file)).collect();
            let document = serde_json::json!({ "schema": "crenate-scan-1", "crystals": crystals });
            serde_json::to_string_pretty(&document).unwrap_or_default() + "\n"
        }
    }
}
