//! What stands beside the pointer, as documents to be read.
#![allow(missing_docs, clippy::unwrap_used, clippy::indexing_slicing)]

mod report;

use std::path::Path;

use crenate::report::analyst::Effort;
use crenate::report::hover::{hover, waits};
use crenate::report::{Analyst, Request, Tier};
use report::{Files, analysed, marked};

const ELECTRONS: &str = "\
use \"m.cren\"

let well = 5|.4 nm

material wall
  mass      0.092 m|e
  edge      235| meV ± 5 meV

# Eight-nanometre period with a thin wall.
crystal te|rn_8
  monolayer 0.283 nm
  temperature 77 K
  filling   2
  lay|er     we|ll of ba|sin
  layer     2.|6 nm ± 0.14 nm of wall
  wai|ve     part-mono|layer because \"as grown\"
  requ|ire   gap 1 >= 120 meV
  measure   line = level 2 at centre - level 1 at centre
  require   li|ne <= 320 meV
";

const SHARED: &str = "\
# Shared.
material basin
  mass      0.067 me
  edge      0 meV
  source    \"invented\"
";

const ATOMS: &str = "\
crystal sw|ell
  carriers  bosons
  mass      87 u
  reco|il    840 nm
  lattice   chain 420 nm
  de|pth     1 = 12 E|r
  cos|ine    2 = 0.3 Er phase 0.5
";

const PLANE: &str = "\
crystal flo|or
  lattice   square 2 nm
  cosine    (1,0) = 0.1 eV
  co|sine    (0,1) = 0.1 eV
";

/// The hover at each mark, under the line it is in.
fn told(text: &str) -> String {
    let (text, marks) = marked(text);
    let files = Files::default()
        .with("a.cren", &text)
        .with("m.cren", SHARED);
    let analyst = Analyst::default();
    let analysis = analysed(&analyst, &files, Tier::Bands);
    let mut all = String::new();
    for mark in marks {
        let at = mark as usize;
        let start = text[..at].rfind('\n').map_or(0, |at| at + 1);
        let end = text[at..].find('\n').map_or(text.len(), |to| at + to);
        all += &format!(
            "{}\n{}^\n",
            &text[start..end],
            " ".repeat(text[start..at].chars().count())
        );
        match hover(&analyst, &analysis, Path::new("a.cren"), mark) {
            Some(hover) => {
                let span = &text[hover.span.start as usize..hover.span.end as usize];
                assert!(hover.span.touches(mark), "{span}");
                all += &format!("about `{span}`\n{}\n\n", hover.plain);
            }
            None => all += "nothing\n\n",
        }
    }
    all
}

#[test]
fn electrons() {
    insta::assert_snapshot!(told(ELECTRONS));
}

#[test]
fn atoms() {
    insta::assert_snapshot!(told(ATOMS));
}

#[test]
fn two_dimensions() {
    insta::assert_snapshot!(told(PLANE));
}

/// A first answer says that it is one, with fewer digits; the fine one replaces it and stays.
#[test]
fn a_first_answer_is_told_as_such() {
    let (text, marks) = marked(PLANE);
    let files = Files::default().with("a.cren", &text);
    let analyst = Analyst::default();
    let path = Path::new("a.cren");
    let request = Request {
        source: &files,
        roots: &[path.to_path_buf()],
        depth: Tier::Bands,
        cancel: &|| false,
    };
    let quick = analyst.analyse_with(&request, Effort::Quick);
    let shown = hover(&analyst, &quick, path, marks[0]).unwrap().plain;
    assert!(
        shown.contains("first values") && shown.contains("gap 1"),
        "{shown}"
    );
    assert!(waits(&quick, path, marks[1]) && !waits(&quick, path, marks[0]));
    let fine = analyst.analyse(&request);
    assert!(!waits(&fine, path, marks[1]));
    let kept = analyst.analyse_with(&request, Effort::Quick);
    let shown = hover(&analyst, &kept, path, marks[0]).unwrap().plain;
    assert!(
        !shown.contains("first values") && shown.contains("gap 1"),
        "{shown}"
    );
}

#[test]
fn no_number_is_shown_before_it_is_known() {
    let (text, marks) = marked(ELECTRONS);
    let files = Files::default()
        .with("a.cren", &text)
        .with("m.cren", SHARED);
    let analyst = Analyst::default();
    let analysis = analysed(&analyst, &files, Tier::Model);
    for mark in marks {
        if let Some(hover) = hover(&analyst, &analysis, Path::new("a.cren"), mark) {
            for word in ["gap 1", "band 1", "width 1", "margin", "Fermi"] {
                let shown = hover.plain.lines().filter(|line| line.starts_with(word));
                assert_eq!(shown.count(), 0, "{}", hover.plain);
            }
        }
    }
}
