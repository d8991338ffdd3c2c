//! Lowest eigenpairs of a real symmetric tridiagonal matrix: Sturm counts and inverse iteration (see `eigen.rs`).

/// Shifts counted side by side, so that the divisions overlap.
const LANES: usize = 8;

/// The number of eigenvalues below each shift.
fn below(diagonal: &[f64], squares: &[f64], tiny: f64, shifts: &[f64; LANES]) -> [usize; LANES] {
    let mut q = [1.0; LANES];
    let mut counts = [0.0; LANES];
    for (d, e) in diagonal.iter().zip(squares) {
        for lane in 0..LANES {
            let next = d - shifts[lane] - e / q[lane];
            // A vanishing q counts as negative and must not divide.
            let next = if next.abs() < tiny { -tiny } else { next };
            counts[lane] += if next < 0.0 { 1.0 } else { 0.0 };
            q[lane] = next;
        }
    }
    counts.map(|count: f64| count as usize)
}

/// The lowest `count` eigenvalues of a tridiagonal matrix, to rounding of its norm.
pub(super) fn sturm(diagonal: &[f64], beside: &[f64], count: usize) -> Vec<f64> {
    let n = diagonal.len();
    // squares[i] is e² between i−1 and i.
    let squares: Vec<f64> = std::iter::once(0.0)
        .chain(beside.iter().map(|e| e * e))
        .collect();
    let radius = |i: usize| {
        (if i > 0 { beside[i - 1] } else { 0.0 }) + beside.get(i).copied().unwrap_or(0.0)
    };
    let floor = (0..n)
        .map(|i| diagonal[i] - radius(i))
        .fold(f64::INFINITY, f64::min);
    let ceiling = (0..n)
        .map(|i| diagonal[i] + radius(i))
        .fold(f64::NEG_INFINITY, f64::max);
    let norm = floor.abs().max(ceiling.abs()).max(f64::MIN_POSITIVE);
    let tiny = (f64::EPSILON * f64::EPSILON * norm).max(f64::MIN_POSITIVE / f64::EPSILON);
    let slack = 4.0 * f64::EPSILON * norm;
    let mut low = vec![floor - slack; count];
    let mut high = vec![ceiling + slack; count];
    // 60 halvings take any interval to rounding.
    for _ in 0..60 {
        let open: Vec<usize> = (0..count)
            .filter(|j| {
                high[*j] - low[*j]
                    > 2.0 * f64::EPSILON * low[*j].abs().max(high[*j].abs())
                        + 0.25 * f64::EPSILON * norm
            })
            .collect();
        if open.is_empty() {
            break;
        }
        for group in open.chunks(LANES) {
            let shifts = spread(group, &low, &high);
            let counts = below(diagonal, &squares, tiny, &shifts);
            for (shift, found) in shifts.iter().zip(counts) {
                for j in 0..count {
                    if found > j {
                        high[j] = high[j].min(*shift);
                    } else {
                        low[j] = low[j].max(*shift);
                    }
                }
            }
        }
    }
    (0..count).map(|j| 0.5 * (low[j] + high[j])).collect()
}

/// Shifts that cut the intervals of these eigenvalues; intervals that coincide share theirs out evenly, and lanes to
/// spare go round again.
fn spread(group: &[usize], low: &[f64], high: &[f64]) -> [f64; LANES] {
    let same = |a: usize, b: usize| low[a] == low[b] && high[a] == high[b];
    let lane_of = |lane: usize| group[lane % group.len()];
    std::array::from_fn(|lane| {
        let j = lane_of(lane);
        let sharers = (0..LANES).filter(|other| same(lane_of(*other), j)).count();
        let rank = (0..lane).filter(|other| same(lane_of(*other), j)).count();
        low[j] + (high[j] - low[j]) * (rank + 1) as f64 / (sharers + 1) as f64
    })
}

/// Vectors of a tridiagonal matrix for eigenvalues in rising order; `None` where residuals or orthogonality are poor.
pub(super) fn inverse_iteration(
    diagonal: &[f64],
    beside: &[f64],
    values: &[f64],
) -> Option<Vec<Vec<f64>>> {
    let n = diagonal.len();
    let norm = (0..n)
        .map(|i| {
            diagonal[i].abs()
                + beside.get(i).copied().unwrap_or(0.0)
                + if i > 0 { beside[i - 1] } else { 0.0 }
        })
        .fold(0.0, f64::max);
    let apart = 1e-3 * norm;
    let step = 2.0 * f64::EPSILON * norm;
    let mut vectors: Vec<Vec<f64>> = Vec::new();
    let mut first = 0;
    let mut shift = f64::NEG_INFINITY;
    let mut seed = 0x9e37_79b9_7f4a_7c15_u64;
    for (j, value) in values.iter().enumerate() {
        if j > 0 && value - values[j - 1] > apart {
            first = j;
        }
        // Equal eigenvalues are told apart by a few roundings, so that each factorisation is its own.
        shift = if j > first {
            value.max(shift + step)
        } else {
            *value
        };
        let factors = Tridiagonal::new(diagonal, beside, shift, step);
        let mut vector: Vec<f64> = (0..n).map(|_| random(&mut seed)).collect();
        for _ in 0..3 {
            factors.solve(&mut vector);
            for _ in 0..2 {
                for other in &vectors[first..j] {
                    let overlap: f64 = other.iter().zip(&vector).map(|(a, b)| a * b).sum();
                    for (x, y) in vector.iter_mut().zip(other) {
                        *x -= overlap * y;
                    }
                }
                scale(&mut vector)?;
            }
        }
        if residual(diagonal, beside, *value, &vector) > 1e-13 * norm * (n as f64).sqrt() {
            return None;
        }
        vectors.push(vector);
    }
    Some(vectors)
}

/// Scales to length one; `None` where there is nothing left.
fn scale(vector: &mut [f64]) -> Option<()> {
    let largest = vector.iter().fold(0.0, |a: f64, x| a.max(x.abs()));
    if !(largest > 0.0 && largest.is_finite()) {
        return None;
    }
    let length = vector
        .iter()
        .map(|x| (x / largest).powi(2))
        .sum::<f64>()
        .sqrt();
    for x in vector.iter_mut() {
        *x = *x / largest / length;
    }
    Some(())
}

/// A number in [−½, ½) of a repeatable sequence.
pub(super) fn random(seed: &mut u64) -> f64 {
    *seed ^= *seed << 13;
    *seed ^= *seed >> 7;
    *seed ^= *seed << 17;
    (*seed >> 11) as f64 / (1_u64 << 53) as f64 - 0.5
}

/// |T v − λ v|.
fn residual(diagonal: &[f64], beside: &[f64], value: f64, vector: &[f64]) -> f64 {
    let n = diagonal.len();
    (0..n)
        .map(|i| {
            let mut r = (diagonal[i] - value) * vector[i];
            if i > 0 {
                r += beside[i - 1] * vector[i - 1];
            }
            if i + 1 < n {
                r += beside[i] * vector[i + 1];
            }
            r * r
        })
        .sum::<f64>()
        .sqrt()
}

/// T − λ factored by elimination with row exchanges: U has two bands above its diagonal.
struct Tridiagonal {
    upper: Vec<[f64; 3]>,
    factors: Vec<(f64, bool)>,
}

impl Tridiagonal {
    fn new(diagonal: &[f64], beside: &[f64], shift: f64, tiny: f64) -> Self {
        let n = diagonal.len();
        let mut upper = Vec::with_capacity(n);
        let mut factors = Vec::with_capacity(n);
        let mut row = [
            diagonal[0] - shift,
            beside.first().copied().unwrap_or(0.0),
            0.0,
        ];
        for i in 1..n {
            let e = beside[i - 1];
            let next = [
                e,
                diagonal[i] - shift,
                beside.get(i).copied().unwrap_or(0.0),
            ];
            if row[0].abs() >= e.abs() {
                let pivot = if row[0].abs() < tiny {
                    tiny.copysign(row[0])
                } else {
                    row[0]
                };
                let factor = e / pivot;
                upper.push([pivot, row[1], row[2]]);
                factors.push((factor, false));
                row = [next[1] - factor * row[1], next[2] - factor * row[2], 0.0];
            } else {
                let factor = row[0] / e;
                upper.push(next);
                factors.push((factor, true));
                row = [row[1] - factor * next[1], row[2] - factor * next[2], 0.0];
            }
        }
        row[0] = if row[0].abs() < tiny {
            tiny.copysign(row[0])
        } else {
            row[0]
        };
        upper.push(row);
        Self { upper, factors }
    }

    fn solve(&self, vector: &mut [f64]) {
        let n = vector.len();
        for (i, (factor, exchanged)) in self.factors.iter().enumerate() {
            if *exchanged {
                vector.swap(i, i + 1);
            }
            vector[i + 1] -= factor * vector[i];
        }
        for i in (0..n).rev() {
            let [pivot, one, two] = self.upper[i];
            let mut x = vector[i];
            if i + 1 < n {
                x -= one * vector[i + 1];
            }
            if i + 2 < n {
                x -= two * vector[i + 2];
            }
            vector[i] = x / pivot;
        }
    }
}
