//! The picture of a two- or three-dimensional crystal: on the left its bands along the standard path with the open gaps
//! marked, on the right the density of states, both on one energy axis.

use svg::Document;
use svg::node::element::path::Data;
use svg::node::element::{Circle, Group, Path};

use super::parts::{
    BAND, BOTTOM, EnergyAxis, FAINT, INK, Panel, TOP, head, line_between, rectangle, sheet, stroke,
    text, ticks,
};
use crate::bands::{
    Band, Extremum, Gap, GapKind, LatticePicture, PathRun, Solution, class_word, gap_word,
};
use crate::model::Crystal;
use crate::report::units::{self, Trade};

/// The panels.
const PATH: Panel = (84.0, 690.0);
const STATES: Panel = (724.0, 880.0);
/// What separates one run of the path from the next.
const BREAK: f64 = 14.0;
/// An edge of a band is marked where the path comes this close to it, as a part of the window.
const ON_THE_PATH: f64 = 4e-3;

const EDGE: &str = "#b8405e";
const FILLED: &str = "#146c94";

/// The picture; nothing where there is nothing to draw.
pub(super) fn draw(
    crystal: &Crystal,
    solution: &Solution,
    picture: &LatticePicture,
) -> Option<Document> {
    Some(Canvas::new(crystal, solution, picture)?.document())
}

/// What is drawn, and on which axes.
struct Canvas<'a> {
    crystal: &'a Crystal,
    solution: &'a Solution,
    picture: &'a LatticePicture,
    trade: Trade,
    energy: EnergyAxis,
    /// Where each run of the path begins and ends.
    runs: Vec<Panel>,
}

impl<'a> Canvas<'a> {
    fn new(
        crystal: &'a Crystal,
        solution: &'a Solution,
        picture: &'a LatticePicture,
    ) -> Option<Self> {
        let trade = Trade::of(crystal);
        let lowest = solution.bands.first()?.bottom.energy.value;
        let window = (
            lowest - 0.04 * (picture.complete - lowest),
            picture.complete,
        );
        let energy = EnergyAxis::new(&trade, window).filter(|_| !picture.runs.is_empty())?;
        Some(Self {
            crystal,
            solution,
            picture,
            trade,
            energy,
            runs: side_by_side(&picture.runs),
        })
    }

    fn y(&self, energy: f64) -> f64 {
        self.energy.y(energy)
    }

    fn shown(&self, energy: f64) -> bool {
        energy >= self.energy.window.0 && energy <= self.energy.window.1
    }

    /// The runs of the path with their places on the sheet.
    fn placed(&self) -> impl Iterator<Item = (&PathRun, Place)> {
        let places = self.runs.iter();
        let runs = self.picture.runs.iter();
        runs.zip(places).map(|(run, panel)| {
            (
                run,
                Place {
                    panel: *panel,
                    length: length(run),
                },
            )
        })
    }

    fn document(&self) -> Document {
        sheet(&[("path", PATH), ("states", STATES)])
            .add(head(self.crystal, &self.trade, &self.numbers(), PATH.0))
            .add(self.gaps())
            .add(self.stops())
            .add(self.bands())
            .add(self.density())
            .add(self.edges())
            .add(self.fermi())
            .add(self.frames())
            .add(self.energy.marks(PATH.0))
            .add(self.density_axis())
    }

    /// The class, and the lowest open gaps.
    fn numbers(&self) -> Vec<String> {
        let class = self
            .solution
            .class
            .map(|class| class_word(class).to_owned());
        let gaps = self.open_gaps().take(2).map(|(number, gap, ..)| {
            format!(
                "gap {number} {} {}",
                self.trade.tell_energy(gap.size),
                gap_word(gap.kind)
            )
        });
        class.into_iter().chain(gaps).collect()
    }

    /// The open gaps below the highest band, each with the band below and above.
    fn open_gaps(&self) -> impl Iterator<Item = (usize, &Gap, &Band, &Band)> {
        let bands = &self.solution.bands;
        let gaps = self.solution.gaps.iter().enumerate();
        let pairs = gaps.zip(bands.iter().zip(bands.iter().skip(1)));
        let all = pairs.map(|((index, gap), (below, above))| (index + 1, gap, below, above));
        all.filter(|(_, gap, below, _)| {
            matches!(gap.kind, GapKind::Direct | GapKind::Indirect)
                && self.shown(below.top.energy.value)
        })
    }

    /// Stripes through both panels where no state is.
    fn gaps(&self) -> Group {
        let mut group = Group::new();
        for (number, _, below, above) in self.open_gaps() {
            let bottom = self.y(below.top.energy.value);
            let top = self.y(above.bottom.energy.value).max(TOP);
            let mut stripes = Group::new().set("class", "gap").set("data-gap", number);
            for (left, right) in [PATH, STATES] {
                let stripe = rectangle(left, top, right, bottom);
                stripes = stripes.add(stripe.set("fill", BAND).set("fill-opacity", 0.42));
            }
            group = group.add(stripes);
        }
        group
    }

    /// Lines and names where the path turns.
    fn stops(&self) -> Group {
        let mut group = Group::new();
        let mut last: Option<(f64, String)> = None;
        for (run, place) in self.placed() {
            let mut joint = "|";
            for (distance, name) in &run.stops {
                let x = place.x(*distance);
                group = group.add(line_between((x, TOP), (x, BOTTOM), FAINT, 0.8));
                let name = if name == "centre" { "Γ" } else { name };
                match last.take() {
                    // The end of one run and the beginning of the next share a label, and so do stops too near for two.
                    Some((before, other)) if x - before < 2.0 * BREAK => {
                        let both = format!("{other}{joint}{name}");
                        last = Some((0.5 * (before + x), both));
                    }
                    Some((before, other)) => {
                        group = group.add(text(&other, before, BOTTOM + 20.0, "middle", INK));
                        last = Some((x, name.to_owned()));
                    }
                    None => last = Some((x, name.to_owned())),
                }
                joint = " ";
            }
        }
        if let Some((x, name)) = last {
            group = group.add(text(&name, x, BOTTOM + 20.0, "middle", INK));
        }
        let middle = 0.5 * (PATH.0 + PATH.1);
        group.add(text("wave vector", middle, BOTTOM + 42.0, "middle", FAINT))
    }

    fn bands(&self) -> Group {
        let mut group = Group::new().set("clip-path", "url(#path)");
        let most = self.picture.runs.iter().map(|run| run.bands.len()).max();
        for index in 0..most.unwrap_or(0) {
            let solved = index < self.solution.bands.len();
            let (class, colour) = if solved {
                ("band", INK)
            } else {
                ("further", FAINT)
            };
            let mut lines = Group::new().set("class", class).set("data-band", index + 1);
            for (run, place) in self.placed() {
                let points = run.bands.get(index).into_iter().flatten();
                let points = points.map(|(distance, energy)| (place.x(*distance), self.y(*energy)));
                lines = lines.add(stroke(line_through(points), colour, 2.0));
            }
            group = group.add(lines);
        }
        group
    }

    /// Dots where the path meets the edges of the open gaps.
    fn edges(&self) -> Group {
        let mut group = Group::new().set("class", "edges");
        for (number, _, below, above) in self.open_gaps() {
            for (band, edge) in [(number - 1, &below.top), (number, &above.bottom)] {
                let y = self.y(edge.energy.value);
                if self.shown(edge.energy.value) {
                    let dots = self.places_of(band, edge).into_iter().map(|x| {
                        Circle::new()
                            .set("cx", x)
                            .set("cy", y)
                            .set("r", 4.5)
                            .set("fill", EDGE)
                    });
                    group = dots.fold(group, Group::add);
                }
            }
        }
        group
    }

    /// Where along the path an edge lies: at the stops of its name, else where each run comes close to its energy.
    fn places_of(&self, band: usize, edge: &Extremum) -> Vec<f64> {
        let named = edge.point.as_ref();
        let stops = self.placed().flat_map(|(run, place)| {
            let stops = run.stops.iter().filter(|(_, name)| Some(name) == named);
            stops.map(move |(distance, _)| place.x(*distance))
        });
        let stops: Vec<f64> = stops.collect();
        if !stops.is_empty() {
            return stops;
        }
        let near = ON_THE_PATH * (self.energy.window.1 - self.energy.window.0);
        let off = |point: &(f64, f64)| (point.1 - edge.energy.value).abs();
        let nearest = self.placed().filter_map(|(run, place)| {
            let points = run.bands.get(band)?.iter();
            let nearest = points.min_by(|one, other| off(one).total_cmp(&off(other)))?;
            (off(nearest) <= near).then(|| place.x(nearest.0))
        });
        nearest.collect()
    }

    fn fermi(&self) -> Group {
        let level = self.solution.fermi.map(|level| level.value);
        let Some(level) = level.filter(|level| self.shown(*level)) else {
            return Group::new();
        };
        let y = self.y(level);
        let mut group = Group::new().set("class", "fermi");
        for (left, right) in [PATH, STATES] {
            let line = line_between((left, y), (right, y), FILLED, 1.4);
            group = group.add(line.set("stroke-dasharray", "6 4"));
        }
        group.add(text("Fermi", STATES.1 + 8.0, y + 5.0, "start", FILLED))
    }

    fn highest_density(&self) -> f64 {
        let inside = self
            .picture
            .density
            .iter()
            .filter(|(energy, _)| self.shown(*energy));
        inside.map(|(_, density)| *density).fold(0.0, f64::max)
    }

    fn density(&self) -> Group {
        let highest = self.highest_density();
        let group = Group::new()
            .set("clip-path", "url(#states)")
            .set("class", "density");
        if !(highest.is_finite() && highest > 0.0) {
            return group;
        }
        let x = |density: f64| STATES.0 + 0.92 * density / highest * (STATES.1 - STATES.0);
        let points = || {
            self.picture
                .density
                .iter()
                .map(|(energy, density)| (x(*density), self.y(*energy)))
        };
        let outline = line_through(points());
        let area = points().fold(Data::new().move_to((STATES.0, BOTTOM)), Data::line_to);
        let area = area.line_to((STATES.0, TOP)).close();
        group
            .add(
                Path::new()
                    .set("d", area)
                    .set("fill", FILLED)
                    .set("fill-opacity", 0.16),
            )
            .add(stroke(outline, FILLED, 1.6))
    }

    fn density_axis(&self) -> Group {
        let middle = 0.5 * (STATES.0 + STATES.1);
        let per = &self.energy.scale;
        let highest = self.highest_density() * per.factor;
        let mut group = Group::new();
        for tick in ticks(0.0, highest, 2) {
            let x = STATES.0 + 0.92 * tick / highest * (STATES.1 - STATES.0);
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
        let label = format!("states per {} and cell", per.name);
        group.add(text(&label, middle, BOTTOM + 42.0, "middle", FAINT))
    }

    fn frames(&self) -> Group {
        let panels = self.runs.iter().copied().chain([STATES]);
        let frame = |(left, right): Panel| {
            rectangle(left, TOP, right, BOTTOM)
                .set("fill", "none")
                .set("stroke", FAINT)
        };
        panels.map(frame).fold(Group::new(), Group::add)
    }
}

/// Where a run stands on the sheet, and its length in its own units.
#[derive(Clone, Copy)]
struct Place {
    panel: Panel,
    length: f64,
}

impl Place {
    fn x(&self, distance: f64) -> f64 {
        self.panel.0 + distance / self.length * (self.panel.1 - self.panel.0)
    }
}

fn length(run: &PathRun) -> f64 {
    run.stops
        .last()
        .map_or(0.0, |(distance, _)| *distance)
        .max(f64::MIN_POSITIVE)
}

/// The places of the runs, their widths in proportion to their lengths.
fn side_by_side(runs: &[PathRun]) -> Vec<Panel> {
    let total: f64 = runs.iter().map(length).sum();
    let room = PATH.1 - PATH.0 - BREAK * runs.len().saturating_sub(1) as f64;
    let mut left = PATH.0;
    let place = |run| {
        let right = left + length(run) / total * room;
        let panel = (left, right);
        left = right + BREAK;
        panel
    };
    runs.iter().map(place).collect()
}

fn line_through(points: impl Iterator<Item = (f64, f64)>) -> Data {
    let step = |data: Data, (index, point): (usize, (f64, f64))| match index {
        0 => data.move_to(point),
        _ => data.line_to(point),
    };
    points.enumerate().fold(Data::new(), step)
}
