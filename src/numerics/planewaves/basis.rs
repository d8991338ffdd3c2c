//! A crystal made ready: reciprocal lattice, symmetry, and the table of V(G) that matrices are filled from.

use super::eigen::Scalar;
use super::lattice::{Frame, add, dot, real};
use super::symmetry::{Symmetry, find_symmetry, rotate_real};
use super::{Decay, Error, Lattice, Potential};
use faer::Mat;
use nalgebra::Complex;
use std::f64::consts::PI;
use std::sync::{Arc, Mutex, PoisonError};

/// A lattice and a potential, made ready for any number of solves.
pub struct Waves<'a> {
    pub(super) frame: Frame,
    pub(super) potential: Potential<'a>,
    pub(super) symmetry: Symmetry,
    /// V(0).
    pub(super) mean: f64,
    /// (Σ |V(G)|²)^½ over the components looked at, G ≠ 0: the size of the potential.
    pub(super) swing: f64,
    /// The components other than V(0), where they end and are few.
    pub(super) few: Option<Vec<Component>>,
    table: Mutex<Option<Arc<Table>>>,
}

/// An index and V there.
pub(super) type Component = ([i32; 3], Complex<f64>);

/// V(G)·e^{iG·τ} on a box of indices, τ the origin of inversion (0 where there is none).
#[derive(Debug)]
pub(super) struct Table {
    half: [i32; 3],
    stride: [isize; 3],
    centre: isize,
    values: Vec<Complex<f64>>,
    /// V is known for all |G| up to here; zero is stored beyond.
    pub reach: f64,
}

impl Table {
    /// V(n − m) for rows n and columns m, all differences inside the box.
    pub fn rectangle<T: Scalar>(&self, rows: &[[i32; 3]], columns: &[[i32; 3]]) -> Mat<T> {
        let places: Vec<isize> = rows.iter().map(|n| self.offset(*n)).collect();
        let mut matrix = Mat::<T>::zeros(rows.len(), columns.len());
        for (j, column) in columns.iter().enumerate() {
            let base = self.centre - self.offset(*column);
            for (i, place) in places.iter().enumerate() {
                matrix[(i, j)] = T::from_complex(self.values[(base + place) as usize]);
            }
        }
        matrix
    }

    fn offset(&self, n: [i32; 3]) -> isize {
        (0..3).map(|i| n[i] as isize * self.stride[i]).sum()
    }

    fn covers(&self, reach: f64, half: [i32; 3]) -> bool {
        self.reach >= reach && (0..3).all(|i| self.half[i] >= half[i])
    }
}

impl<'a> Waves<'a> {
    /// Makes a crystal ready: finds its symmetry and its origin of inversion.
    ///
    /// # Errors
    /// `FlatLattice`; `NotFinite` for a component that is not finite.
    pub fn new(lattice: &Lattice, potential: Potential<'a>) -> Result<Self, Error> {
        let frame = Frame::new(lattice)?;
        let sample = sample(&frame, &potential)?;
        let swing = sample
            .iter()
            .filter(|(n, _)| *n != [0; 3])
            .map(|(_, v)| v.norm_sqr())
            .sum::<f64>()
            .sqrt();
        let symmetry = find_symmetry(&frame, &sample);
        let some: Vec<_> = sample
            .iter()
            .copied()
            .filter(|(n, v)| *n != [0; 3] && v.norm() > 0.0)
            .collect();
        let whole = match potential.decay {
            Decay::Finite { radius } => radius * radius <= frame.cut_for(few(frame.dimension)),
            Decay::Bounded(_) => false,
        };
        Ok(Self {
            mean: (potential.components)([0; 3]).re,
            frame,
            potential,
            symmetry,
            swing,
            few: (whole && some.len() <= 150).then_some(some),
            table: Mutex::new(None),
        })
    }

    /// Whether an origin of inversion exists, so that matrices are real.
    pub fn is_real(&self) -> bool {
        self.symmetry.inversion.is_some()
    }

    /// The number of operations that leave every band unchanged, k → −k included.
    pub fn operations(&self) -> usize {
        self.symmetry.operations.len()
    }

    /// Whether two wave vectors have the same levels by symmetry: equal up to an operation and a reciprocal vector.
    pub fn same_point(&self, one: [f64; 3], other: [f64; 3]) -> bool {
        self.symmetry.operations.iter().any(|m| {
            let image = rotate_real(m, one);
            (0..3).all(|i| {
                let apart = image[i] - other[i];
                (apart - apart.round()).abs() < 1e-5
            })
        })
    }

    /// The factor e^{−iG·τ} that takes a coefficient back from the gauge in which matrices are real.
    pub(super) fn gauge(&self, n: [i32; 3]) -> Complex<f64> {
        match self.symmetry.inversion {
            Some(origin) => Complex::cis(-2.0 * PI * dot(real(n), origin)),
            None => Complex::new(1.0, 0.0),
        }
    }

    /// A table that knows V up to |G| = `reach` and holds every difference within `half`.
    pub(super) fn table(&self, reach: f64, half: [i32; 3]) -> Result<Arc<Table>, Error> {
        let mut slot = self.table.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(table) = slot.as_ref().filter(|table| table.covers(reach, half)) {
            return Ok(Arc::clone(table));
        }
        // A margin, for the bases of other k differ a little.
        let half: [i32; 3] = std::array::from_fn(|i| {
            if i < self.frame.dimension {
                half[i] + 2
            } else {
                0
            }
        });
        let old = slot
            .as_ref()
            .map_or(([0; 3], 0.0), |table| (table.half, table.reach));
        let half: [i32; 3] = std::array::from_fn(|i: usize| half[i].max(old.0[i]));
        let table = Arc::new(self.fill(reach.max(old.1), half)?);
        *slot = Some(Arc::clone(&table));
        Ok(table)
    }

    fn fill(&self, reach: f64, half: [i32; 3]) -> Result<Table, Error> {
        let size = half.map(|h| 2 * h as isize + 1);
        let total = size[0].saturating_mul(size[1]).saturating_mul(size[2]);
        // Beyond this the table alone takes a gigabyte.
        if total > 1 << 26 {
            return Err(Error::BudgetSpent);
        }
        let stride = [size[1] * size[2], size[2], 1];
        let centre = (0..3).map(|i| half[i] as isize * stride[i]).sum();
        let mut values = vec![Complex::new(0.0, 0.0); total as usize];
        let radius = match self.potential.decay {
            Decay::Finite { radius } => reach.min(radius * (1.0 + 1e-9)),
            Decay::Bounded(_) => reach,
        };
        for n in self.frame.waves([0.0; 3], radius * radius) {
            if (0..3).any(|i| n[i].abs() > half[i]) {
                continue;
            }
            let value = finite((self.potential.components)(n))? * self.gauge(n).conj();
            let place = centre + (0..3).map(|i| n[i] as isize * stride[i]).sum::<isize>();
            values[place as usize] = value;
        }
        Ok(Table {
            half,
            stride,
            centre,
            values,
            reach,
        })
    }

    /// The matrix on these waves at k, both triangles filled; `reach` bounds their differences |G−G'|.
    pub(super) fn matrix<T: Scalar>(
        &self,
        basis: &[[i32; 3]],
        k: [f64; 3],
        reach: f64,
    ) -> Result<Mat<T>, Error> {
        let table = self.table(reach, extent(basis))?;
        let mut matrix = table.rectangle::<T>(basis, basis);
        for (i, n) in basis.iter().enumerate() {
            let kinetic = self.frame.square(add(k, real(*n)));
            matrix[(i, i)] = T::from_complex(Complex::new(kinetic + self.mean, 0.0));
        }
        Ok(matrix)
    }
}

/// The largest differences of the indices of these waves.
pub(super) fn extent(basis: &[[i32; 3]]) -> [i32; 3] {
    std::array::from_fn(|i| {
        let low = basis.iter().map(|n| n[i]).min().unwrap_or(0);
        let high = basis.iter().map(|n| n[i]).max().unwrap_or(0);
        high - low
    })
}

fn finite(value: Complex<f64>) -> Result<Complex<f64>, Error> {
    if value.re.is_finite() && value.im.is_finite() {
        Ok(value)
    } else {
        Err(Error::NotFinite)
    }
}

/// How many components symmetry is judged by.
fn few(dimension: usize) -> f64 {
    [60.0, 400.0, 1200.0][dimension - 1]
}

/// The components that symmetry is judged by: all within the radius of a finite potential, else the shortest few
/// hundred. By rising |G|.
fn sample(frame: &Frame, potential: &Potential) -> Result<Vec<Component>, Error> {
    let few = few(frame.dimension);
    let cut = match potential.decay {
        Decay::Finite { radius } => {
            if !radius.is_finite() {
                return Err(Error::NotFinite);
            }
            let far = [16.0, 16.0, 4.0][frame.dimension - 1] * frame.cut_for(few);
            (radius.max(0.0).powi(2)).min(far)
        }
        Decay::Bounded(_) => frame.cut_for(few),
    };
    frame
        .waves([0.0; 3], cut)
        .into_iter()
        .map(|n| Ok((n, finite((potential.components)(n))?)))
        .collect()
}
