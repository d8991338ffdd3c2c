//! Hovers on the words of the format: statements, units, constants, rules.

use super::View;
use super::card::Card;
use crate::model::{constants, unit as units_of_files};
use crate::report::rule_page;
use crate::report::units::Trade;
use crate::syntax::words;

/// What a statement is for.
pub fn statement(word: &str) -> Option<Card> {
    let found = words::STATEMENTS
        .iter()
        .find(|statement| statement.word == word)?;
    let mut card = Card::new(word);
    card.say(found.summary);
    card.sample(found.form);
    Some(card)
}

/// What a unit is.
pub fn unit(view: &View<'_>, word: &str) -> Option<Card> {
    let trade = Trade::default();
    let crystal = view.crystal();
    let recoil = crystal.and_then(|crystal| crystal.recoil.as_ref());
    if let ("Er", Some(recoil)) = (word, recoil) {
        let mut card = Card::new("Er");
        let plain = Trade {
            recoil: None,
            atoms: true,
        };
        let told = plain.tell_exact(recoil.energy.value, crate::model::Dimension::ENERGY);
        card.say(format!("recoil energy of this crystal, {told}"));
        return Some(card);
    }
    let monolayer = crystal.and_then(|crystal| crystal.monolayer.as_ref());
    if let ("ML", Some(monolayer)) = (word, monolayer) {
        let mut card = Card::new("ML");
        let told = trade.tell_exact(monolayer.value, crate::model::Dimension::LENGTH);
        card.say(format!(
            "one monolayer, {told} in this crystal unless the material has its own"
        ));
        return Some(card);
    }
    let unit = units_of_files::find(word)?;
    let mut card = Card::new(word);
    card.say(unit.about);
    let told = trade.tell_exact(unit.size, unit.dimension);
    if told != format!("1 {word}") && !told.is_empty() {
        card.say(format!("1 {word} = {told}"));
    }
    Some(card)
}

/// What a constant is.
pub fn constant(word: &str) -> Option<Card> {
    let constant = constants::constant(word)?;
    let mut card = Card::new(word);
    card.say(constant.about);
    Some(card)
}

/// What a rule finds.
pub fn rule(name: &str) -> Option<Card> {
    let rule = rule_page::find(name)?;
    let doc = rule.doc();
    let mut card = Card::new(name);
    card.say(doc.finds.trim().to_owned());
    if !doc.matters.trim().is_empty() {
        card.say(doc.matters.trim().to_owned());
    }
    if !doc.instead.text.trim().is_empty() {
        card.say("Instead:");
        card.sample(doc.instead.text.trim_end());
    }
    Some(card)
}
