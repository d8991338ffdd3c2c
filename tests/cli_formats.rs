//! SARIF and JUnit, as other tools read them.
#![allow(clippy::indexing_slicing, clippy::unwrap_used, missing_docs)]

mod cli;

use cli::{Folder, run, stdout};
use serde_json::Value;

const TEXT: &str = "\
crystal tern
  title     \"µ\"
  mass      0.067 me
  layer     5.4 nm at 0 meV
  layer     2.6 at 235 meV
";

fn sarif(folder: &Folder) -> Value {
    let output = run(folder, &["lint", "--format", "sarif"]);
    serde_json::from_str(&stdout(&output)).unwrap()
}

#[test]
fn sarif_names_rules_places_and_fixes() {
    let folder = Folder::new();
    folder.write("a b.cren", TEXT);
    let log = sarif(&folder);
    assert_eq!(log["version"], "2.1.0");
    let run = &log["runs"][0];
    assert_eq!(run["columnKind"], "unicodeCodePoints");
    let rules = run["tool"]["driver"]["rules"].as_array().unwrap();
    assert_eq!(rules.len(), crenate::rules::all().len());
    assert!(
        rules
            .iter()
            .all(|rule| !rule["help"]["text"].as_str().unwrap().is_empty())
    );
    let result = &run["results"][0];
    assert_eq!(result["ruleId"], "missing-unit");
    let index = usize::try_from(result["ruleIndex"].as_u64().unwrap()).unwrap();
    assert_eq!(rules[index]["id"], "missing-unit");
    assert_eq!(result["level"], "error");
    let place = &result["locations"][0]["physicalLocation"];
    assert_eq!(place["artifactLocation"]["uri"], "a%20b.cren");
    let region = &place["region"];
    assert_eq!(
        (
            &region["startLine"],
            &region["startColumn"],
            &region["endLine"],
            &region["endColumn"]
        ),
        (&5.into(), &13.into(), &5.into(), &16.into())
    );
    let replacement = &result["fixes"][0]["artifactChanges"][0]["replacements"][0];
    assert!(
        replacement["insertedContent"]["text"]
            .as_str()
            .unwrap()
            .contains("nm"),
        "{replacement}"
    );
}

#[test]
fn a_fingerprint_survives_a_moved_line() {
    let folder = Folder::new();
    let prints = |text: &str| {
        folder.write("a.cren", text);
        let log = sarif(&folder);
        let results = log["runs"][0]["results"].as_array().unwrap().clone();
        assert_eq!(results.len(), 1, "{results:#?}");
        results[0]["partialFingerprints"].clone()
    };
    let before = prints(TEXT);
    let moved = prints(&format!(
        "# a line above\n\n{}",
        TEXT.replace("  layer     2.6", "\n    layer  2.6")
    ));
    assert_eq!(before, moved);
    let other = prints(&TEXT.replace("2.6", "2.7"));
    assert_ne!(before, other);
}

#[test]
fn the_same_line_twice_has_two_fingerprints() {
    let folder = Folder::new();
    folder.write("a.cren", &format!("{TEXT}  layer     2.6 at 235 meV\n"));
    let log = sarif(&folder);
    let results = log["runs"][0]["results"].as_array().unwrap();
    assert_eq!(results.len(), 2);
    assert_ne!(
        results[0]["partialFingerprints"],
        results[1]["partialFingerprints"]
    );
}

const TARGETS: &str = "\
crystal tern
  mass      0.07 me
  lattice   chain 8 nm
  cosine    1 = 50 meV ± 4 meV
  require   gap 1 >= 20 meV
  require   gap 1 >= 90 meV
  require   gap 1 >= 45 meV
  require   gap 1 >= 45 meV of
";

#[test]
fn junit_has_a_case_a_file_and_a_case_a_target() {
    let folder = Folder::new();
    folder.write("a.cren", TARGETS.rsplit_once("  require").unwrap().0);
    folder.write("b.cren", TEXT);
    let output = run(&folder, &["lint", "--format", "junit"]);
    assert_eq!(output.status.code(), Some(1));
    insta::assert_snapshot!(stdout(&output));
}
