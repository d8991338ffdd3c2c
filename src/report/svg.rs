//! The picture of a one-dimensional crystal as SVG: on the left the potential over two cells with its bands and |ψ|²
//! at their edges, on the right E(k), both on one energy axis.

use svg::Document;
use svg::node::element::path::Data;
use svg::node::element::{Group, Line, Path, Rectangle, Text};

use super::analyst::Analyst;
use super::show_text;
use super::units::{self, Scale, Trade};
use super::words;
use crate::bands::{Picture, Solution};
use crate::model::{Crystal, Dimension};

const WIDTH: f64 = 960.0;
const HEIGHT: f64 = 580.0;
/// The panels: left edge, right edge.
const CELLS: (f64, f64) = (84.0, 600.0);
const ZONE: (f64, f64) = (640.0, 880.0);
/// Their top and bottom.
const TOP: f64 = 78.0;
const BOTTOM: f64 = 490.0;
/// Points along a line.
const POINTS: usize = 96;
/// The share of the panel's height that the highest |ψ|² takes.
const WAVE_HEIGHT: f64 = 0.09;

const INK: &str = "#22303c";
const FAINT: &str = "#8796a5";
const WALL: &str = "#dfe5ea";
const WALL_EDGE: &str = "#5d6f80";
const BAND: &str = "#f2b84b";
const LOWER: &str = "#146c94";
const UPPER: &str = "#b8405e";

/// The picture of a crystal.
///
/// # Errors
/// In words, where it has no bands to draw.
pub fn draw(
    analyst: &Analyst,
    crystal: &Crystal,
    cancel: &(dyn Fn() -> bool + Sync),
) -> Result<String, String> {
    let told = |why| words::unsolved(&why);
    let solution = analyst.solver().solve(crystal, cancel).map_err(told)?;
    let picture = analyst
        .solver()
        .picture(crystal, POINTS, cancel)
        .map_err(told)?;
    let canvas = Canvas::new(crystal, &solution, &picture).ok_or("there is nothing to draw")?;
    Ok(canvas.document().to_string() + "\n")
}

/// What is drawn, and on which axes.
struct Canvas<'a> {
    crystal: &'a Crystal,
    solution: &'a Solution,
    picture: &'a Picture,
    trade: Trade,
    energy: Scale,
    /// The energies at the bottom and the top of the panels, in joule.
    window: (f64, f64),
}

impl<'a> Canvas<'a> {
    fn new(crystal: &'a Crystal, solution: &'a Solution, picture: &'a Picture) -> Option<Self> {
        let trade = Trade::of(crystal);
        let lowest = solution
            .potential
            .lowest
            .min(solution.bands.first()?.bottom.energy.value);
        let second = solution
            .bands
            .get(1)
            .or(solution.bands.first())?
            .top
            .energy
            .value;
        let third = solution
            .bands
            .get(2)
            .map_or(second, |band| band.bottom.energy.value);
        // The walls and two bands; the third where it is near.
        let reach = second.max(solution.potential.highest);
        let highest = if third < 1.2 * (reach - lowest) + lowest {
            reach.max(third)
        } else {
            reach
        };
        let margin = 0.06 * (highest - lowest);
        let window = (lowest - margin, highest + 2.2 * margin);
        let usable = window.1 > window.0 && picture.period > 0.0;
        usable.then(|| Self {
            crystal,
            solution,
            picture,
            trade,
            energy: trade.energy(window.0.abs().max(window.1.abs()) / 4.0),
            window,
        })
    }

    fn y(&self, energy: f64) -> f64 {
        let share = (energy - self.window.0) / (self.window.1 - self.window.0);
        BOTTOM - share.clamp(-0.5, 1.5) * (BOTTOM - TOP)
    }

    /// Two cells fill the left panel.
    fn x(&self, position: f64) -> f64 {
        CELLS.0 + position / (2.0 * self.picture.period) * (CELLS.1 - CELLS.0)
    }

    fn document(&self) -> Document {
        Document::new()
            .set("viewBox", (0, 0, WIDTH, HEIGHT))
            .set("width", WIDTH)
            .set("height", HEIGHT)
            .set("font-family", "system-ui, sans-serif")
            .set("font-size", 14)
            .add(
                Rectangle::new()
                    .set("width", WIDTH)
                    .set("height", HEIGHT)
                    .set("fill", "#ffffff"),
            )
            .add(self.clips())
            .add(self.head())
            .add(self.bands())
            .add(self.potential())
            .add(self.waves())
            .add(self.dispersion())
            .add(self.frames())
            .add(self.energy_axis())
            .add(self.position_axis())
            .add(self.legend())
    }

    fn clips(&self) -> svg::node::element::Definitions {
        let clip = |name: &str, (left, right): (f64, f64)| {
            let area = rectangle(left, TOP, right, BOTTOM);
            svg::node::element::ClipPath::new()
                .set("id", name)
                .add(area)
        };
        svg::node::element::Definitions::new()
            .add(clip("cells", CELLS))
            .add(clip("zone", ZONE))
    }

    fn head(&self) -> Group {
        let name = match self.crystal.title.is_empty() {
            true => self.crystal.name.clone(),
            false => self.crystal.title.clone(),
        };
        let gap = self
            .solution
            .gaps
            .first()
            .map(|gap| format!(" · gap 1 {}", self.trade.tell_energy(gap.size)));
        let width = self
            .solution
            .bands
            .first()
            .map(|band| format!(" · width 1 {}", self.trade.tell_energy(band.width)));
        let about = format!(
            "{}{}{}",
            show_text::cell(self.crystal, &self.trade),
            gap.unwrap_or_default(),
            width.unwrap_or_default()
        );
        Group::new()
            .add(text(&name, CELLS.0, 32.0, "start", INK).set("font-size", 20))
            .add(text(&about, CELLS.0, 56.0, "start", FAINT))
    }

    /// The bands as stripes through both panels.
    fn bands(&self) -> Group {
        let mut group = Group::new();
        for (index, band) in self.solution.bands.iter().enumerate() {
            let (bottom, top) = (
                self.y(band.bottom.energy.value),
                self.y(band.top.energy.value),
            );
            if top > BOTTOM || bottom < TOP {
                continue;
            }
            // A band narrower than a line is still seen.
            let middle = 0.5 * (bottom + top);
            let half = (0.5 * (bottom - top)).max(0.75);
            let mut stripes = Group::new()
                .set("class", "band")
                .set("data-band", index + 1);
            for (left, right) in [CELLS, ZONE] {
                let stripe = rectangle(
                    left,
                    (middle - half).max(TOP),
                    right,
                    (middle + half).min(BOTTOM),
                );
                stripes = stripes.add(stripe.set("fill", BAND).set("fill-opacity", 0.42));
            }
            group = group.add(stripes);
        }
        group
    }

    fn potential(&self) -> Group {
        let line = &self.picture.potential;
        let mut outline = Data::new();
        let mut area = Data::new().move_to((CELLS.0, BOTTOM));
        let mut begun = false;
        for cell in 0..2 {
            for (position, energy) in line {
                let point = (
                    self.x(position + f64::from(cell) * self.picture.period),
                    self.y(*energy),
                );
                area = area.line_to(point);
                outline = if begun {
                    outline.line_to(point)
                } else {
                    outline.move_to(point)
                };
                begun = true;
            }
        }
        let area = area.line_to((CELLS.1, BOTTOM)).close();
        let mut group = Group::new()
            .set("clip-path", "url(#cells)")
            .add(
                Path::new()
                    .set("d", area)
                    .set("fill", WALL)
                    .set("fill-opacity", 0.75),
            )
            .add(stroke(outline, WALL_EDGE, 1.6).set("class", "potential"));
        for (position, strength) in &self.picture.spikes {
            for cell in 0..2 {
                let x = self.x(position + f64::from(cell) * self.picture.period);
                let end = if *strength > 0.0 { TOP } else { BOTTOM };
                let base = self.y(0.0).clamp(TOP, BOTTOM);
                group = group.add(line_between((x, base), (x, end), WALL_EDGE, 2.4));
            }
        }
        group
    }

    /// |ψ|² at the edges, standing on their energies.
    fn waves(&self) -> Group {
        let inside = |energy: f64| energy > self.window.0 && energy < self.window.1;
        let shown = || self.picture.waves.iter().filter(|wave| inside(wave.energy));
        let heights = shown().flat_map(|wave| wave.density.iter().map(|(_, density)| *density));
        let highest = heights.fold(0.0, f64::max);
        let unit = WAVE_HEIGHT * (BOTTOM - TOP) / highest.max(1.0);
        let mut group = Group::new().set("clip-path", "url(#cells)");
        for wave in shown() {
            let base = self.y(wave.energy);
            let colour = if wave.top { UPPER } else { LOWER };
            let mut data = Data::new();
            let mut begun = false;
            for cell in 0..2 {
                for (position, density) in &wave.density {
                    let x = self.x(position + f64::from(cell) * self.picture.period);
                    let point = (x, base - unit * density);
                    data = if begun {
                        data.line_to(point)
                    } else {
                        data.move_to(point)
                    };
                    begun = true;
                }
            }
            group = group.add(stroke(data, colour, 1.8).set("class", "wave"));
        }
        group
    }

    fn dispersion(&self) -> Group {
        let middle = 0.5 * (ZONE.0 + ZONE.1);
        let x = |k: f64| middle + k * (ZONE.1 - ZONE.0);
        let mut group = Group::new().set("clip-path", "url(#zone)");
        for band in &self.picture.dispersion {
            let left = band.iter().rev().map(|(k, energy)| (-k, *energy));
            let all = left.chain(band.iter().copied());
            let mut data = Data::new();
            for (index, (k, energy)) in all.enumerate() {
                let point = (x(k), self.y(energy));
                data = if index == 0 {
                    data.move_to(point)
                } else {
                    data.line_to(point)
                };
            }
            group = group.add(stroke(data, INK, 2.0).set("class", "dispersion"));
        }
        group
    }

    fn frames(&self) -> Group {
        let mut group = Group::new();
        for (left, right) in [CELLS, ZONE] {
            let frame = rectangle(left, TOP, right, BOTTOM);
            group = group.add(frame.set("fill", "none").set("stroke", FAINT));
        }
        let middle = 0.5 * (ZONE.0 + ZONE.1);
        for (x, label) in [(ZONE.0, "edge"), (middle, "centre"), (ZONE.1, "edge")] {
            group = group.add(text(label, x, BOTTOM + 20.0, "middle", INK));
        }
        let mut last = f64::INFINITY;
        for (index, band) in self.solution.bands.iter().enumerate() {
            let y = self.y(0.5 * (band.bottom.energy.value + band.top.energy.value));
            // A number that would stand on the one below it is left out.
            if y > TOP + 8.0 && y < BOTTOM - 8.0 && last - y > 14.0 {
                let number = (index + 1).to_string();
                group = group.add(text(&number, ZONE.1 + 10.0, y + 5.0, "start", FAINT));
                last = y;
            }
        }
        group.add(text("wave number", middle, BOTTOM + 42.0, "middle", FAINT))
    }

    fn energy_axis(&self) -> Group {
        let scaled = (
            self.window.0 / self.energy.factor,
            self.window.1 / self.energy.factor,
        );
        let mut group = Group::new();
        for tick in ticks(scaled.0, scaled.1, 7) {
            let y = self.y(tick * self.energy.factor);
            group = group
                .add(line_between((CELLS.0 - 5.0, y), (CELLS.0, y), FAINT, 1.0))
                .add(text(
                    &units::digits(tick, 0.0),
                    CELLS.0 - 9.0,
                    y + 5.0,
                    "end",
                    INK,
                ));
        }
        let middle = 0.5 * (TOP + BOTTOM);
        let label = text(
            &format!("energy in {}", self.energy.name),
            0.0,
            0.0,
            "middle",
            FAINT,
        );
        group.add(label.set("transform", format!("translate(24 {middle}) rotate(-90)")))
    }

    fn position_axis(&self) -> Group {
        let length = 2.0 * self.picture.period;
        let scale = self.trade.scale(Dimension::LENGTH, length);
        let mut group = Group::new();
        for tick in ticks(0.0, length / scale.factor, 6) {
            let x = self.x(tick * scale.factor);
            group = group
                .add(line_between((x, BOTTOM), (x, BOTTOM + 5.0), FAINT, 1.0))
                .add(text(
                    &units::digits(tick, 0.0),
                    x,
                    BOTTOM + 20.0,
                    "middle",
                    INK,
                ));
        }
        let middle = 0.5 * (CELLS.0 + CELLS.1);
        let label = format!("position in {}, two cells", scale.name);
        group.add(text(&label, middle, BOTTOM + 42.0, "middle", FAINT))
    }

    fn legend(&self) -> Group {
        let y = HEIGHT - 12.0;
        let mut group = Group::new();
        let entries = [
            (LOWER, "|ψ|² at the bottom of a band"),
            (UPPER, "at its top"),
        ];
        let mut x = CELLS.0;
        for (colour, label) in entries {
            group = group
                .add(line_between((x, y - 5.0), (x + 22.0, y - 5.0), colour, 2.4))
                .add(text(label, x + 28.0, y, "start", INK));
            x += 240.0;
        }
        group
    }
}

fn rectangle(left: f64, top: f64, right: f64, bottom: f64) -> Rectangle {
    Rectangle::new()
        .set("x", left)
        .set("y", top)
        .set("width", right - left)
        .set("height", bottom - top)
}

fn line_between(from: (f64, f64), to: (f64, f64), colour: &str, width: f64) -> Line {
    Line::new()
        .set("x1", from.0)
        .set("y1", from.1)
        .set("x2", to.0)
        .set("y2", to.1)
        .set("stroke", colour)
        .set("stroke-width", width)
}

fn stroke(data: Data, colour: &str, width: f64) -> Path {
    Path::new()
        .set("d", data)
        .set("fill", "none")
        .set("stroke", colour)
        .set("stroke-width", width)
        .set("stroke-linejoin", "round")
}

fn text(content: &str, x: f64, y: f64, anchor: &str, colour: &str) -> Text {
    Text::new(content)
        .set("x", x)
        .set("y", y)
        .set("text-anchor", anchor)
        .set("fill", colour)
}

/// Round values within a range, about `wanted` of them, steps of 1, 2 or 5 times a power of ten.
fn ticks(from: f64, to: f64, wanted: usize) -> Vec<f64> {
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
