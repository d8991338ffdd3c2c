//! `show --format text`: each crystal's bands, gaps, masses, filling, measures and targets.

use super::analysis::{FileAnalysis, SectionAnalysis};
use super::grid::{Stand, lay};
use super::locate::Locator;
use super::paint::Paint;
use super::structure;
use super::units::{self, Scale, Trade};
use super::words;
use crate::bands::{Assessment, Extremum, MassAxis, MeasureValue, Measured, Solution};
use crate::model::Crystal;

/// The crystals of a file, in order; `only` picks one.
#[must_use]
pub fn file(
    locator: &Locator<'_>,
    analysed: &FileAnalysis,
    only: &[String],
    paint: Paint,
) -> String {
    let chosen = analysed.crystals(only);
    chosen
        .map(|(section, crystal)| self::crystal(locator, section, crystal, paint) + "\n")
        .collect()
}

/// One crystal.
#[must_use]
pub fn crystal(
    locator: &Locator<'_>,
    section: &SectionAnalysis,
    crystal: &Crystal,
    paint: Paint,
) -> String {
    let trade = Trade::of(crystal);
    let file = locator.file_name(crystal.place.file);
    let line = locator.line(&crystal.place);
    let mut text = format!(
        "{}  {}\n",
        paint.strong(&crystal.name),
        paint.faint(&format!("{file}:{line}"))
    );
    if crystal.title != crystal.name && !crystal.title.is_empty() {
        text += &format!("  {}\n", crystal.title);
    }
    let about = structure::structure(crystal, section.solution(), &trade);
    text += &format!("  {about}\n");
    if let Some(why) = section.unsolved() {
        text += &format!("  no bands: {}\n", words::unsolved(why));
    }
    if let Some(solution) = section.solution() {
        text.push('\n');
        text += &bands(solution, &trade);
        text += &axes(solution, &trade);
        text += &filling(crystal, solution, &trade);
    }
    text += &wishes(locator, section, crystal, paint);
    text
}

/// The unit that all edges of a crystal are told in.
#[must_use]
pub fn edge_scale(solution: &Solution, trade: &Trade) -> Scale {
    let energies = solution.bands.iter().take(2);
    let sizes =
        energies.flat_map(|band| [band.bottom.energy.value.abs(), band.top.energy.value.abs()]);
    trade.energy(sizes.fold(0.0, f64::max) / 4.0)
}

fn bands(solution: &Solution, trade: &Trade) -> String {
    let scale = edge_scale(solution, trade);
    let headings = [
        "band",
        "bottom",
        "",
        "top",
        "",
        "width",
        "gap above",
        "",
        "mass at bottom",
        "at top",
    ];
    let mut rows = vec![headings.map(str::to_owned).to_vec()];
    for (index, band) in solution.bands.iter().enumerate() {
        let gap = solution.gaps.get(index);
        rows.push(vec![
            (index + 1).to_string(),
            units::tell_in(band.bottom.energy, &scale),
            point(&band.bottom),
            units::tell_in(band.top.energy, &scale),
            point(&band.top),
            trade.tell_energy(band.width),
            gap.map(|gap| trade.tell_energy(gap.size))
                .unwrap_or_default(),
            gap.map(|gap| words::gap_kind(gap.kind).to_owned())
                .unwrap_or_default(),
            mass(&band.bottom, trade),
            mass(&band.top, trade),
        ]);
    }
    use Stand::{Left, Right};
    let stands = [
        Right, Right, Left, Right, Left, Right, Right, Left, Right, Right,
    ];
    lay(&stands, &rows, 2)
}

/// The masses of extrema whose masses differ with the direction.
fn axes(solution: &Solution, trade: &Trade) -> String {
    let numbered = solution.bands.iter().enumerate();
    let edges = numbered.flat_map(|(index, band)| {
        [("bottom", &band.bottom), ("top", &band.top)].map(|(side, edge)| (index + 1, side, edge))
    });
    let rows: Vec<Vec<String>> = edges
        .filter(|(_, _, edge)| is_anisotropic(edge))
        .map(|(number, side, edge)| {
            let told = by_direction(&edge.axes, trade);
            vec![format!("masses at {side} {number}"), told.join(", ")]
        })
        .collect();
    match rows.is_empty() {
        true => String::new(),
        false => format!("\n{}", lay(&[Stand::Left; 2], &rows, 2)),
    }
}

fn is_anisotropic(edge: &Extremum) -> bool {
    let first = edge.axes.first();
    first.is_some_and(|first| edge.axes.iter().any(|axis| !same_mass(first, axis)))
}

/// Whether two masses are not told apart.
fn same_mass(one: &MassAxis, other: &MassAxis) -> bool {
    let apart = (one.mass.value - other.mass.value).abs();
    let known = one.mass.uncertainty + other.mass.uncertainty;
    apart <= known.max(1e-3 * one.mass.value.abs())
}

/// Each mass with its direction; of two that are equal no direction counts but that of the third.
fn by_direction(axes: &[MassAxis], trade: &Trade) -> Vec<String> {
    let told = |axis: &MassAxis| units::tell_in(axis.mass, &trade.mass());
    let along = |axis: &MassAxis| format!("{} along {}", told(axis), direction(&axis.along));
    if let [low, middle, high] = axes {
        let alone = match (same_mass(low, middle), same_mass(middle, high)) {
            (true, false) => Some((high, low)),
            (false, true) => Some((low, high)),
            _ => None,
        };
        if let Some((alone, others)) = alone {
            return vec![along(alone), format!("{} across", told(others))];
        }
    }
    axes.iter().map(along).collect()
}

/// A direction by its components, the largest being one.
fn direction(along: &[f64]) -> String {
    let largest =
        along.iter().copied().fold(
            0.0,
            |most: f64, x| {
                if x.abs() > most.abs() + 1e-9 { x } else { most }
            },
        );
    let told = along.iter().map(|x| {
        let part = (x / largest * 1e3).round() / 1e3;
        units::digits(if part == 0.0 { 0.0 } else { part }, 0.0)
    });
    format!("({})", told.collect::<Vec<_>>().join(", "))
}

/// Where an extremum is: the point's name, or k.
#[must_use]
pub fn point(extremum: &Extremum) -> String {
    if let Some(name) = &extremum.point {
        return name.clone();
    }
    let told: Vec<String> = extremum.k.iter().map(|k| units::digits(*k, 0.0)).collect();
    match told.as_slice() {
        [one] => one.clone(),
        several => format!("({})", several.join(", ")),
    }
}

/// The mass at an extremum, a dash where there is none.
#[must_use]
pub fn mass(extremum: &Extremum, trade: &Trade) -> String {
    match extremum.mass {
        Some(mass) => units::tell_in(mass, &trade.mass()),
        None => "–".to_owned(),
    }
}

fn filling(crystal: &Crystal, solution: &Solution, trade: &Trade) -> String {
    let Some(line) = filling_line(crystal, solution, trade) else {
        return String::new();
    };
    format!("\n  {line}\n")
}

/// Filling, Fermi level and class in one line, where there is a filling.
#[must_use]
pub fn filling_line(crystal: &Crystal, solution: &Solution, trade: &Trade) -> Option<String> {
    let filling = crystal.filling.as_ref()?;
    let mut parts = vec![format!("{} per cell", units::digits(filling.value, 0.0))];
    if let Some(fermi) = solution.fermi {
        parts.push(format!("Fermi level {}", trade.tell_energy(fermi)));
    }
    if let Some(class) = solution.class {
        parts.push(words::class(class).to_owned());
    }
    Some(parts.join(" · "))
}

/// Measures and targets.
fn wishes(
    locator: &Locator<'_>,
    section: &SectionAnalysis,
    crystal: &Crystal,
    paint: Paint,
) -> String {
    let trade = Trade::of(crystal);
    let mut text = String::new();
    if !section.measures.is_empty() {
        let measures = section.measures.iter();
        let rows: Vec<Vec<String>> = measures
            .map(|measure| {
                vec![
                    "measure".to_owned(),
                    measure.name.clone(),
                    measured(measure, &trade),
                ]
            })
            .collect();
        text += "\n";
        text += &lay(&[Stand::Left; 3], &rows, 2);
    }
    if !section.targets.is_empty() {
        text += "\n";
        text += &targets(locator, section, crystal, paint);
    }
    text
}

/// A measure's value, or why there is none.
#[must_use]
pub fn measured(measure: &MeasureValue, trade: &Trade) -> String {
    match &measure.value {
        Ok(value) => trade.tell(*value, measure.dimension),
        Err(why) => format!("no value: {why}"),
    }
}

fn targets(
    locator: &Locator<'_>,
    section: &SectionAnalysis,
    crystal: &Crystal,
    paint: Paint,
) -> String {
    let trade = Trade::of(crystal);
    let rows: Vec<Vec<String>> = section
        .targets
        .iter()
        .map(|target| {
            vec![
                "require".to_owned(),
                target.text.clone(),
                words::target_state_spoken(target.state).to_owned(),
                outcome(locator, crystal, target, &trade),
            ]
        })
        .collect();
    let plain = lay(&[Stand::Left; 4], &rows, 2);
    let painted = plain.lines().zip(&section.targets).map(|(line, target)| {
        // The state stands behind the text, so the last occurrence before the outcome is its own.
        let word = words::target_state_spoken(target.state);
        let from = 2 + "require  ".len() + target.text.len();
        let (head, tail) = line.split_at_checked(from).unwrap_or((line, ""));
        format!(
            "{head}{}\n",
            tail.replacen(word, &paint.state(target.state, word), 1)
        )
    });
    painted.collect()
}

/// What became of a target: its value, what is left, the worst case and what drives it.
#[must_use]
pub fn outcome(
    locator: &Locator<'_>,
    crystal: &Crystal,
    target: &Assessment,
    trade: &Trade,
) -> String {
    let mut parts = Vec::new();
    match (&target.found, target.value) {
        (Some(found), _) => parts.push(found.clone()),
        (None, Some(value)) => {
            parts.push(trade.tell(value, words::target_dimension(target)));
            parts.extend(margin(target, trade));
        }
        (None, None) => {}
    }
    if let Some(worst) = worst(locator, crystal, target, trade) {
        parts.push(worst);
    }
    if let Some(reason) = &target.reason {
        parts.push(reason.clone());
    }
    parts.join(", ")
}

/// "72.4 meV to spare" or "7.6 meV short"; nothing where the margin is not told from nought.
#[must_use]
pub fn margin(target: &Assessment, trade: &Trade) -> Option<String> {
    let margin = spare(target)?;
    let size = margin.abs();
    let uncertainty = target.value.map_or(0.0, |value| value.uncertainty);
    if size <= uncertainty {
        return None;
    }
    let told = trade.tell(
        Measured {
            value: size,
            uncertainty,
        },
        words::target_dimension(target),
    );
    Some(match margin >= 0.0 {
        true => format!("{told} to spare"),
        false => format!("{told} short"),
    })
}

/// How far the worst value is inside or outside of its limits, as [`margin`] tells it; `None` for a class or kind of gap.
#[must_use]
pub fn worst_margin(target: &Assessment, worst: f64, trade: &Trade) -> Option<String> {
    let mut there = target.clone();
    there.value.as_mut()?.value = worst;
    margin(&there, trade)
}

/// How far the value is inside its limits; negative outside.
#[must_use]
pub fn spare(target: &Assessment) -> Option<f64> {
    let value = target.value?.value;
    let below = target.limits.0.map(|lower| value - lower);
    let above = target.limits.1.map(|upper| upper - value);
    [below, above].into_iter().flatten().reduce(f64::min)
}

fn worst(
    locator: &Locator<'_>,
    crystal: &Crystal,
    target: &Assessment,
    trade: &Trade,
) -> Option<String> {
    let told = worst_value(target, target.worst?, trade);
    let told = if target.found.is_some() {
        format!("a gap of {told}")
    } else {
        told
    };
    Some(match words::driver(locator, crystal, target) {
        Some(driver) => format!("at worst {told} (most by {driver})"),
        None => format!("at worst {told}"),
    })
}

/// The worst value of a target, known as well as the nominal one.
#[must_use]
pub fn worst_value(target: &Assessment, worst: f64, trade: &Trade) -> String {
    let uncertainty = target.value.map_or(0.0, |value| value.uncertainty);
    let worst = Measured {
        value: worst,
        uncertainty,
    };
    trade.tell(worst, words::target_dimension(target))
}
