//! `lint --format junit`: a suite a file; in it one case for the file and one for each target.

use quick_junit::{NonSuccessKind, Report, TestCase, TestCaseStatus, TestSuite};

use super::analysis::{FileAnalysis, SectionAnalysis};
use super::locate::Locator;
use super::show_text;
use super::units::Trade;
use super::words;
use crate::bands::{Assessment, TargetState};
use crate::model::Crystal;
use crate::rules::{Finding, Level};

/// The report as XML.
///
/// # Errors
/// When the XML cannot be written.
pub fn document(suites: Vec<TestSuite>) -> Result<String, quick_junit::SerializeError> {
    let mut report = Report::new("crenate");
    report.add_test_suites(suites);
    report.to_string()
}

/// The suite of one file; findings at or above `fail_on` (never, where it is `None`) fail a case.
#[must_use]
pub fn suite(
    locator: &Locator<'_>,
    analysed: &FileAnalysis,
    findings: &[&Finding],
    fail_on: Option<Level>,
    only: &[String],
) -> TestSuite {
    let file = super::locate::shown_path(&analysed.path);
    let mut suite = TestSuite::new(file.clone());
    suite.add_test_case(file_case(locator, &file, findings, fail_on));
    for (section, crystal) in analysed.crystals(only) {
        for target in &section.targets {
            suite.add_test_case(target_case(
                locator,
                (section, crystal),
                target,
                findings,
                fail_on,
            ));
        }
    }
    suite
}

fn fails(finding: &Finding, fail_on: Option<Level>) -> bool {
    fail_on.is_some_and(|limit| finding.level >= limit)
}

/// Whether a finding is about the outcome of a target, which has a case of its own.
fn about_target(finding: &Finding) -> bool {
    finding.rule.starts_with("target-")
}

fn file_case(
    locator: &Locator<'_>,
    file: &str,
    findings: &[&Finding],
    fail_on: Option<Level>,
) -> TestCase {
    let own: Vec<&&Finding> = findings
        .iter()
        .filter(|finding| !about_target(finding))
        .collect();
    let lines: Vec<String> = own.iter().map(|finding| line(locator, finding)).collect();
    let failing = own.iter().find(|finding| fails(finding, fail_on));
    let mut status = match failing {
        Some(_) => TestCaseStatus::non_success(NonSuccessKind::Failure),
        None => TestCaseStatus::success(),
    };
    if let Some(first) = failing {
        status.set_message(first.message.clone());
        status.set_type(first.rule);
        status.set_description(lines.join("\n"));
    }
    let mut case = TestCase::new("file", status);
    case.set_classname(file);
    if failing.is_none() && !lines.is_empty() {
        case.set_system_out(lines.join("\n"));
    }
    case
}

fn line(locator: &Locator<'_>, finding: &Finding) -> String {
    let (line, column) = locator
        .position(&finding.place)
        .map_or((1, 1), |at| (at.line, at.column));
    let file = locator.file_name(finding.place.file);
    let level = words::level(finding.level);
    format!(
        "{file}:{line}:{column}: {level}: {} [{}]",
        finding.message, finding.rule
    )
}

fn target_case(
    locator: &Locator<'_>,
    (_, crystal): (&SectionAnalysis, &Crystal),
    target: &Assessment,
    findings: &[&Finding],
    fail_on: Option<Level>,
) -> TestCase {
    let told = show_text::outcome(locator, crystal, target, &Trade::of(crystal));
    let found = findings.iter().find(|finding| {
        about_target(finding)
            && finding.place.section == target.place.section
            && target.place.span.touches(finding.place.span.start)
    });
    let mut status = match (target.state, found) {
        (_, Some(finding)) if fails(finding, fail_on) => {
            TestCaseStatus::non_success(NonSuccessKind::Failure)
        }
        (TargetState::Untestable, _) => TestCaseStatus::skipped(),
        (TargetState::Missed, None) => TestCaseStatus::skipped(),
        _ => TestCaseStatus::success(),
    };
    let state = words::target_state_spoken(target.state);
    let waived = target.state == TargetState::Missed && found.is_none();
    let message = match waived {
        true => format!("{state}, waived: {told}"),
        false => format!("{state}: {told}"),
    };
    let passed = matches!(status, TestCaseStatus::Success { .. });
    if !passed {
        status.set_message(message.clone());
    }
    let mut case = TestCase::new(format!("{}: {}", crystal.name, target.text), status);
    case.set_classname(super::locate::shown_path(
        locator
            .analysis()
            .path(target.place.file)
            .unwrap_or(std::path::Path::new("")),
    ));
    if passed {
        case.set_system_out(message);
    }
    case
}
