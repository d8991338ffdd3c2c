//! `crenate lint` as a user and a CI job meet it.
#![allow(clippy::indexing_slicing, clippy::unwrap_used, missing_docs)]

mod cli;

use std::io::Read;
use std::process::{Command, Stdio};

use cli::{Folder, crenate, run, run_with_input, stderr, stdout};
use serde_json::Value;

const GOOD: &str =
    "crystal fine\n  mass      0.07 me\n  lattice   chain 8 nm\n  cosine    1 = 50 meV\n";
const MISSED: &str = "crystal missed\n  mass      0.07 me\n  lattice   chain 8 nm\n  cosine    1 = 50 meV\n  require   gap 1 >= 90 meV\n";
const WARNED: &str = "let spare = 3 nm\n\ncrystal warned\n  mass      0.07 me\n  lattice   chain 8 nm\n  cosine    1 = 50 meV\n";

#[test]
fn the_status_tells_what_was_found() {
    let folder = Folder::new();
    folder.write("good.cren", GOOD);
    folder.write("missed.cren", MISSED);
    folder.write("warned.cren", WARNED);
    for (arguments, status) in [
        (vec!["lint", "good.cren"], 0),
        (vec!["lint", "missed.cren"], 1),
        (vec!["lint", "warned.cren"], 0),
        (vec!["lint", "--fail-on", "warning", "warned.cren"], 1),
        (vec!["lint", "--fail-on", "note", "good.cren"], 0),
        (vec!["lint", "--fail-on", "never", "missed.cren"], 0),
        (vec!["lint"], 1),
        (vec!["lint", "absent.cren"], 2),
        (vec!["lint", "good.cren", "absent.cren"], 2),
        (vec!["lint", "--fail-on", "sometimes", "good.cren"], 2),
        (vec!["lint", "--shard", "3/2", "good.cren"], 2),
        (vec!["lint", "--only", "nobody", "good.cren"], 2),
        (
            vec!["lint", "--only", "fine", "good.cren", "missed.cren"],
            0,
        ),
        (vec!["glint"], 2),
        (vec!["rules", "no-such-rule"], 2),
        (vec!["rules", "closed-gap"], 0),
    ] {
        let output = run(&folder, &arguments);
        assert_eq!(
            output.status.code(),
            Some(status),
            "{arguments:?}\n{}{}",
            stdout(&output),
            stderr(&output)
        );
    }
}

#[test]
fn what_is_wrong_with_the_work_goes_to_standard_error() {
    let folder = Folder::new();
    folder.write("good.cren", GOOD);
    folder.write_bytes("latin.cren", b"crystal caf\xe9\n");
    let output = run(&folder, &["lint", "absent.cren", "latin.cren", "good.cren"]);
    assert_eq!(output.status.code(), Some(2));
    assert!(
        stderr(&output).contains("absent.cren: there is no such file"),
        "{}",
        stderr(&output)
    );
    assert!(
        stderr(&output).contains("latin.cren: it is not text in UTF-8"),
        "{}",
        stderr(&output)
    );
    assert_eq!(stdout(&output), "1 file, nothing to report\n");
}

#[test]
fn ten_mistakes_are_ten_findings_each_at_its_place() {
    let text = "\
crystal one
  mass      0.07 mee
  lattice   chain 8
  layer     4 nm off basin
  flavour   strange
  layer     4 kg at 0 meV
  cosine    1 = nowhere
  filling   2 × 1
  layer     2 nm at 0 meV mass -1 me
  mass      0.08 me
  waive     narrow-gap
";
    let wanted = [
        (2, 18, "unknown-unit"),
        (3, 19, "missing-unit"),
        (4, 18, "unreadable-line"),
        (5, 3, "unknown-statement"),
        (6, 13, "wrong-unit"),
        (7, 17, "unknown-name"),
        (8, 15, "stray-character"),
        (9, 32, "odd-mass"),
        (10, 3, "repeated-statement"),
        (11, 3, "reasonless-waiver"),
    ];
    let folder = Folder::new();
    folder.write("wrong.cren", text);
    let output = run(&folder, &["lint", "--format", "json", "wrong.cren"]);
    let found: Vec<(u64, u64, String)> = findings(&stdout(&output))
        .iter()
        .map(|finding| {
            let number = |field: &str| finding[field].as_u64().unwrap();
            (
                number("line"),
                number("column"),
                finding["rule"].as_str().unwrap().to_owned(),
            )
        })
        .collect();
    for (line, column, rule) in wanted {
        let here = found
            .iter()
            .filter(|found| found.0 == line)
            .collect::<Vec<_>>();
        assert_eq!(
            here,
            [&(line, column, rule.to_owned())],
            "line {line} of\n{found:#?}"
        );
    }
    assert_eq!(found.len(), wanted.len(), "{found:#?}");
}

fn findings(json: &str) -> Vec<Value> {
    let document: Value = serde_json::from_str(json).unwrap();
    assert_eq!(document["schema"], "crenate-lint-1");
    document["findings"].as_array().unwrap().clone()
}

#[test]
fn json_has_the_fields_that_were_promised() {
    let folder = Folder::new();
    folder.write("warned.cren", WARNED);
    folder.write("missed.cren", MISSED);
    let output = run(&folder, &["lint", "--format", "json"]);
    let found = findings(&stdout(&output));
    assert_eq!(found.len(), 2);
    for finding in &found {
        let fields = finding.as_object().unwrap();
        for name in [
            "file",
            "line",
            "column",
            "end_line",
            "end_column",
            "rule",
            "level",
            "message",
            "help",
            "fixes",
        ] {
            assert!(fields.contains_key(name), "{name} in {finding}");
        }
    }
    assert_eq!(found[0]["file"], "missed.cren");
    assert_eq!(found[1]["rule"], "unused-name");
    assert_eq!(found[1]["column"], 5);
    assert_eq!(found[1]["end_column"], 10);
    assert!(!found[1]["fixes"].as_array().unwrap().is_empty());
}

#[test]
fn columns_count_characters() {
    let folder = Folder::new();
    folder.write(
        "wide.cren",
        "crystal τ\n  title     \"µ\" ×\n  lattice   chain 8 nm\n",
    );
    let output = run(&folder, &["lint", "--format", "json", "wide.cren"]);
    let found = findings(&stdout(&output));
    let stray = found
        .iter()
        .find(|finding| finding["rule"] == "stray-character")
        .unwrap();
    assert_eq!(stray["column"], 17);
    assert_eq!(stray["end_column"], 18);
}

#[test]
fn standard_input_is_read_under_a_dash() {
    let folder = Folder::new();
    folder.write(
        "m.cren",
        "material wall\n  mass      0.09 me\n  edge      200 meV\n",
    );
    let text = "use \"m.cren\"\n\ncrystal piped\n  layer     6 nm at 0 meV mass 0.07 me\n  layer     2 nm of wall\n";
    let output = run_with_input(&folder, &["lint", "-"], text);
    assert_eq!(
        output.status.code(),
        Some(0),
        "{}{}",
        stdout(&output),
        stderr(&output)
    );
    let output = run_with_input(&folder, &["lint", "--format", "json", "-"], MISSED);
    assert_eq!(output.status.code(), Some(1));
    assert_eq!(findings(&stdout(&output))[0]["file"], "-");
}

#[test]
fn order_does_not_depend_on_threads() {
    let folder = Folder::new();
    for number in 0..60 {
        let text = MISSED.replace("90 meV", &format!("{} meV", 60 + number));
        folder.write(&format!("deep/{:02}.cren", 59 - number), &text);
    }
    let with = |threads: &str, format: &str| {
        let mut command = crenate(&folder);
        command.env("RAYON_NUM_THREADS", threads);
        stdout(&command.args(["lint", "--format", format]).output().unwrap())
    };
    for format in ["text", "json", "sarif"] {
        let one = with("1", format);
        assert!(one.len() > 1000);
        assert_eq!(one, with("4", format), "{format}");
        assert_eq!(one, with("4", format), "{format}, again");
    }
}

#[test]
fn shards_add_up_to_the_whole() {
    let folder = Folder::new();
    for number in 0..13 {
        folder.write(&format!("{number:02}.cren"), MISSED);
    }
    let files = |arguments: &[&str]| -> Vec<String> {
        let output = run(&folder, arguments);
        let found = findings(&stdout(&output));
        found
            .iter()
            .map(|finding| finding["file"].as_str().unwrap().to_owned())
            .collect()
    };
    let whole = files(&["lint", "--format", "json"]);
    assert_eq!(whole.len(), 13);
    let mut parts = Vec::new();
    for part in ["1/5", "2/5", "3/5", "4/5", "5/5"] {
        let part = files(&["lint", "--format", "json", "--shard", part]);
        assert!(part.len() == 2 || part.len() == 3, "{part:?}");
        parts.extend(part);
    }
    parts.sort();
    assert_eq!(parts, whole);
    assert!(files(&["lint", "--format", "json", "--shard", "14/14"]).is_empty());
}

#[test]
fn a_shard_knows_who_uses_its_files() {
    let folder = Folder::new();
    let shared = "let well = 5 nm\n\ncrystal kept\n  mass 0.07 me\n  lattice chain 8 nm\n  cosine 1 = 50 meV\n";
    folder.write("a.cren", shared);
    folder.write("b.cren", "use \"a.cren\"\n\ncrystal user\n  mass 0.07 me\n  lattice chain well\n  cosine 1 = 50 meV\n");
    for arguments in [
        vec!["lint", "--format", "json"],
        vec!["lint", "--format", "json", "--shard", "1/2"],
    ] {
        let output = run(&folder, &arguments);
        assert_eq!(
            findings(&stdout(&output)),
            Vec::<Value>::new(),
            "{arguments:?}"
        );
    }
}

#[test]
fn folders_are_walked_with_care() {
    let folder = Folder::new();
    folder.write("seen.cren", MISSED);
    folder.write("seen.txt", MISSED);
    folder.write("built/hidden.cren", MISSED);
    folder.write(".gitignore", "built/\n");
    folder.write(".secret/hidden.cren", MISSED);
    #[cfg(unix)]
    std::os::unix::fs::symlink(folder.path("seen.cren"), folder.path("link.cren")).unwrap();
    let output = run(&folder, &["lint", "--format", "json", "."]);
    let found = findings(&stdout(&output));
    assert_eq!(found.len(), 1, "{found:#?}");
    assert_eq!(found[0]["file"], "seen.cren");
    let output = run(
        &folder,
        &[
            "lint",
            "seen.cren",
            "./seen.cren",
            "built/../seen.cren",
            ".",
        ],
    );
    assert!(
        stdout(&output).ends_with("1 file: 1 error\n"),
        "{}",
        stdout(&output)
    );
}

#[test]
fn a_pipe_gets_no_colour_and_no_bar() {
    let folder = Folder::new();
    for number in 0..40 {
        folder.write(&format!("{number}.cren"), MISSED);
    }
    for colour in [None, Some("1")] {
        let mut command = crenate(&folder);
        if let Some(value) = colour {
            command.env("NO_COLOR", value);
        }
        let output = command.arg("lint").output().unwrap();
        assert!(!stdout(&output).contains('\u{1b}'));
        assert_eq!(stderr(&output), "");
    }
}

#[test]
fn a_file_cannot_steer_the_terminal() {
    let folder = Folder::new();
    folder.write(
        "bad.cren",
        "crystal bad\n  title \"\u{1b}[31m red\"\r  \u{202e}lattice\n",
    );
    let text = stdout(&run(&folder, &["lint", "bad.cren"]));
    assert!(text.contains("error"), "{text}");
    for wanted_not in ['\u{1b}', '\u{202e}', '\r'] {
        assert!(!text.contains(wanted_not), "{wanted_not:?} in {text:?}");
    }
}

#[test]
fn a_reader_that_leaves_early_is_no_failure() {
    let folder = Folder::new();
    for number in 0..400 {
        folder.write(&format!("{number}.cren"), MISSED);
    }
    let mut child: std::process::Child = Command::new(env!("CARGO_BIN_EXE_crenate"))
        .current_dir(folder.root())
        .arg("lint")
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    let mut first = [0; 64];
    let mut pipe = child.stdout.take().unwrap();
    pipe.read_exact(&mut first).unwrap();
    drop(pipe);
    let mut said = String::new();
    child
        .stderr
        .take()
        .unwrap()
        .read_to_string(&mut said)
        .unwrap();
    let status = child.wait().unwrap();
    assert_eq!(said, "");
    assert!(status.code().is_some_and(|code| code < 2), "{status}");
}

#[test]
fn findings_read_well() {
    let folder = Folder::new();
    folder.write(
        "tern.cren",
        "let spare = 3 nm\n\nmaterial wall\n  mass      0.092 me\n  edge      235 meV ± 5 meV\n\ncrystal tern\n  mass      0.067 me\n  mass      0.07 me\n  layer     5.4 nm at 0 meV\n  layer     2.6 nm ± 0.14 nm of wal\n  layer     2.6 of wall\n  require   gap 1 >= 160 meV\n\ncrystal late\n  layer     5.4 nm at 0 meV mass 0.07 me\n  layer     2.6 nm ± 0.14 nm of wall\n  require   gap 1 >= 130 meV\n  require   gap 1 >= 125 meV\n  require   gap 1 \\\n     >= 124.9 meV\n",
    );
    insta::assert_snapshot!(stdout(&run(&folder, &["lint", "tern.cren"])));
}

#[test]
fn rules_are_listed_and_explained() {
    let folder = Folder::new();
    let list = stdout(&run(&folder, &["rules"]));
    let listed = list
        .lines()
        .filter(|line| line.starts_with("  ") && !line.starts_with("   "));
    assert_eq!(listed.count(), crenate::rules::all().len(), "{list}");
    assert!(
        list.lines().all(|line| line.chars().count() <= 100),
        "{list}"
    );
    insta::assert_snapshot!(stdout(&run(&folder, &["rules", "closed-gap"])));
    let wrong = run(&folder, &["rules", "close-gap"]);
    assert!(
        stderr(&wrong).contains("did you mean `closed-gap`?"),
        "{}",
        stderr(&wrong)
    );
}

#[test]
fn the_examples_are_clean() {
    let examples = concat!(env!("CARGO_MANIFEST_DIR"), "/examples");
    let output = Command::new(env!("CARGO_BIN_EXE_crenate"))
        .args(["lint", "--fail-on", "note", examples])
        .output()
        .unwrap();
    assert_eq!(output.status.code(), Some(0), "{}", stdout(&output));
}

#[test]
fn a_slip_in_a_named_value_is_said_once_where_it_stands() {
    let folder = Folder::new();
    let crystal = |name: &str| {
        format!(
            "crystal {name}\n  carriers  bosons\n  mass      87 u\n  recoil    light\n  lattice   chain light/2\n  depth     1 = 4 Er\n"
        )
    };
    let text = format!(
        "let light = 840 pm\n\n{}\n{}",
        crystal("one"),
        crystal("two")
    );
    folder.write("light.cren", &text);
    for only in [vec![], vec!["--only", "two"]] {
        let arguments = [vec!["lint", "--format", "json"], only, vec!["light.cren"]].concat();
        let output = run(&folder, &arguments);
        let findings = findings(&stdout(&output));
        assert_eq!(findings.len(), 1, "{findings:#?}");
        assert_eq!(findings[0]["rule"], "unit-slip");
        assert_eq!(findings[0]["line"], 1);
        assert_eq!(findings[0]["related"].as_array().unwrap().len(), 2);
    }
}

#[test]
fn of_a_very_long_line_only_what_is_near_the_finding_is_shown() {
    let folder = Folder::new();
    let sum = vec!["1 nm"; 3000].join(" + ");
    let text = format!(
        "let a = {sum}\nlet b = 7 nm + {}3 mn + {}\n",
        "0 nm + ".repeat(60),
        "0 nm + ".repeat(60) + "1 nm"
    );
    folder.write("long.cren", &text);
    let output = run(&folder, &["lint", "long.cren"]);
    let told = stdout(&output);
    assert_eq!(output.status.code(), Some(1), "{told}");
    assert!(
        told.contains("long.cren:1:9 error unreadable-line"),
        "{told}"
    );
    assert!(told.contains("too long, or nests too deep"), "{told}");
    assert!(told.contains("unknown-unit"), "{told}");
    assert!(
        told.chars().count() < 3000,
        "{} characters",
        told.chars().count()
    );
    // The mark still stands under the word.
    let lines: Vec<&str> = told.lines().collect();
    let line = lines.iter().position(|line| line.contains("3 mn")).unwrap();
    let at = lines[line].chars().position(|c| c == 'm').map(|_| {
        let byte = lines[line].find("mn").unwrap();
        lines[line][..byte].chars().count()
    });
    let mark = lines[line + 1].chars().position(|c| c == '─');
    assert_eq!(at, mark, "{told}");
}

#[test]
fn a_star_is_offered_only_where_the_statement_has_one() {
    let folder = Folder::new();
    for (wave, offered) in [
        ("cosine (1, 0) = 1 meV", true),
        ("cosine (1, 0) = 1 meV phase 30 deg", false),
        ("fourier (1, 0) = 1 meV\n  fourier (-1, 0) = 1 meV", false),
    ] {
        let text = format!("crystal a\n  mass 0.1 me\n  lattice square 5 nm\n  {wave}\n");
        folder.write("a.cren", &text);
        let told = stdout(&run(&folder, &["lint", "a.cren"]));
        assert!(
            told.contains("the lattice makes it equal to (0, 1)"),
            "{told}"
        );
        assert_eq!(told.contains("`star` writes them all"), offered, "{told}");
    }
}
