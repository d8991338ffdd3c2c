//! Findings that one number causes in many crystals are said once, where the number stands.

use std::sync::Arc;

use super::Finding;
use crate::model::{FileId, Place};

/// What a finding says of the number that it comes from, first among its related places.
pub(super) const NUMBER: &str = "the number comes from here";
/// What it says of a crystal that uses the number.
const USE: &str = "it is used here";

/// The findings of a file, those that come from a number in another of its sections moved to that number, each once.
pub(super) fn at_their_numbers(file: FileId, findings: Vec<Arc<Finding>>) -> Vec<Arc<Finding>> {
    let mut kept: Vec<Arc<Finding>> = Vec::with_capacity(findings.len());
    for mut finding in findings {
        let Some(number) = number_elsewhere(file, &finding) else {
            kept.push(finding);
            continue;
        };
        let user = (finding.place, USE.to_owned());
        let mut others = kept.iter_mut().rev();
        let known = others.find(|other| (other.rule, other.place) == (finding.rule, number));
        if let Some(known) = known {
            Arc::make_mut(known).related.push(user);
            continue;
        }
        let moved = Arc::make_mut(&mut finding);
        moved.place = number;
        moved.related.splice(..1, [user]);
        kept.push(finding);
    }
    kept
}

fn number_elsewhere(file: FileId, finding: &Finding) -> Option<Place> {
    let (place, said) = finding.related.first()?;
    let elsewhere = place.file == file && place.section != finding.place.section;
    (elsewhere && said == NUMBER).then_some(*place)
}
