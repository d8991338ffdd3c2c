//! The picture of a one-dimensional crystal: on the left the potential over two cells with its bands and |ψ|² at
//! their edges, on the right E(k), both on one energy axis.

use svg::Document;
use svg::node::element::path::Data;
use svg::node::element::{Group, Path};

use super::parts::{
    BAND, BOTTOM, EnergyAxis, FAINT, HEIGHT, INK, Panel, TOP, head, line_between, rectangle, sheet,
    stroke, text, ticks,
};
use crate::bands::{Picture, Solution};
use crate::model::{Crystal, Dimension};
use crate::report::units::{self, Trade};

/// The panels.
const CELLS: Panel = (84.0, 600.0);
const ZONE: Panel = (640.0, 880.0);
/// The share of the panel's height that the highest |ψ|² takes.
const WAVE_HEIGHT: f64 = 0.09;

const WALL: &str = "#dfe5ea";
const WALL_EDGE: &str = "#5d6f80";
const LOWER: &str = "#146c94";
const UPPER: &str = "#b8405e";

/// The picture; nothing where there is nothing to draw.
pub(super) fn draw(crystal: &Crystal, solution: &Solution, picture: &Picture) -> Option<Document> {
    Some(Canvas::new(crystal, solution, picture)?.document())
}

/// What is drawn, and on which axes.
struct Canvas<'a> {
    crystal: &'a Crystal,
    solution: &'a Solution,
    picture: &'a Picture,
    trade: Trade,
    energy: EnergyAxis,
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
        let energy = EnergyAxis::new(&trade, window).filter(|_| picture.period > 0.0)?;
        Some(Self {
            crystal,
            solution,
            picture,
            trade,
            energy,
        })
    }

    fn y(&self, energy: f64) -> f64 {
        self.energy.y(energy)
    }

    /// Two cells fill the left panel.
    fn x(&self, position: f64) -> f64 {
        CELLS.0 + position / (2.0 * self.picture.period) * (CELLS.1 - CELLS.0)
    }

    fn document(&self) -> Document {
        sheet(&[("cells", CELLS), ("zone", ZONE)])
            .add(head(self.crystal, &self.trade, &self.numbers(), CELLS.0))
            .add(self.bands())
            .add(self.potential())
            .add(self.waves())
            .add(self.dispersion())
            .add(self.frames())
            .add(self.energy.marks(CELLS.0))
            .add(self.position_axis())
            .add(self.legend())
    }

    /// The lowest gap and width.
    fn numbers(&self) -> Vec<String> {
        let gap = self.solution.gaps.first();
        let gap = gap.map(|gap| format!("gap 1 {}", self.trade.tell_energy(gap.size)));
        let width = self.solution.bands.first();
        let width = width.map(|band| format!("width 1 {}", self.trade.tell_energy(band.width)));
        gap.into_iter().chain(width).collect()
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
        let inside = |energy: f64| energy > self.energy.window.0 && energy < self.energy.window.1;
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
