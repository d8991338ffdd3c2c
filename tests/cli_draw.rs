//! `crenate draw` and `crenate scan` as a user meets them.
#![allow(missing_docs, clippy::unwrap_used)]

mod cli;

use cli::{Folder, run, stderr, stdout};

const TERN: &str = "\
let well = 5.4 nm

material wall
  mass      0.092 me
  edge      235 meV

crystal tern
  title     \"wells & <walls>\"
  layer     well at 0 meV mass 0.067 me
  layer     2.6 nm of wall

crystal floor
  lattice   square 2 nm
  cosine    (1,0) = 0.1 eV
  cosine    (0,1) = 0.1 eV
";

fn folder() -> Folder {
    let folder = Folder::new();
    folder.write("a.cren", TERN);
    folder
}

#[test]
fn a_chain_is_drawn_with_its_potential() {
    let folder = folder();
    let output = run(&folder, &["draw", "a.cren", "-o", "pictures"]);
    assert_eq!(output.status.code(), Some(0), "{}", stderr(&output));
    assert_eq!(
        stdout(&output),
        "pictures/a-tern.svg\npictures/a-floor.svg\n"
    );
    let picture = folder.read("pictures/a-tern.svg");
    assert!(picture.starts_with("<svg") && picture.trim_end().ends_with("</svg>"));
    assert!(
        picture.contains("wells &amp; &lt;walls&gt;"),
        "the title is escaped"
    );
    for wanted in [
        "energy in meV",
        "position in nm, two cells",
        "edge",
        "centre",
    ] {
        assert!(picture.contains(wanted), "{wanted}");
    }
    // One curve of E(k) for each of the four bands, and |ψ|² only of edges that are inside the frame.
    let zone = picture.split("url(#zone)").nth(1).unwrap();
    let zone = zone.split("</g>").next().unwrap();
    assert_eq!(zone.matches("<path").count(), 4);
    assert!(!picture.contains("NaN") && !picture.contains("inf"));
}

#[test]
fn a_lattice_is_drawn_along_its_path_with_the_density_of_states() {
    let folder = folder();
    folder.write(
        "b.cren",
        "crystal tiles\n  mass 1 me\n  lattice square 0.4 nm\n  filling 2\n  bands 3\n  cosine (1,0) = 6 eV\n  cosine (0,1) = 6 eV\n",
    );
    let output = run(&folder, &["draw", "b.cren", "-o", "pictures"]);
    assert_eq!(output.status.code(), Some(0), "{}", stderr(&output));
    let picture = folder.read("pictures/b-tiles.svg");
    // One line through the path for each band asked for, the open gap below the third, the level in it, and the stops by
    // name.
    assert_eq!(picture.matches("class=\"band\"").count(), 3);
    assert_eq!(picture.matches("data-gap=").count(), 1, "{picture}");
    assert_eq!(picture.matches("class=\"fermi\"").count(), 1);
    for wanted in [
        "Γ",
        "X",
        "M",
        "states per eV and cell",
        "indirect",
        "insulator",
    ] {
        assert!(picture.contains(wanted), "{wanted}");
    }
    assert!(!picture.contains("NaN") && !picture.contains("inf"));
}

#[test]
fn where_nothing_is_drawn_the_work_failed() {
    let folder = folder();
    folder.write(
        "c.cren",
        "crystal open\n  mass 1 me\n  layer 3 nm at 2 nm\n",
    );
    let output = run(&folder, &["draw", "c.cren", "-o", "pictures"]);
    assert_eq!(output.status.code(), Some(2));
    assert!(
        stderr(&output).contains("nothing was drawn"),
        "{}",
        stderr(&output)
    );
}

#[test]
fn a_scan_has_both_its_ends() {
    let folder = folder();
    let arguments = [
        "scan", "a.cren", "--vary", "well", "--from", "4 nm", "--to", "6 nm", "--steps", "3",
    ];
    let output = run(&folder, &arguments);
    assert_eq!(output.status.code(), Some(0), "{}", stderr(&output));
    insta::assert_snapshot!(stdout(&output));
    let output = run(&folder, &[&arguments[..], &["--format", "csv"]].concat());
    let text = stdout(&output);
    let mut rows = csv::Reader::from_reader(text.as_bytes());
    assert_eq!(
        rows.headers().unwrap().iter().take(4).collect::<Vec<_>>(),
        ["varied", "value", "file", "crystal"]
    );
    let rows: Vec<csv::StringRecord> = rows.records().map(Result::unwrap).collect();
    assert_eq!(rows.len(), 3 * 4);
    let values: Vec<&str> = rows
        .iter()
        .step_by(4)
        .map(|row| row.get(1).unwrap())
        .collect();
    assert_eq!(values, ["4.0", "5.0", "6.0"]);
}

#[test]
fn a_scan_at_the_written_value_is_the_crystal_itself() {
    let folder = folder();
    let scan = run(
        &folder,
        &[
            "scan",
            "a.cren",
            "--vary",
            "wall.edge",
            "--from",
            "0.235 eV",
            "--to",
            "235 meV",
            "--steps",
            "1",
            "--format",
            "csv",
        ],
    );
    // The crystal on the square does not depend on the wall.
    let show = run(
        &folder,
        &["show", "a.cren", "--only", "tern", "--format", "csv"],
    );
    let scanned: Vec<String> = stdout(&scan)
        .lines()
        .skip(1)
        .map(|line| line.replace("wall.edge,0.235,", ""))
        .collect();
    let shown: Vec<String> = stdout(&show).lines().skip(1).map(str::to_owned).collect();
    assert_eq!(scanned, shown);
}

#[test]
fn a_scan_that_makes_no_sense_says_why() {
    let folder = folder();
    for (vary, from, why) in [
        ("wel", "4 nm", "what can vary: wall.edge, wall.mass, well"),
        ("well", "4 meV", "is not of that kind"),
        ("well", "four", "is no value"),
        ("well", "1/0 * 1 nm", "is no value"),
    ] {
        let output = run(
            &folder,
            &[
                "scan", "a.cren", "--vary", vary, "--from", from, "--to", "6 nm",
            ],
        );
        assert_eq!(output.status.code(), Some(2), "{vary} {from}");
        assert!(stderr(&output).contains(why), "{}", stderr(&output));
    }
}
