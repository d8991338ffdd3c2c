//! Words that names may not take, and the nearest of many names.

use super::constants::constant;
use super::functions::function;
use super::unit;

/// Words that stand inside statements; no value may be called so.
pub const CLAUSE_WORDS: [&str; 18] = [
    "of", "at", "to", "by", "and", "in", "within", "between", "phase", "sigma", "width", "size",
    "radius", "angle", "angles", "axis", "mass", "like",
];

/// What already holds a name that a `let` or `measure` wants, if something does.
#[must_use]
pub fn holder_of(name: &str) -> Option<&'static str> {
    let short = name.chars().count() < 2;
    if CLAUSE_WORDS.contains(&name) || name == "because" {
        return Some("a word of the statements");
    }
    if function(name).is_some() {
        return Some("a function");
    }
    if name == "period" {
        return Some("the length of the cell");
    }
    if short {
        return None;
    }
    if constant(name).is_some() {
        return Some("a constant");
    }
    unit::is_unit(name).then_some("a unit")
}

/// The closest of `names` to `word`, where one is close: at most one change in three letters, and at most three.
pub fn nearest<'n>(word: &str, names: impl IntoIterator<Item = &'n str>) -> Option<String> {
    let length = word.chars().count();
    let limit = (length / 3).clamp(1, 3);
    names
        .into_iter()
        .filter(|name| *name != word)
        .filter(|name| name.chars().count() > 1 || length > 1)
        .map(|name| (distance(word, name), name))
        .filter(|(distance, name)| *distance <= limit && *distance < name.chars().count())
        .min()
        .map(|(_, name)| name.to_owned())
}

/// Edits between two words; a change of case alone counts as one.
fn distance(one: &str, other: &str) -> usize {
    let plain = strsim::damerau_levenshtein(one, other);
    if plain > 1 && one.to_lowercase() == other.to_lowercase() {
        return 1;
    }
    plain
}
