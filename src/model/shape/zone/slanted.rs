//! Points of zones whose cells have an angle of their own.

use super::sized::{SAME, dot, length};
use super::{Labels, Paper, Runs};
use crate::model::shape::centring::LatticeKind;

const HALF: f64 = 0.5;
/// Steps of a reduction: each at least halves the longer vector's part along the shorter one.
const MOST_STEPS: usize = 128;

pub(super) fn labels(kind: &LatticeKind, conventional: &[Vec<f64>]) -> Option<Labels> {
    let labels = match (kind.word, conventional) {
        ("oblique", [first, second]) => {
            let plane = Reduced::of(first, second)?;
            Labels::placed(oblique(&plane), |[_, second, third]| {
                plane.own(second, third).to_vec()
            })
        }
        ("rhombohedral", [first, second, _]) => {
            let cosine = dot(first, second) / (length(first) * length(second));
            Labels::placed(rhombohedral(cosine), |point| point.to_vec())
        }
        // The paper's unique axis is its first, ours the second.
        ("monoclinic", [first, _, third]) => {
            let plane = Reduced::of(first, third)?;
            Labels::placed(monoclinic(&plane), |[unique, second, third]| {
                let [second, third] = plane.own(second, third);
                vec![second, unique, third]
            })
        }
        ("base-monoclinic", [first, second, third]) => {
            let (sign, shift) = least_slant(first, third);
            let axis = third.iter().zip(first);
            let axis: Vec<f64> = axis
                .map(|(third, first)| sign * third + shift * first)
                .collect();
            // The paper's first primitive vector is our second, and its third is ±c + shift·a, a = p1 + p2.
            Labels::placed(
                base_monoclinic(length(second), first, &axis),
                |[first, second, third]| {
                    vec![second, first, sign * (third - shift * (first + second))]
                },
            )
        }
        ("triclinic", [first, second, third]) => {
            Labels::placed(triclinic(first, second, third), |point| point.to_vec())
        }
        _ => return None,
    };
    Some(labels)
}

/// The shortest two vectors of a plane lattice, the second at 60 to 90 degrees to the first and no shorter
/// (the reduction of Lagrange and Gauss).
struct Reduced {
    /// Its vectors as whole multiples of the ones it was made from.
    rows: [[f64; 2]; 2],
    lengths: [f64; 2],
    cosine: f64,
}

impl Reduced {
    fn of(first: &[f64], second: &[f64]) -> Option<Self> {
        let at = |[u, v]: [f64; 2]| -> Vec<f64> {
            let pairs = first.iter().zip(second);
            pairs
                .map(|(first, second)| u * first + v * second)
                .collect()
        };
        let mut rows = [[1.0, 0.0], [0.0, 1.0]];
        for _ in 0..MOST_STEPS {
            let [short, long] = rows;
            let (u, v) = (at(short), at(long));
            if dot(&v, &v) < dot(&u, &u) * (1.0 - SAME) {
                rows = [long, short];
                continue;
            }
            let share = dot(&u, &v) / dot(&u, &u);
            let turns = if share.abs() <= HALF + SAME {
                0.0
            } else {
                share.round()
            };
            if turns == 0.0 {
                let sign = if share < -SAME { -1.0 } else { 1.0 };
                let lengths = [length(&u), length(&v)];
                return Some(Self {
                    rows: [short, long.map(|part| sign * part)],
                    lengths,
                    cosine: sign * dot(&u, &v) / (lengths[0] * lengths[1]),
                });
            }
            rows[1] = [long[0] - turns * short[0], long[1] - turns * short[1]];
        }
        None
    }

    /// Fractions of its reciprocal vectors as fractions of those of the vectors it was made from: k·rᵢ = Σ Mᵢⱼ k·pⱼ.
    fn own(&self, first: f64, second: f64) -> [f64; 2] {
        let [[a, b], [c, d]] = self.rows;
        let determinant = a * d - b * c;
        [
            (d * first - b * second) / determinant,
            (a * second - c * first) / determinant,
        ]
    }
}

/// The paper's η and ν of its monoclinic zone.
fn slant(plane: &Reduced) -> (f64, f64) {
    let [b, c] = plane.lengths;
    let squared_sine = 1.0 - plane.cosine * plane.cosine;
    let eta = (1.0 - b * plane.cosine / c) / (2.0 * squared_sine);
    (eta, HALF - eta * c * plane.cosine / b)
}

/// The plane across the unique axis of the monoclinic zone, that axis left as the first of the paper's.
fn oblique(plane: &Reduced) -> (Paper, Runs) {
    let (eta, nu) = slant(plane);
    let points = vec![
        ("X", [0.0, HALF, 0.0]),
        ("Y", [0.0, 0.0, HALF]),
        ("C", [0.0, HALF, HALF]),
        ("H", [0.0, eta, 1.0 - nu]),
        ("H1", [0.0, 1.0 - eta, nu]),
        ("H2", [0.0, eta, -nu]),
    ];
    (points, &["centre Y H C H1 X centre"])
}

fn monoclinic(plane: &Reduced) -> (Paper, Runs) {
    let (eta, nu) = slant(plane);
    let points = vec![
        ("A", [HALF, HALF, 0.0]),
        ("C", [0.0, HALF, HALF]),
        ("D", [HALF, 0.0, HALF]),
        ("E", [HALF, HALF, HALF]),
        ("X", [0.0, HALF, 0.0]),
        ("Y", [0.0, 0.0, HALF]),
        ("Z", [HALF, 0.0, 0.0]),
        ("D1", [HALF, 0.0, -HALF]),
        ("Y1", [0.0, 0.0, -HALF]),
        ("H", [0.0, eta, 1.0 - nu]),
        ("H1", [0.0, 1.0 - eta, nu]),
        ("H2", [0.0, eta, -nu]),
        ("M", [HALF, eta, 1.0 - nu]),
        ("M1", [HALF, 1.0 - eta, nu]),
        ("M2", [HALF, eta, -nu]),
    ];
    (points, &["centre Y H C E M1 A X H1", "M D Z", "Y D"])
}

fn rhombohedral(cosine: f64) -> (Paper, Runs) {
    if cosine > 0.0 {
        let eta = (1.0 + 4.0 * cosine) / (2.0 + 4.0 * cosine);
        let nu = 0.75 - eta / 2.0;
        let points = vec![
            ("F", [HALF, HALF, 0.0]),
            ("L", [HALF, 0.0, 0.0]),
            ("L1", [0.0, 0.0, -HALF]),
            ("Z", [HALF, HALF, HALF]),
            ("B", [eta, HALF, 1.0 - eta]),
            ("B1", [HALF, 1.0 - eta, eta - 1.0]),
            ("P", [eta, nu, nu]),
            ("P1", [1.0 - nu, 1.0 - nu, 1.0 - eta]),
            ("P2", [nu, nu, eta - 1.0]),
            ("Q", [1.0 - nu, nu, 0.0]),
            ("X", [nu, 0.0, -nu]),
        ];
        return (points, &["centre L B1", "B Z centre X", "Q F P1 Z", "L P"]);
    }
    // 1/(2 tan²(α/2)), with tan²(α/2) = (1 − cos α)/(1 + cos α).
    let eta = (1.0 + cosine) / (2.0 * (1.0 - cosine));
    let nu = 0.75 - eta / 2.0;
    let points = vec![
        ("F", [HALF, -HALF, 0.0]),
        ("L", [HALF, 0.0, 0.0]),
        ("Z", [HALF, -HALF, HALF]),
        ("P", [1.0 - nu, -nu, 1.0 - nu]),
        ("P1", [nu, nu - 1.0, nu - 1.0]),
        ("Q", [eta, eta, eta]),
        ("Q1", [1.0 - eta, -eta, -eta]),
    ];
    (points, &["centre P Z Q centre F P1 Q1 L Z"])
}

/// The sign of c, and the multiple of a to add to it, that bring it nearest to a right angle with a, at most there.
fn least_slant(a: &[f64], c: &[f64]) -> (f64, f64) {
    let share = dot(a, c) / dot(a, a);
    let turns = if share.abs() <= HALF + SAME {
        0.0
    } else {
        share.round()
    };
    if share - turns < -SAME {
        (-1.0, turns)
    } else {
        (1.0, -turns)
    }
}

/// `a` is the unique axis, `b` the axis whose face with it is centred.
fn base_monoclinic(a: f64, b: &[f64], c: &[f64]) -> (Paper, Runs) {
    let cosine = dot(b, c) / (length(b) * length(c));
    let squared_sine = 1.0 - cosine * cosine;
    let ratios = Ratios {
        squared: dot(b, b) / (a * a),
        along: length(b) * cosine / length(c),
        across: length(c) * cosine / length(b),
        skew: length(b) * length(c) * cosine / (a * a),
        squared_sine,
    };
    // The angle between the first two reciprocal vectors is obtuse where this is positive.
    let balance = ratios.squared * squared_sine - 1.0;
    if balance > -SAME {
        return base_monoclinic_long(&ratios, balance <= SAME);
    }
    let reach = ratios.along + ratios.squared * squared_sine - 1.0;
    if reach > SAME {
        base_monoclinic_far(&ratios)
    } else {
        base_monoclinic_near(&ratios, reach >= -SAME)
    }
}

/// What the base-centred monoclinic formulas are written in: b²/a², b cos α/c, c cos α/b, b c cos α/a², sin² α.
struct Ratios {
    squared: f64,
    along: f64,
    across: f64,
    skew: f64,
    squared_sine: f64,
}

/// The paper's first and second case.
fn base_monoclinic_long(ratios: &Ratios, square: bool) -> (Paper, Runs) {
    let zeta = (2.0 - ratios.along) / (4.0 * ratios.squared_sine);
    let eta = HALF + 2.0 * zeta * ratios.across;
    let psi = 0.75 - 1.0 / (4.0 * ratios.squared * ratios.squared_sine);
    let phi = psi + (0.75 - psi) * ratios.along;
    let points = vec![
        ("N", [HALF, 0.0, 0.0]),
        ("N1", [0.0, -HALF, 0.0]),
        ("L", [HALF, HALF, HALF]),
        ("M", [HALF, 0.0, HALF]),
        ("Y", [HALF, HALF, 0.0]),
        ("Y1", [-HALF, -HALF, 0.0]),
        ("Z", [0.0, 0.0, HALF]),
        ("F", [1.0 - zeta, 1.0 - zeta, 1.0 - eta]),
        ("F1", [zeta, zeta, eta]),
        ("F2", [-zeta, -zeta, 1.0 - eta]),
        ("I", [phi, 1.0 - phi, HALF]),
        ("I1", [1.0 - phi, phi - 1.0, HALF]),
        ("X", [1.0 - psi, psi - 1.0, 0.0]),
        ("X1", [psi, 1.0 - psi, 0.0]),
        ("X2", [psi - 1.0, -psi, 0.0]),
    ];
    if square {
        return (points, &["centre Y F L I", "I1 Z F1", "N centre M"]);
    }
    let runs = &[
        "centre Y F L I",
        "I1 Z F1",
        "Y X1",
        "X centre N",
        "M centre",
    ];
    (points, runs)
}

/// The points that its third to fifth case share.
fn base_monoclinic_short(zeta: f64, eta: f64, mu: f64, delta: f64) -> Paper {
    vec![
        ("M", [HALF, 0.0, HALF]),
        ("N", [HALF, 0.0, 0.0]),
        ("N1", [0.0, -HALF, 0.0]),
        ("X", [HALF, -HALF, 0.0]),
        ("Z", [0.0, 0.0, HALF]),
        ("H", [zeta, zeta, eta]),
        ("H1", [1.0 - zeta, -zeta, 1.0 - eta]),
        ("H2", [-zeta, -zeta, 1.0 - eta]),
        ("Y", [mu, mu, delta]),
        ("Y1", [1.0 - mu, -mu, -delta]),
        ("Y2", [-mu, -mu, -delta]),
        ("Y3", [mu, mu - 1.0, delta]),
    ]
}

/// The paper's third and fourth case.
fn base_monoclinic_near(ratios: &Ratios, square: bool) -> (Paper, Runs) {
    let mu = (1.0 + ratios.squared) / 4.0;
    let delta = ratios.skew / 2.0;
    let zeta = mu - 0.25 + (1.0 - ratios.along) / (4.0 * ratios.squared_sine);
    let eta = HALF + 2.0 * zeta * ratios.across;
    let phi = 1.0 + zeta - 2.0 * mu;
    let psi = eta - 2.0 * delta;
    let mut points = base_monoclinic_short(zeta, eta, mu, delta);
    points.extend([
        ("I", [HALF, -HALF, HALF]),
        ("F", [1.0 - phi, 1.0 - phi, 1.0 - psi]),
        ("F1", [phi, phi - 1.0, psi]),
        ("F2", [1.0 - phi, -phi, 1.0 - psi]),
    ]);
    if square {
        return (
            points,
            &["centre Y F H Z I", "H1 Y1 X centre N", "M centre"],
        );
    }
    let runs = &["centre Y F H Z I F1", "H1 Y1 X centre N", "M centre"];
    (points, runs)
}

/// The paper's fifth case.
fn base_monoclinic_far(ratios: &Ratios) -> (Paper, Runs) {
    let zeta = (ratios.squared + (1.0 - ratios.along) / ratios.squared_sine) / 4.0;
    let eta = HALF + 2.0 * zeta * ratios.across;
    let mu = eta / 2.0 + ratios.squared / 4.0 - ratios.skew / 2.0;
    let nu = 2.0 * mu - zeta;
    let omega = (4.0 * nu - 1.0 - ratios.squared * ratios.squared_sine) / (2.0 * ratios.along);
    let delta = zeta * ratios.across + omega / 2.0 - 0.25;
    let rho = 1.0 - zeta / ratios.squared;
    let mut points = base_monoclinic_short(zeta, eta, mu, delta);
    points.extend([
        ("L", [HALF, HALF, HALF]),
        ("I", [rho, 1.0 - rho, HALF]),
        ("I1", [1.0 - rho, rho - 1.0, HALF]),
        ("F", [nu, nu, omega]),
        ("F1", [1.0 - nu, 1.0 - nu, 1.0 - omega]),
        ("F2", [nu, nu - 1.0, omega]),
    ]);
    let runs: Runs = &[
        "centre Y F L I",
        "I1 Z H F1",
        "H1 Y1 X centre N",
        "M centre",
    ];
    (points, runs)
}

/// The labels of the paper's two cases: the reciprocal vectors all at right or obtuse angles, or all at right or acute
/// ones. Vectors that mix the two have the first case's.
fn triclinic(a: &[f64], b: &[f64], c: &[f64]) -> (Paper, Runs) {
    // bᵢ·bⱼ has the sign of (aⱼ·aₖ)(aₖ·aᵢ) − (aⱼ·aᵢ)(aₖ·aₖ).
    let leans = |one: &[f64], other: &[f64], third: &[f64]| {
        let lean = dot(other, third) * dot(third, one) - dot(other, one) * dot(third, third);
        lean / (length(one) * length(other) * dot(third, third))
    };
    let acute = [leans(a, b, c), leans(b, c, a), leans(c, a, b)];
    let runs = &["X centre Y", "L centre Z", "N centre M", "R centre"];
    let points = if acute.iter().all(|lean| *lean > -SAME) && acute.iter().any(|lean| *lean > SAME)
    {
        vec![
            ("L", [HALF, -HALF, 0.0]),
            ("M", [0.0, 0.0, HALF]),
            ("N", [-HALF, -HALF, HALF]),
            ("R", [0.0, -HALF, HALF]),
            ("X", [0.0, -HALF, 0.0]),
            ("Y", [HALF, 0.0, 0.0]),
            ("Z", [-HALF, 0.0, HALF]),
        ]
    } else {
        vec![
            ("L", [HALF, HALF, 0.0]),
            ("M", [0.0, HALF, HALF]),
            ("N", [HALF, 0.0, HALF]),
            ("R", [HALF, HALF, HALF]),
            ("X", [HALF, 0.0, 0.0]),
            ("Y", [0.0, HALF, 0.0]),
            ("Z", [0.0, 0.0, HALF]),
        ]
    };
    (points, runs)
}
