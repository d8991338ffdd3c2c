//! Hints and actions, each applied to the text it is for.
#![allow(clippy::indexing_slicing, clippy::unwrap_used, missing_docs)]

mod report;

use std::path::Path;

use crenate::report::actions::{Action, Asked, actions};
use crenate::report::hints::hints;
use crenate::report::{Analyst, Tier};
use crenate::text::Span;
use report::{Files, analysed, marked};

const TEXT: &str = "\
let spare = 3 nm

crystal tern
  monolayer 0.283 nm
  mass      0.067 me
  layer     5.4 nm at 0 meV
  layer     9 ML ± 0.5 ML at 235 meV
  require   gap 1 >= 100 meV
  require   width 1 = 20 meV within 3 meV
  require   metal

crystal late
  lattice   chain 8 nm
  mass      1 me
  fourier   1 = 0.1 eV
";

fn whole(text: &str) -> Span {
    Span::new(0, u32::try_from(text.len()).unwrap())
}

#[test]
fn hints_stand_where_they_belong() {
    let files = Files::default().with("a.cren", TEXT);
    let analyst = Analyst::default();
    let analysis = analysed(&analyst, &files, Tier::Bands);
    let mut shown = TEXT.to_owned();
    for hint in hints(&analysis, Path::new("a.cren"), whole(TEXT))
        .iter()
        .rev()
    {
        shown.insert_str(hint.offset as usize, &format!(" «{}»", hint.label));
    }
    insta::assert_snapshot!(shown);
}

#[test]
fn hints_of_unknown_bands_are_not_shown() {
    let files = Files::default().with("a.cren", TEXT);
    let analysis = analysed(&Analyst::default(), &files, Tier::Model);
    let labels: Vec<String> = hints(&analysis, Path::new("a.cren"), whole(TEXT))
        .into_iter()
        .map(|hint| hint.label)
        .collect();
    assert_eq!(labels, ["19.08 ML"]);
}

#[test]
fn hints_keep_to_the_range_asked_for() {
    let files = Files::default().with("a.cren", TEXT);
    let analysis = analysed(&Analyst::default(), &files, Tier::Bands);
    let start = u32::try_from(TEXT.find("  layer").unwrap()).unwrap();
    let range = Span::new(start, start + 10);
    let all = hints(&analysis, Path::new("a.cren"), range);
    assert!(all.iter().all(|hint| range.touches(hint.offset)), "{all:?}");
}

/// The actions at the mark, and the text after one of them.
fn at_mark(text: &str) -> (String, Vec<Action>) {
    let (text, marks) = marked(text);
    let files = Files::default().with("a.cren", &text);
    let analyst = Analyst::default();
    let asked = Asked {
        analyst: &analyst,
        source: &files,
        analysis: &analysed(&analyst, &files, Tier::Bands),
        cancel: &|| false,
    };
    let found = actions(&asked, Path::new("a.cren"), Span::new(marks[0], marks[0]));
    (text, found)
}

#[track_caller]
fn applied(text: &str, title: &str) -> String {
    let (mut text, found) = at_mark(text);
    let titles: Vec<&str> = found.iter().map(|action| action.title.as_str()).collect();
    let action = found.iter().find(|action| action.title.starts_with(title));
    let action = action.unwrap_or_else(|| panic!("{title} is not among {titles:#?}"));
    let mut edits = action.edits.clone();
    edits.sort_by_key(|(_, span, _)| std::cmp::Reverse(span.start));
    for (_, span, new) in edits {
        text.replace_range(span.start as usize..span.end as usize, &new);
    }
    text
}

const LAYERS: &str = "\
crystal tern
  monolayer 0.283 nm
  mass      0.067 me
  layer     5.|4 nm ± 0.1 nm at 0 meV
  layer     9 ML at 235 meV
";

#[test]
fn a_layer_is_rounded_to_whole_monolayers() {
    let text = applied(LAYERS, "make it 19 ML");
    assert!(
        text.contains("  layer     19 ML ± 0.1 nm at 0 meV\n"),
        "{text}"
    );
}

#[test]
fn a_number_gets_a_name() {
    let text = applied(LAYERS, "name it");
    assert!(
        text.contains("crystal tern\n  let value_1 = 5.4 nm\n"),
        "{text}"
    );
    assert!(
        text.contains("  layer     value_1 ± 0.1 nm at 0 meV\n"),
        "{text}"
    );
}

#[test]
fn a_finding_is_waived_with_a_reason() {
    let text = applied(LAYERS, "waive part-monolayer");
    assert!(
        text.starts_with("crystal tern\n  waive part-monolayer because \"say why\"\n"),
        "{text}"
    );
    let files = Files::default().with("a.cren", &text);
    let analysis = analysed(&Analyst::default(), &files, Tier::Bands);
    assert!(
        analysis.files[0].findings.is_empty(),
        "{:#?}",
        analysis.files[0].findings
    );
}

#[test]
fn todays_gap_becomes_a_target_that_is_met() {
    let text = applied(
        &LAYERS.replace('|', "").replace("crystal", "crys|tal"),
        "add `require",
    );
    assert!(text.contains("  require gap 1 >= "), "{text}");
    let files = Files::default().with("a.cren", &text);
    let analysis = analysed(&Analyst::default(), &files, Tier::Bands);
    let section = analysis.files[0].sections.last().unwrap();
    assert_eq!(section.targets.len(), 1);
    assert!(
        analysis.files[0]
            .findings
            .iter()
            .all(|finding| !finding.rule.starts_with("target"))
    );
}

#[test]
fn a_fix_of_a_rule_comes_first_and_mends() {
    let (_, found) = at_mark(
        "crystal tern\n  mass      1 me\n  lattice   chain 0.5 nm\n  four|ier   1 = 0.1 eV\n",
    );
    assert_eq!(found[0].rule, Some("lone-component"), "{found:#?}");
    let text = applied(
        "crystal tern\n  mass      1 me\n  lattice   chain 0.5 nm\n  four|ier   1 = 0.1 eV\n",
        &found[0].title,
    );
    let files = Files::default().with("a.cren", &text);
    let analysis = analysed(&Analyst::default(), &files, Tier::Bands);
    assert!(
        analysis.files[0].findings.is_empty(),
        "{text}{:#?}",
        analysis.files[0].findings
    );
}

#[test]
fn lines_keep_their_terminators() {
    let text = applied(&LAYERS.replace('\n', "\r\n"), "name it");
    assert_eq!(text.matches('\n').count(), text.matches("\r\n").count());
}
