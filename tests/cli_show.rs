//! `crenate show` as a user and a script meet it.
#![allow(clippy::indexing_slicing, clippy::unwrap_used, missing_docs)]

mod cli;

use cli::{Folder, run, stderr, stdout};
use serde_json::{Map, Value};

const TERN: &str = "\
material basin
  mass      0.067 me
  edge      0 meV

material wall
  mass      0.092 me
  edge      235 meV ± 5 meV

# Eight-nanometre period with a thin wall: one narrow miniband.
crystal tern_8
  temperature 77 K
  filling   2
  layer     5.4 nm of basin
  layer     2.6 nm ± 0.14 nm of wall
  require   gap 1 >= 60 meV
  require   gap 1 >= 126 meV
  require   width 1 = 90 meV within 8 meV
  require   semiconductor
  require   gap 1 direct
  measure   line = level 2 at centre - level 1 at centre
  require   line <= 320 meV
  waive     target-missed because \"wished for\"

crystal floor
  lattice   square 2 nm
  cosine    (1,0) = 0.1 eV
  cosine    (0,1) = 0.1 eV

crystal swell
  carriers  bosons
  mass      87 u
  recoil    840 nm
  lattice   chain 420 nm
  depth     1 = 120 Er
  require   fermi >= 0 Er
";

fn folder() -> Folder {
    let folder = Folder::new();
    folder.write("tern.cren", TERN);
    folder
}

fn shown(folder: &Folder) -> Value {
    let output = run(folder, &["show", "--format", "json", "tern.cren"]);
    serde_json::from_str(&stdout(&output)).unwrap()
}

fn fields(value: &Value) -> &Map<String, Value> {
    value.as_object().unwrap()
}

#[track_caller]
fn has(value: &Value, names: &[&str]) {
    for name in names {
        assert!(fields(value).contains_key(*name), "no {name} in {value}");
    }
}

#[test]
fn json_has_every_field_that_was_promised() {
    let document = shown(&folder());
    assert_eq!(document["schema"], "crenate-show-1");
    has(&document, &["crystals", "findings"]);
    let crystals = document["crystals"].as_array().unwrap();
    assert_eq!(crystals.len(), 3);
    for crystal in crystals {
        has(
            crystal,
            &[
                "file",
                "name",
                "line",
                "dimension",
                "primitive_cell_nm",
                "er_eV",
                "temperature_K",
                "potential_eV",
                "bands",
                "gaps",
                "filling",
                "fermi_eV",
                "fermi_uncertainty_eV",
                "class",
                "measures",
                "targets",
            ],
        );
    }
    let tern = &crystals[0];
    has(&tern["potential_eV"], &["lowest", "mean", "highest"]);
    for band in tern["bands"].as_array().unwrap() {
        has(
            band,
            &[
                "band",
                "bottom_eV",
                "top_eV",
                "width_eV",
                "bottom_k",
                "bottom_point",
                "top_k",
                "top_point",
                "mass_bottom_me",
                "mass_top_me",
                "mass_uncertainty_me",
                "uncertainty_eV",
                "width_uncertainty_eV",
            ],
        );
    }
    for gap in tern["gaps"].as_array().unwrap() {
        has(gap, &["above_band", "size_eV", "uncertainty_eV", "kind"]);
        assert!(
            ["direct", "indirect", "closed", "overlap"].contains(&gap["kind"].as_str().unwrap())
        );
    }
    for measure in tern["measures"].as_array().unwrap() {
        has(measure, &["name", "value", "unit", "uncertainty"]);
    }
    for target in tern["targets"].as_array().unwrap() {
        has(
            target,
            &[
                "line",
                "text",
                "state",
                "reason",
                "value",
                "uncertainty",
                "unit",
                "worst",
                "driver",
            ],
        );
    }
}

#[test]
fn what_does_not_exist_is_null() {
    let document = shown(&folder());
    let [tern, floor, swell] = [0, 1, 2].map(|index| document["crystals"][index].clone());
    assert_eq!(tern["er_eV"], Value::Null);
    assert_eq!(tern["temperature_K"], 77.0);
    assert_eq!(tern["primitive_cell_nm"], serde_json::json!([[8.0]]));
    assert_eq!(tern["class"], "semiconductor");
    assert_eq!(swell["class"], Value::Null);
    assert_eq!(swell["fermi_eV"], Value::Null);
    assert!(swell["er_eV"].as_f64().unwrap() > 1e-12);
    assert_eq!(floor["dimension"], 2);
    // Two crossed cosines of 0.1 eV reach from twice that below their mean to twice that above.
    assert_eq!(floor["potential_eV"]["lowest"], -0.2);
    assert_eq!(floor["bands"].as_array().unwrap().len(), 4);
    assert_eq!(floor["bands"][0]["bottom_point"], "centre");
    assert_eq!(floor["bands"][0]["bottom_k"], serde_json::json!([0.0, 0.0]));
    assert_eq!(floor["bands"][0]["top_point"], "M");
    assert_eq!(floor["unsolved"], Value::Null);
}

#[test]
fn bands_and_gaps_agree_with_each_other() {
    let document = shown(&folder());
    for index in [0, 1, 2] {
        let crystal = &document["crystals"][index];
        let bands = crystal["bands"].as_array().unwrap();
        let gaps = crystal["gaps"].as_array().unwrap();
        assert_eq!(bands.len(), gaps.len());
        let number = |value: &Value| value.as_f64().unwrap();
        for (band, gap) in bands.iter().zip(gaps) {
            let top = number(&band["top_eV"]);
            let width = number(&band["width_eV"]);
            let slack = 4.0 * number(&band["uncertainty_eV"]) + 1e-15 * top.abs();
            assert!(width > 0.0);
            assert!(
                (top - number(&band["bottom_eV"]) - width).abs() <= slack,
                "{band}"
            );
            let next = bands.get(gap["above_band"].as_u64().unwrap() as usize);
            if let Some(next) = next {
                let size = number(&next["bottom_eV"]) - top;
                assert!(
                    (size - number(&gap["size_eV"])).abs()
                        <= slack + 4.0 * number(&next["uncertainty_eV"]),
                    "{gap}"
                );
            }
        }
        let narrow = &bands[0];
        let share = number(&narrow["width_uncertainty_eV"]) / number(&narrow["width_eV"]);
        assert!(share < 1e-6, "the width keeps its own digits: {share}");
    }
}

#[test]
fn targets_tell_state_worst_case_and_driver() {
    let document = shown(&folder());
    let targets = document["crystals"][0]["targets"].as_array().unwrap();
    let states: Vec<&str> = targets
        .iter()
        .map(|target| target["state"].as_str().unwrap())
        .collect();
    assert_eq!(states, ["met", "at-risk", "missed", "met", "met", "met"]);
    let risky = &targets[1];
    assert_eq!(risky["line"], 16);
    assert_eq!(risky["text"], "gap 1 >= 126 meV");
    assert_eq!(risky["unit"], "eV");
    assert!(risky["worst"].as_f64().unwrap() < 0.126);
    assert_eq!(risky["driver"], "line 14: 2.6 nm ± 0.14 nm");
    let untestable = &document["crystals"][2]["targets"][0];
    assert_eq!(untestable["state"], "untestable");
    assert_eq!(untestable["value"], Value::Null);
    assert!(!untestable["reason"].as_str().unwrap().is_empty());
}

#[test]
fn findings_stand_beside_the_numbers() {
    let folder = folder();
    let output = run(&folder, &["show", "--format", "json", "tern.cren"]);
    assert_eq!(output.status.code(), Some(0), "{}", stderr(&output));
    let rules: Vec<Value> = shown(&folder)["findings"]
        .as_array()
        .unwrap()
        .iter()
        .map(|finding| finding["rule"].clone())
        .collect();
    assert!(rules.contains(&Value::from("target-at-risk")), "{rules:?}");
}

#[test]
fn csv_has_a_row_a_band() {
    let folder = folder();
    folder.write("a, b.cren", "crystal plain\n  mass      1 me\n  lattice   chain 0.5 nm\n  cosine    1 = 1 eV\n  bands     2\n");
    let output = run(
        &folder,
        &["show", "--format", "csv", "a, b.cren", "tern.cren"],
    );
    let text = stdout(&output);
    let mut rows = csv::Reader::from_reader(text.as_bytes());
    let wanted = [
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
    assert_eq!(rows.headers().unwrap().iter().collect::<Vec<_>>(), wanted);
    let rows: Vec<csv::StringRecord> = rows.records().map(Result::unwrap).collect();
    assert_eq!(&rows[0][0], "a, b.cren");
    let of = |name: &str| rows.iter().filter(|row| &row[1] == name).count();
    assert_eq!((of("plain"), of("floor"), of("swell")), (2, 4, 4));
    assert!(rows.iter().all(|row| row[3].parse::<f64>().is_ok()));
}

#[test]
fn one_crystal_can_be_picked() {
    let folder = folder();
    let output = run(&folder, &["show", "--only", "swell", "tern.cren"]);
    assert!(
        stdout(&output).starts_with("swell  tern.cren:29\n"),
        "{}",
        stdout(&output)
    );
    assert!(!stdout(&output).contains("tern_8"));
    let output = run(&folder, &["show", "--only", "nobody", "tern.cren"]);
    assert_eq!(output.status.code(), Some(2));
    assert_eq!(run(&folder, &["show"]).status.code(), Some(2));
}

#[test]
fn tables_read_well() {
    insta::assert_snapshot!(stdout(&run(&folder(), &["show", "tern.cren"])));
}

/// What is shown of a crystal of which a line cannot be read would be the numbers of another crystal.
#[test]
fn measures_of_a_lattice_with_errors_have_no_value() {
    let folder = Folder::new();
    folder.write(
        "floor.cren",
        "crystal floor\n  mass 1 me\n  lattice square 2 nm\n  cosine (1,0) = 0.1 eV\n  cosine (0,1) 0.1 eV\n  \
         measure corner = level 1 at M\n  measure hop = hopping 1 by (1,0)\n  require level 1 at M < 1 eV\n",
    );
    let output = run(&folder, &["show", "floor.cren"]);
    let text = stdout(&output);
    assert_eq!(
        text.matches("no value: the model has errors").count(),
        2,
        "{text}"
    );
    assert!(text.contains("untestable"), "{text}");
}
