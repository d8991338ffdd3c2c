//! What the pictures share: the sheet, its colours, axes and marks.

use svg::Document;
use svg::node::element::path::Data;
use svg::node::element::{ClipPath, Definitions, Group, Line, Path, Rectangle, Text};

use crate::model::Crystal;
use crate::report::structure;
use crate::report::units::{self, Scale, Trade};

pub(super) const WIDTH: f64 = 960.0;
pub(super) const HEIGHT: f64 = 580.0;
/// Top and bottom of the panels.
pub(super) const TOP: f64 = 78.0;
pub(super) const BOTTOM: f64 = 490.0;

pub(super) const INK: &str = "#22303c";
pub(super) const FAINT: &str = "#8796a5";
pub(super) const BAND: &str = "#f2b84b";

/// Left and right edge of a panel.
pub(super) type Panel = (f64, f64);

/// An empty sheet, with a clip of each panel's name and area.
pub(super) fn sheet(panels: &[(&str, Panel)]) -> Document {
    let mut clips = Definitions::new();
    for (name, (left, right)) in panels {
        let area = rectangle(*left, TOP, *right, BOTTOM);
        clips = clips.add(ClipPath::new().set("id", *name).add(area));
    }
    Document::new()
        .set("viewBox", (0, 0, WIDTH, HEIGHT))
        .set("width", WIDTH)
        .set("height", HEIGHT)
        .set("font-family", "system-ui, sans-serif")
        .set("font-size", 14)
        .add(rectangle(0.0, 0.0, WIDTH, HEIGHT).set("fill", "#ffffff"))
        .add(clips)
}

/// The title, and below it the cell and a few numbers.
pub(super) fn head(crystal: &Crystal, trade: &Trade, numbers: &[String], left: f64) -> Group {
    let name = match crystal.title.is_empty() {
        true => &crystal.name,
        false => &crystal.title,
    };
    let mut about = structure::cell(crystal, trade);
    for number in numbers {
        about.push_str(" · ");
        about.push_str(number);
    }
    Group::new()
        .add(text(name, left, 32.0, "start", INK).set("font-size", 20))
        .add(text(&about, left, 56.0, "start", FAINT))
}

/// The axis of energies that the panels share.
pub(super) struct EnergyAxis {
    /// The energies at the bottom and the top of the panels, in joule.
    pub window: (f64, f64),
    /// The unit it is marked in.
    pub scale: Scale,
}

impl EnergyAxis {
    /// Over a window of energies; `None` where it is empty or endless.
    pub fn new(trade: &Trade, window: (f64, f64)) -> Option<Self> {
        let usable = window.1 > window.0 && window.0.is_finite() && window.1.is_finite();
        usable.then(|| Self {
            window,
            scale: trade.energy(window.0.abs().max(window.1.abs()) / 4.0),
        })
    }

    /// Where an energy in joule stands.
    pub fn y(&self, energy: f64) -> f64 {
        let share = (energy - self.window.0) / (self.window.1 - self.window.0);
        BOTTOM - share.clamp(-0.5, 1.5) * (BOTTOM - TOP)
    }

    /// Its marks left of a panel that begins at `left`.
    pub fn marks(&self, left: f64) -> Group {
        let factor = self.scale.factor;
        let mut group = Group::new();
        for tick in ticks(self.window.0 / factor, self.window.1 / factor, 7) {
            let y = self.y(tick * factor);
            let label = units::digits(tick, 0.0);
            group = group
                .add(line_between((left - 5.0, y), (left, y), FAINT, 1.0))
                .add(text(&label, left - 9.0, y + 5.0, "end", INK));
        }
        let middle = 0.5 * (TOP + BOTTOM);
        let label = format!("energy in {}", self.scale.name);
        let label = text(&label, 0.0, 0.0, "middle", FAINT);
        group.add(label.set("transform", format!("translate(24 {middle}) rotate(-90)")))
    }
}

pub(super) fn rectangle(left: f64, top: f64, right: f64, bottom: f64) -> Rectangle {
    Rectangle::new()
        .set("x", left)
        .set("y", top)
        .set("width", right - left)
        .set("height", bottom - top)
}

pub(super) fn line_between(from: (f64, f64), to: (f64, f64), colour: &str, width: f64) -> Line {
    Line::new()
        .set("x1", from.0)
        .set("y1", from.1)
        .set("x2", to.0)
        .set("y2", to.1)
        .set("stroke", colour)
        .set("stroke-width", width)
}

pub(super) fn stroke(data: Data, colour: &str, width: f64) -> Path {
    Path::new()
        .set("d", data)
        .set("fill", "none")
        .set("stroke", colour)
        .set("stroke-width", width)
        .set("stroke-linejoin", "round")
}

pub(super) fn text(content: &str, x: f64, y: f64, anchor: &str, colour: &str) -> Text {
    Text::new(content)
        .set("x", x)
        .set("y", y)
        .set("text-anchor", anchor)
        .set("fill", colour)
}

/// Round values within a range, about `wanted` of them, steps of 1, 2 or 5 times a power of ten.
pub(super) fn ticks(from: f64, to: f64, wanted: usize) -> Vec<f64> {
    let rough = (to - from) / wanted.max(1) as f64;
    if !(rough.is_finite() && rough > 0.0) {
        return Vec::new();
    }
    let power = 10f64.powf(rough.log10().floor());
    let factor = [1.0, 2.0, 5.0, 10.0]
        .into_iter()
        .find(|factor| factor * power >= rough);
    let step = factor.unwrap_or(10.0) * power;
    let first = (from / step).ceil() as i64;
    let last = (to / step).floor() as i64;
    (first..=last)
        .map(|count| (count as f64 * step * 1e9).round() / 1e9)
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_inside() {
        assert_eq!(ticks(-14.1, 370.0, 7), [0.0, 100.0, 200.0, 300.0]);
        assert_eq!(ticks(0.0, 16.0, 6), [0.0, 5.0, 10.0, 15.0]);
        assert!(ticks(0.0, f64::NAN, 6).is_empty());
        assert!(ticks(3.0, 3.0, 6).is_empty());
    }
}
