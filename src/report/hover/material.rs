//! Hover on a material.

use super::View;
use super::card::Card;
use crate::model::{FileId, NameSort};
use crate::syntax::{SectionId, SectionKind, StatementKind};

/// Users named at most.
const NAMED: usize = 4;

/// What a material says, where from, and which crystals of this file use it.
pub fn card(view: &View<'_>, file: FileId, section: SectionId) -> Option<Card> {
    let material = view.analysis.world.section(file, section)?;
    if material.section.kind != SectionKind::Material {
        return None;
    }
    let mut card = Card::new(format!("material {}", material.name()));
    if let Some(like) = &material.section.like {
        card.say(format!("like `{}`, but for what follows", like.text));
    }
    for statement in &material.section.statements {
        if matches!(statement.kind, StatementKind::Waive { .. }) {
            continue;
        }
        let word = material.text(statement.word);
        let whole = material.text(statement.span);
        let rest = whole.strip_prefix(word).unwrap_or(whole);
        let told: Vec<&str> = rest.split_whitespace().collect();
        card.row([word.to_owned(), told.join(" ")]);
    }
    let users = users(view, file, section);
    match users.as_slice() {
        [] => {}
        few if few.len() <= NAMED => card.say(format!("used by {}", few.join(", "))),
        many => {
            let named = many.get(..NAMED).unwrap_or(many).join(", ");
            card.say(format!("used by {named} and {} more", many.len() - NAMED));
        }
    }
    if file != view.file.file {
        card.say(format!("from {}", view.locator.file_name(file)));
    }
    Some(card)
}

fn users(view: &View<'_>, file: FileId, section: SectionId) -> Vec<String> {
    let crystals = view.file.crystals(&[]);
    let users = crystals.filter(|(analysed, _)| {
        analysed.references.iter().any(|reference| {
            let defined = reference
                .definition
                .is_some_and(|at| at.file == file && at.section == section);
            reference.sort == NameSort::Material && defined
        })
    });
    users.map(|(_, crystal)| crystal.name.clone()).collect()
}
