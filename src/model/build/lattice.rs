//! What repeats: lattice statements as vectors.

use super::crystal::CrystalBuild;
use super::takeover::Taken;
use crate::model::evaluate::{Context, is_bare};
use crate::model::shape::centring::{Centring, LATTICE_KINDS, LatticeKind, lattice_kind};
use crate::model::words::nearest;
use crate::model::{Dimension, Dual, Scalar, TroubleKind};
use crate::syntax::{LatticeForm, Position, StatementKind, Value};

/// Below this volume, as a share of the product of the lengths, vectors count as dependent.
const FLATTEST: f64 = 1e-9;

impl<'w> CrystalBuild<'_, 'w> {
    /// Reads the lattice statement; the dimension is known afterwards wherever it says one.
    pub(super) fn lattice(&mut self) {
        let Some(taken) = self.statements.single("lattice") else {
            if !self.statements.layers.is_empty() {
                self.crystal.dimension = 1;
            }
            return;
        };
        let StatementKind::Lattice(form) = &taken.statement.kind else {
            return;
        };
        if form.kind.text == "vectors" {
            self.free_vectors(form, taken);
            return;
        }
        let context = self.context(taken);
        let Some(kind) = lattice_kind(&form.kind.text, form.axis.is_some()) else {
            let names = LATTICE_KINDS.iter().map(|kind| kind.word);
            let trouble = TroubleKind::UnknownName {
                name: form.kind.text.clone(),
                wanted: "lattice",
                nearest: nearest(&form.kind.text, names),
            };
            self.evaluator
                .fail::<()>(trouble, context.place(form.kind.span));
            return;
        };
        self.crystal.dimension = kind.dimension;
        self.crystal.lattice_kind = Some(kind.word.to_owned());
        if let Some(conventional) = self.named_vectors(kind, form, taken, &context) {
            self.crystal.vectors = primitive_of(kind.centring, &conventional);
            self.crystal.conventional = conventional;
        }
    }

    fn named_vectors(
        &mut self,
        kind: &LatticeKind,
        form: &'w LatticeForm,
        taken: Taken<'w>,
        context: &Context<'_, 'w>,
    ) -> Option<Vec<Vec<Dual>>> {
        let place = taken.home.place(taken.statement.span);
        let fits = form.lengths.len() == kind.lengths
            && form.axis.is_some() == kind.axis
            && form.angles.len() == kind.angles
            && form.vectors.is_empty();
        if !fits {
            let what = format!("this lattice is written `{}`", kind.pattern);
            return self.evaluator.bad(place, what);
        }
        let mut sizes = Vec::new();
        let mut complete = true;
        for value in form.lengths.iter().chain(&form.axis) {
            let what = "a lattice length";
            match self
                .evaluator
                .positive(value, Dimension::LENGTH, what, context)
            {
                Some(size) => sizes.push(size),
                None => complete = false,
            }
        }
        let mut angles = Vec::new();
        for value in &form.angles {
            match self.angle(value, context) {
                Some(angle) => angles.push(angle),
                None => complete = false,
            }
        }
        if !complete {
            return None;
        }
        let vectors = vectors_of(kind, &sizes, &angles);
        if vectors.is_none() {
            let what = impossible_angles(&angles);
            return self
                .evaluator
                .fail(TroubleKind::FlatLattice { what }, place);
        }
        vectors
    }

    fn angle(&mut self, value: &'w Value, context: &Context<'_, 'w>) -> Option<Dual> {
        let angle = self
            .evaluator
            .quantity_of(value, Dimension::NUMBER, context)?;
        let bare = is_bare(&value.expression);
        let within = angle.value < std::f64::consts::PI || bare;
        // A bare angle above π was likely meant in degrees: that is said elsewhere, and it stays what is written.
        if angle.value > 0.0 && within && angle.value.sin().abs() > FLATTEST {
            return Some(angle);
        }
        let degrees = angle.value.to_degrees();
        let what = format!("an angle of {degrees:.6} degrees is not between 0 and 180 degrees");
        self.evaluator
            .fail(TroubleKind::FlatLattice { what }, context.place(value.span))
    }

    fn free_vectors(&mut self, form: &'w LatticeForm, taken: Taken<'w>) {
        let context = self.context(taken);
        let place = taken.home.place(taken.statement.span);
        let dimension = form.vectors.len();
        if !(1..=3).contains(&dimension) {
            let what = format!("a lattice has one to three vectors, not {dimension}");
            self.evaluator.bad::<()>(place, what);
            return;
        }
        self.crystal.dimension = dimension;
        self.crystal.lattice_kind = Some("vectors".to_owned());
        let rows: Vec<Option<Vec<Dual>>> = form
            .vectors
            .iter()
            .map(|vector| self.free_vector(vector, dimension, &context))
            .collect();
        let Some(rows) = rows.into_iter().collect::<Option<Vec<_>>>() else {
            return;
        };
        let flatness = volume(&rows).abs() / rows.iter().map(|row| length(row)).product::<f64>();
        if flatness.is_nan() || flatness < FLATTEST {
            let what = match dimension {
                1 => "the vector has no length",
                2 => "the two vectors are parallel",
                _ => "the three vectors lie in one plane",
            };
            let what = what.to_owned();
            self.evaluator
                .fail::<()>(TroubleKind::FlatLattice { what }, place);
            return;
        }
        self.crystal.vectors.clone_from(&rows);
        self.crystal.conventional = rows;
    }

    fn free_vector(
        &mut self,
        vector: &'w Position,
        dimension: usize,
        context: &Context<'_, 'w>,
    ) -> Option<Vec<Dual>> {
        if vector.entries.len() != dimension {
            let needs = format!("{dimension} lengths in each of its {dimension} vectors");
            return self.evaluator.wrong_dimension(
                "lattice vectors",
                needs,
                context.place(vector.span),
            );
        }
        let entries: Vec<Option<Dual>> = vector
            .entries
            .iter()
            .map(|entry| {
                self.evaluator
                    .quantity_of(entry, Dimension::LENGTH, context)
            })
            .collect();
        entries.into_iter().collect()
    }

    /// The centring of the crystal's lattice.
    pub(super) fn centring(&self) -> Centring {
        self.crystal.centring()
    }
}

/// The conventional vectors; `None` where the angles give no cell.
fn vectors_of(kind: &LatticeKind, sizes: &[Dual], angles: &[Dual]) -> Option<Vec<Vec<Dual>>> {
    let zero = || Dual::constant(0.0);
    let size = |index: usize| {
        sizes
            .get(index)
            .or(sizes.first())
            .cloned()
            .unwrap_or_default()
    };
    let (a, b, c) = (size(0), size(1), size(2));
    let last = sizes.last().cloned().unwrap_or_default();
    let upright = |a: Dual, b: Dual, c: Dual| {
        Some(vec![
            vec![a, zero(), zero()],
            vec![zero(), b, zero()],
            vec![zero(), zero(), c],
        ])
    };
    let degrees_120 = 2.0 * std::f64::consts::FRAC_PI_3;
    match (kind.word, kind.dimension) {
        ("chain", _) => Some(vec![vec![a]]),
        ("square" | "rectangular" | "centred-rectangular", _) => {
            Some(vec![vec![a, zero()], vec![zero(), b]])
        }
        ("hexagonal", 2) => Some(flat_pair(&a, &a, &Dual::constant(degrees_120))),
        ("oblique", _) => Some(flat_pair(&a, &b, angles.first()?)),
        ("cubic" | "fcc" | "bcc", _) => upright(a.clone(), a.clone(), a),
        ("tetragonal" | "body-tetragonal", _) => upright(a.clone(), a, last),
        ("hexagonal", _) => Some(prism(&a, &last, &Dual::constant(degrees_120))),
        ("rhombohedral", _) => {
            let angle = angles.first()?;
            oblique_cell([&a, &a, &a], [angle, angle, angle])
        }
        ("monoclinic" | "base-monoclinic", _) => {
            let (sine, cosine) = (angles.first()?.sine(), angles.first()?.cosine());
            Some(vec![
                vec![a, zero(), zero()],
                vec![zero(), b, zero()],
                vec![c.times(&cosine), zero(), c.times(&sine)],
            ])
        }
        ("triclinic", _) => match angles {
            [alpha, beta, gamma] => oblique_cell([&a, &b, &c], [alpha, beta, gamma]),
            _ => None,
        },
        _ => upright(a, b, c),
    }
}

/// Two vectors in the plane at an angle, the first along x. The sine and cosine of 120° are exact here.
fn flat_pair(a: &Dual, b: &Dual, angle: &Dual) -> Vec<Vec<Dual>> {
    let exact =
        angle.slopes.is_empty() && (angle.value - 2.0 * std::f64::consts::FRAC_PI_3).abs() < 1e-15;
    let (cosine, sine) = if exact {
        (Dual::constant(-0.5), Dual::constant(0.75_f64.sqrt()))
    } else {
        (angle.cosine(), angle.sine())
    };
    vec![
        vec![a.clone(), Dual::constant(0.0)],
        vec![b.times(&cosine), b.times(&sine)],
    ]
}

fn prism(a: &Dual, c: &Dual, angle: &Dual) -> Vec<Vec<Dual>> {
    let mut vectors = flat_pair(a, a, angle);
    for vector in &mut vectors {
        vector.push(Dual::constant(0.0));
    }
    vectors.push(vec![Dual::constant(0.0), Dual::constant(0.0), c.clone()]);
    vectors
}

/// Three vectors with angles α (second, third), β (first, third), γ (first, second):
/// the third is c·(cos β, (cos α − cos β cos γ)/sin γ, √(1 − …)).
fn oblique_cell(lengths: [&Dual; 3], angles: [&Dual; 3]) -> Option<Vec<Vec<Dual>>> {
    let [a, b, c] = lengths;
    let [alpha, beta, gamma] = angles;
    let sine = gamma.sine();
    let x = beta.cosine();
    let y = alpha.cosine().minus(&x.times(&gamma.cosine())).over(&sine);
    let rest = Dual::constant(1.0).minus(&x.squared()).minus(&y.squared());
    if rest.value.is_nan() || rest.value <= FLATTEST {
        return None;
    }
    let zero = Dual::constant(0.0);
    Some(vec![
        vec![a.clone(), zero.clone(), zero.clone()],
        vec![b.times(&gamma.cosine()), b.times(&sine), zero],
        vec![c.times(&x), c.times(&y), c.times(&rest.root())],
    ])
}

fn impossible_angles(angles: &[Dual]) -> String {
    let degrees: Vec<String> = angles
        .iter()
        .map(|angle| {
            format!("{:.6}", angle.value.to_degrees())
                .trim_end_matches('0')
                .trim_end_matches('.')
                .to_owned()
        })
        .collect();
    format!(
        "no cell has the angles {} degrees: each must be less than the two others together, and all less than a full turn",
        degrees.join(", ")
    )
}

/// p_i = Σ_j C_ij·a_j
fn primitive_of(centring: Centring, conventional: &[Vec<Dual>]) -> Vec<Vec<Dual>> {
    if centring == Centring::Primitive {
        return conventional.to_vec();
    }
    let rows = centring.doubled();
    rows.iter()
        .take(conventional.len())
        .map(|row| {
            (0..conventional.len())
                .map(|axis| {
                    let parts = row
                        .iter()
                        .zip(conventional)
                        .filter(|(factor, _)| **factor != 0);
                    parts.fold(Dual::constant(0.0), |sum, (factor, vector)| {
                        let half = if *factor == 2 {
                            1.0
                        } else if *factor < 0 {
                            -0.5
                        } else {
                            0.5
                        };
                        let entry = vector.get(axis).cloned().unwrap_or_default();
                        sum.plus(&entry.scaled(half))
                    })
                })
                .collect()
        })
        .collect()
}

fn length(vector: &[Dual]) -> f64 {
    vector
        .iter()
        .map(|entry| entry.value * entry.value)
        .sum::<f64>()
        .sqrt()
}

/// Signed length, area or volume of the cell.
pub(super) fn volume(vectors: &[Vec<Dual>]) -> f64 {
    let rows: Vec<Vec<f64>> = vectors
        .iter()
        .map(|row| row.iter().map(|entry| entry.value).collect())
        .collect();
    match rows.as_slice() {
        [a] => a.first().copied().unwrap_or(0.0),
        [a, b] => match (a.as_slice(), b.as_slice()) {
            ([ax, ay], [bx, by]) => ax * by - ay * bx,
            _ => 0.0,
        },
        [a, b, c] => match (a.as_slice(), b.as_slice(), c.as_slice()) {
            ([ax, ay, az], [bx, by, bz], [cx, cy, cz]) => {
                ax * (by * cz - bz * cy) - ay * (bx * cz - bz * cx) + az * (bx * cy - by * cx)
            }
            _ => 0.0,
        },
        _ => 0.0,
    }
}
