//! Hovers on a crystal's heading, its layers, its recoil and its temperature.

use std::collections::BTreeMap;

use super::View;
use super::card::Card;
use crate::bands::{Gap, GapKind, MeasureValue, Measured, Solution};
use crate::model::constants::SPEED_OF_LIGHT;
use crate::model::{Crystal, Dimension, Layer, Place};
use crate::report::analysis::SectionAnalysis;
use crate::report::show_text;
use crate::report::units::{self, BOLTZMANN, ELECTRONVOLT, PLANCK, Trade, exact};
use crate::report::{drawing, words};
use crate::syntax::Statement;

/// Gaps told of.
const GAPS: usize = 3;
/// Bands told of.
const BANDS: usize = 2;
/// Light between these energies (in eV) is told by its wavelength.
const OPTICAL: (f64, f64) = (1e-3, 10.0);

/// The crystal whose section this is.
pub fn card(view: &View<'_>) -> Option<Card> {
    told(view, view.section)
}

/// Another crystal, where its name is used.
pub fn other(view: &View<'_>, definition: Place) -> Option<Card> {
    let section = view.analysis.section(definition.file, definition.section);
    match section {
        Some(section) => told(view, section),
        None => {
            let text = view
                .analysis
                .world
                .section(definition.file, definition.section)?;
            let mut card = Card::new(text.name());
            card.say(format!(
                "crystal in {}",
                view.locator.file_name(definition.file)
            ));
            Some(card)
        }
    }
}

fn told(view: &View<'_>, section: &SectionAnalysis) -> Option<Card> {
    let crystal = section.crystal.as_deref()?;
    let trade = Trade::of(crystal);
    let mut card = Card::new(&crystal.name);
    if crystal.title != crystal.name && !crystal.title.is_empty() {
        card.say(crystal.title.clone());
    }
    if let Some(description) = description(view, crystal.place) {
        card.say(description);
    }
    let mut about = vec![show_text::cell(crystal, &trade)];
    if let Some(recoil) = &crystal.recoil {
        let plain = Trade {
            recoil: None,
            ..trade
        };
        about.push(format!(
            "1 Er = {}",
            plain.tell_exact(recoil.energy.value, Dimension::ENERGY)
        ));
    }
    card.say(about.join(" · "));
    match (section.solution(), section.unsolved()) {
        (Some(solution), _) => numbers(section, crystal, solution, &mut card),
        (None, Some(why)) => card.say(words::unsolved(why)),
        (None, None) => {}
    }
    Some(card)
}

/// The comment above a crystal's heading.
fn description(view: &View<'_>, heading: Place) -> Option<String> {
    let tree = view.analysis.tree(heading.file)?;
    let index = tree
        .entries
        .iter()
        .position(|entry| entry.id == heading.section)?;
    let text = tree.description(index);
    let words: Vec<&str> = text.split_whitespace().collect();
    (!words.is_empty()).then(|| words.join(" "))
}

fn numbers(section: &SectionAnalysis, crystal: &Crystal, solution: &Solution, card: &mut Card) {
    let trade = Trade::of(crystal);
    let temperature = crystal.temperature.as_ref().map(|dual| dual.value);
    if !solution.fine {
        card.say("first values; finer ones are being worked out".to_owned());
    }
    for (index, gap) in solution.gaps.iter().take(GAPS).enumerate() {
        let told = gap_told(gap, &trade, temperature);
        card.row([format!("gap {}", index + 1), told]);
    }
    for (index, band) in solution.bands.iter().take(BANDS).enumerate() {
        let scale = show_text::edge_scale(solution, &trade);
        let bottom = units::tell_in(band.bottom.energy, &scale);
        let top = units::tell_in(band.top.energy, &scale);
        let width = trade.tell_energy(band.width);
        let masses = [&band.bottom, &band.top].map(|edge| show_text::mass(edge, &trade));
        card.row([
            format!("band {}", index + 1),
            format!(
                "{bottom} to {top}, width {width}, mass {} and {}",
                masses[0], masses[1]
            ),
        ]);
    }
    for measure in &section.measures {
        card.row([measure.name.clone(), measure_told(measure, &trade)]);
    }
    if let Some(line) = show_text::filling_line(crystal, solution, &trade) {
        card.row(["filling".to_owned(), line]);
    }
    let potential = show_text::potential(solution, &trade);
    let potential = potential.strip_prefix("potential ").unwrap_or(&potential);
    card.row(["potential".to_owned(), potential.to_owned()]);
    if !section.targets.is_empty() {
        card.row(["targets".to_owned(), targets(section)]);
    }
    card.picture(drawing::of_crystal(crystal, solution));
}

/// A gap with its kind, the light it absorbs, the kT it holds.
fn gap_told(gap: &Gap, trade: &Trade, temperature: Option<f64>) -> String {
    let mut parts = vec![format!(
        "{}, {}",
        energy_told(gap.size, trade),
        words::gap_kind(gap.kind)
    )];
    let open = matches!(gap.kind, GapKind::Direct | GapKind::Indirect);
    let thermal = temperature
        .map(|kelvin| kelvin * BOLTZMANN)
        .filter(|energy| *energy > 0.0);
    if let (true, Some(thermal)) = (open, thermal) {
        parts.push(format!(
            "{} kT",
            units::digits(gap.size.value / thermal, gap.size.uncertainty / thermal)
        ));
    }
    parts.join(", ")
}

/// A measure's value, as light where it is a transition.
pub fn measure_told(measure: &MeasureValue, trade: &Trade) -> String {
    match (&measure.value, measure.dimension) {
        (Ok(value), Dimension::ENERGY) => energy_told(*value, trade),
        _ => show_text::measured(measure, trade),
    }
}

/// An energy in the trade's unit and in the one beside it: µm of light for solids, frequency for atoms.
pub fn energy_told(energy: Measured, trade: &Trade) -> String {
    let told = trade.tell_energy(energy);
    match beside(energy, trade) {
        Some(other) => format!("{told} ({other})"),
        None => told,
    }
}

fn beside(energy: Measured, trade: &Trade) -> Option<String> {
    let size = energy.value.abs();
    if size <= energy.uncertainty {
        return None;
    }
    if trade.recoil.is_some() {
        let plain = Trade {
            recoil: None,
            ..*trade
        };
        return Some(plain.tell_energy(energy));
    }
    let optical = size > OPTICAL.0 * ELECTRONVOLT && size < OPTICAL.1 * ELECTRONVOLT;
    (optical && !trade.atoms).then(|| {
        let wavelength = PLANCK * SPEED_OF_LIGHT / size;
        let uncertainty = wavelength * energy.uncertainty / size;
        let value = Measured {
            value: wavelength / 1e-6,
            uncertainty: uncertainty / 1e-6,
        };
        format!("{} µm", units::digits(value.value, value.uncertainty))
    })
}

fn targets(section: &SectionAnalysis) -> String {
    let mut counts: BTreeMap<&str, usize> = BTreeMap::new();
    for target in &section.targets {
        *counts
            .entry(words::target_state_spoken(target.state))
            .or_default() += 1;
    }
    let parts: Vec<String> = counts
        .iter()
        .map(|(state, count)| format!("{count} {state}"))
        .collect();
    parts.join(", ")
}

/// The layers that a `layer` or `stack` statement adds.
pub fn layer(view: &View<'_>, statement: &Statement) -> Option<Card> {
    let crystal = view.crystal()?;
    let trade = view.trade();
    let mut layers: Vec<&Layer> = Vec::new();
    for layer in &crystal.potential.layers {
        let inside = view.holds(&layer.place)
            && statement.span.start <= layer.place.span.start
            && layer.place.span.end <= statement.span.end;
        if inside && !layers.iter().any(|known| known.place == layer.place) {
            layers.push(layer);
        }
    }
    let touched: Vec<&&Layer> = layers
        .iter()
        .filter(|layer| layer.place.span.touches(view.at))
        .collect();
    let chosen = match touched.as_slice() {
        [one] => vec![**one],
        _ => layers,
    };
    if chosen.is_empty() {
        return None;
    }
    let mut card = Card::new(statement.word.of(&view.entry.section.text));
    for layer in chosen {
        describe(layer, &trade, &mut card);
    }
    Some(card)
}

fn describe(layer: &Layer, trade: &Trade, card: &mut Card) {
    let mut thickness = trade.tell_exact(layer.length.value, Dimension::LENGTH);
    if let Some(count) = monolayers(layer) {
        thickness += &format!(" = {count} ML");
    }
    card.row(["thickness".to_owned(), thickness]);
    let ends = |told: [String; 2]| match told[0] == told[1] {
        true => told[0].clone(),
        false => format!("{} to {}", told[0], told[1]),
    };
    let edges = [&layer.edge[0], &layer.edge[1]]
        .map(|edge| trade.tell_exact(edge.value, Dimension::ENERGY));
    card.row(["potential".to_owned(), ends(edges)]);
    let masses = [&layer.mass[0], &layer.mass[1]]
        .map(|law| trade.tell_exact(law.mass.value, Dimension::MASS));
    let growing = layer.mass.iter().any(|law| law.nonparabolic.is_some());
    let note = if growing { ", growing with energy" } else { "" };
    card.row([
        "mass".to_owned(),
        format!("{}, {}{note}", ends(masses), layer.mass_origin),
    ]);
}

/// A layer's thickness in monolayers, where one is known.
pub fn monolayers(layer: &Layer) -> Option<String> {
    let monolayer = layer.monolayer.as_ref()?.value;
    let count = layer.length.value / monolayer;
    (count.is_finite() && monolayer > 0.0).then(|| units::digits((count * 1e9).round() / 1e9, 0.0))
}

/// The recoil scale.
pub fn recoil(view: &View<'_>) -> Option<Card> {
    let crystal = view.crystal()?;
    let recoil = crystal.recoil.as_ref()?;
    let energy = recoil.energy.value;
    let plain = Trade {
        recoil: None,
        atoms: true,
    };
    let mut card = Card::new("recoil");
    card.row([
        "1 Er".to_owned(),
        plain.tell_exact(energy, Dimension::ENERGY),
    ]);
    card.row([
        String::new(),
        plain.tell_exact(energy / BOLTZMANN, Dimension::TEMPERATURE),
    ]);
    card.row([
        "wavelength".to_owned(),
        plain.tell_exact(recoil.wavelength.value, Dimension::LENGTH),
    ]);
    card.row([
        "mass".to_owned(),
        view.trade().tell_exact(crystal.mass.value, Dimension::MASS),
    ]);
    if let Some(spacing) = period(crystal) {
        let ratio = units::digits(recoil.wavelength.value / spacing, 0.0);
        card.row([
            "wavelength/period".to_owned(),
            format!("{ratio} (2 where the beam is retro-reflected)"),
        ]);
    }
    Some(card)
}

/// The length of the first conventional vector.
fn period(crystal: &Crystal) -> Option<f64> {
    let vector = crystal.conventional.first()?;
    let square: f64 = vector.iter().map(|entry| entry.value * entry.value).sum();
    (square > 0.0).then(|| square.sqrt())
}

/// kT against the lowest gaps.
pub fn temperature(view: &View<'_>) -> Option<Card> {
    let crystal = view.crystal()?;
    let trade = view.trade();
    let kelvin = crystal.temperature.as_ref()?.value;
    let thermal = kelvin * BOLTZMANN;
    let mut card = Card::new("temperature");
    card.row([
        "kT".to_owned(),
        energy_told(
            exact(thermal),
            &Trade {
                atoms: true,
                ..trade
            },
        ),
    ]);
    if let Some(solution) = view.solution().filter(|_| thermal > 0.0) {
        for (index, gap) in solution.gaps.iter().take(GAPS).enumerate() {
            let ratio = units::digits(gap.size.value / thermal, gap.size.uncertainty / thermal);
            card.row([format!("gap {}", index + 1), format!("{ratio} kT")]);
        }
    }
    Some(card)
}
