//! Symmetric positive definite banded systems: factor, solve, and the band of the inverse.
//!
//! A = L·D·Lᵀ with unit lower triangular L, no pivoting (stable for positive definite A).
//! Work: n·w² for the factor, 4·n·w for a solve, 2·n·w² for the band of the inverse,
//! for n rows and half-band w.
//!
//! The band of the inverse follows from Z = D⁻¹L⁻¹ + (I − Lᵀ)Z, taken from the last row
//! up; only entries inside the band are touched (K. Takahashi, J. Fagan, M.-S. Chin 1973;
//! source from memory, tested against dense inverses).

/// Symmetric band matrix, lower half by rows.
///
/// Row i holds columns i − w … i one after the other; entries left of column 0 exist and
/// are never read.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct BandedMatrix {
    rows: usize,
    half_band: usize,
    data: Vec<f64>,
}

/// The matrix is not positive definite to working precision.
#[derive(Debug, Clone, Copy, PartialEq, thiserror::Error)]
#[error("pivot {value:e} in row {row} of the banded factor, expected a positive number")]
pub struct NotPositiveDefinite {
    /// Row of the pivot, from 0.
    pub row: usize,
    /// The pivot found.
    pub value: f64,
}

/// Factor L·D·Lᵀ of a [`BandedMatrix`].
#[derive(Debug, Clone, PartialEq)]
pub struct BandedFactor {
    /// L without its unit diagonal, D in its place.
    factor: BandedMatrix,
}

impl BandedMatrix {
    /// A zero matrix of `rows` rows with `half_band` diagonals on each side of the main one.
    #[must_use]
    pub fn zeros(rows: usize, half_band: usize) -> Self {
        let mut matrix = Self::default();
        matrix.reset(rows, half_band);
        matrix
    }

    /// Makes this a zero matrix of another shape, in the same memory where it suffices.
    pub fn reset(&mut self, rows: usize, half_band: usize) {
        self.rows = rows;
        self.half_band = half_band;
        self.data.clear();
        self.data.resize(rows * (half_band + 1), 0.0);
    }

    /// Number of rows.
    #[must_use]
    pub fn rows(&self) -> usize {
        self.rows
    }

    /// Diagonals on each side of the main one.
    #[must_use]
    pub fn half_band(&self) -> usize {
        self.half_band
    }

    fn offset(&self, row: usize, column: usize) -> usize {
        row * (self.half_band + 1) + self.half_band + column - row
    }

    /// Entry (row, column); zero outside the band.
    ///
    /// # Panics
    ///
    /// If the row or the column is not below [`BandedMatrix::rows`].
    #[must_use]
    pub fn get(&self, row: usize, column: usize) -> f64 {
        let (low, high) = (row.min(column), row.max(column));
        assert!(
            high < self.rows,
            "entry ({row}, {column}) of {} rows",
            self.rows
        );
        if high - low > self.half_band {
            0.0
        } else {
            self.data[self.offset(high, low)]
        }
    }

    /// Adds to entry (row, column), and so to (column, row): give each pair once.
    ///
    /// # Panics
    ///
    /// If the entry lies outside the matrix or its band.
    pub fn add(&mut self, row: usize, column: usize, value: f64) {
        let (low, high) = (row.min(column), row.max(column));
        assert!(
            high < self.rows && high - low <= self.half_band,
            "entry ({row}, {column}) of {} rows, half-band {}",
            self.rows,
            self.half_band
        );
        let offset = self.offset(high, low);
        self.data[offset] += value;
    }

    /// Adds `weight · v·vᵀ`, v standing at `first` and following columns.
    ///
    /// # Panics
    ///
    /// If v is longer than the band allows or leaves the matrix.
    pub fn add_outer(&mut self, first: usize, v: &[f64], weight: f64) {
        assert!(
            v.len() <= self.half_band + 1 && first + v.len() <= self.rows,
            "{} entries from row {first} of {} rows, half-band {}",
            v.len(),
            self.rows,
            self.half_band
        );
        for (i, &vi) in v.iter().enumerate() {
            let start = self.offset(first + i, first);
            let scaled = weight * vi;
            for (entry, &vj) in self.data[start..=start + i].iter_mut().zip(v) {
                *entry += scaled * vj;
            }
        }
    }

    /// `out = A·x`.
    ///
    /// # Panics
    ///
    /// If a length differs from [`BandedMatrix::rows`].
    pub fn multiply(&self, x: &[f64], out: &mut [f64]) {
        assert!(
            x.len() == self.rows && out.len() == self.rows,
            "lengths differ from the rows"
        );
        out.fill(0.0);
        for i in 0..self.rows {
            let first = i.saturating_sub(self.half_band);
            let row = &self.data[self.offset(i, first)..=self.offset(i, i)];
            let (diagonal, left) = (row[i - first], &row[..i - first]);
            let mut sum = diagonal * x[i];
            for (k, &a) in left.iter().enumerate() {
                sum += a * x[first + k];
                out[first + k] += a * x[i];
            }
            out[i] += sum;
        }
    }

    /// Factors the matrix in its own memory; [`BandedFactor::into_scratch`] gives that back.
    ///
    /// # Errors
    ///
    /// [`NotPositiveDefinite`] with the first pivot that is not positive.
    pub fn factor(mut self) -> Result<BandedFactor, NotPositiveDefinite> {
        let (w, stride) = (self.half_band, self.half_band + 1);
        // Row i becomes u = L·D first, so that every sum is one contiguous dot product.
        for i in 0..self.rows {
            let first = i.saturating_sub(w);
            let (above, rest) = self.data.split_at_mut(i * stride);
            let row = &mut rest[w - (i - first)..=w];
            let n = i - first;
            for k in 0..n {
                let j = first + k;
                // Row j of L over the columns both rows have.
                let start = j.saturating_sub(w).max(first);
                let len = j - start;
                let other = &above[j * stride + w - len..j * stride + w];
                let mine = &row[start - first..k];
                row[k] -= dot(mine, other);
            }
            let mut pivot = row[n];
            for k in 0..n {
                let l = row[k] / above[(first + k) * stride + w];
                pivot -= row[k] * l;
                row[k] = l;
            }
            if !(pivot > 0.0 && pivot.is_finite()) {
                return Err(NotPositiveDefinite {
                    row: i,
                    value: pivot,
                });
            }
            row[n] = pivot;
        }
        Ok(BandedFactor { factor: self })
    }
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(x, y)| x * y).sum()
}

impl BandedFactor {
    /// The memory, for the next matrix: call [`BandedMatrix::reset`] on it.
    #[must_use]
    pub fn into_scratch(self) -> BandedMatrix {
        self.factor
    }

    /// Solves A·x = b in place.
    ///
    /// # Panics
    ///
    /// If the length of `b` is not the number of rows.
    pub fn solve(&self, b: &mut [f64]) {
        let (n, w, stride) = (
            self.factor.rows,
            self.factor.half_band,
            self.factor.half_band + 1,
        );
        assert!(b.len() == n, "{} right-hand sides for {n} rows", b.len());
        let data = &self.factor.data;
        for i in 0..n {
            let len = i.min(w);
            let row = &data[i * stride + w - len..i * stride + w];
            b[i] -= dot(row, &b[i - len..i]);
        }
        for i in 0..n {
            b[i] /= data[i * stride + w];
        }
        for i in (0..n).rev() {
            let len = i.min(w);
            let row = &data[i * stride + w - len..i * stride + w];
            let x = b[i];
            for (target, l) in b[i - len..i].iter_mut().zip(row) {
                *target -= l * x;
            }
        }
    }

    /// The entries of A⁻¹ inside the band, written over `out`.
    pub fn inverse_band(&self, out: &mut BandedMatrix) {
        let (n, w) = (self.factor.rows, self.factor.half_band);
        out.reset(n, w);
        let mut column = vec![0.0; w];
        for i in (0..n).rev() {
            let len = w.min(n - 1 - i);
            // L[k, i] for k = i + 1 … i + len.
            for (k, l) in column[..len].iter_mut().enumerate() {
                *l = self.factor.data[self.factor.offset(i + 1 + k, i)];
            }
            for j in (i + 1..=i + len).rev() {
                let mut sum = 0.0;
                for (k, l) in column[..len].iter().enumerate() {
                    let row = i + 1 + k;
                    let (low, high) = (row.min(j), row.max(j));
                    sum += l * out.data[out.offset(high, low)];
                }
                let offset = out.offset(j, i);
                out.data[offset] = -sum;
            }
            let mut diagonal = 1.0 / self.factor.data[self.factor.offset(i, i)];
            for (k, l) in column[..len].iter().enumerate() {
                diagonal -= l * out.data[out.offset(i + 1 + k, i)];
            }
            let offset = out.offset(i, i);
            out.data[offset] = diagonal;
        }
    }
}

#[cfg(test)]
mod tests {
    #![allow(clippy::unwrap_used)]
    use super::*;

    /// A diagonally dominant matrix, hence positive definite, with condition below 10.
    fn planted(n: usize, w: usize) -> BandedMatrix {
        let mut a = BandedMatrix::zeros(n, w);
        for i in 0..n {
            for j in i.saturating_sub(w)..i {
                let value = ((i * 7 + j * 13) % 11) as f64 / 11.0 - 0.45;
                a.add(i, j, value);
            }
            a.add(i, i, 1.2 * w as f64 + 1.0);
        }
        a
    }

    /// Textbook Gauss–Jordan on the full matrix.
    fn dense_inverse(a: &BandedMatrix) -> Vec<Vec<f64>> {
        let n = a.rows();
        let mut m: Vec<Vec<f64>> = (0..n)
            .map(|i| {
                (0..2 * n)
                    .map(|j| {
                        if j < n {
                            a.get(i, j)
                        } else {
                            f64::from(u8::from(j - n == i))
                        }
                    })
                    .collect()
            })
            .collect();
        for p in 0..n {
            let pivot = m[p][p];
            for v in &mut m[p] {
                *v /= pivot;
            }
            let pivot_row = m[p].clone();
            for (i, row) in m.iter_mut().enumerate() {
                if i != p {
                    let f = row[p];
                    for (v, q) in row.iter_mut().zip(&pivot_row) {
                        *v -= f * q;
                    }
                }
            }
        }
        m.into_iter().map(|row| row[n..].to_vec()).collect()
    }

    #[test]
    fn solves_and_inverts_like_the_dense_way_for_every_shape() {
        for (n, w) in [(1, 0), (1, 3), (2, 1), (5, 7), (9, 2), (30, 5), (33, 11)] {
            let a = planted(n, w);
            let x: Vec<f64> = (0..n).map(|i| (i as f64 * 0.7).sin() + 0.1).collect();
            let mut b = vec![9.0; n];
            a.multiply(&x, &mut b);
            let inverse = dense_inverse(&a);
            let factor = a.factor().unwrap();
            factor.solve(&mut b);
            // Condition below 10, n operations of eps each.
            let tolerance = 10.0 * (n as f64 + 1.0) * f64::EPSILON;
            for (found, truth) in b.iter().zip(&x) {
                assert!((found - truth).abs() < 2.0 * tolerance, "{n} {w}");
            }
            let mut z = planted(3, 1); // dirty on purpose
            factor.inverse_band(&mut z);
            for (i, row) in inverse.iter().enumerate() {
                for (j, truth) in row.iter().enumerate().take(i + 1).skip(i.saturating_sub(w)) {
                    assert!((z.get(i, j) - truth).abs() < tolerance, "{n} {w} {i} {j}");
                }
            }
        }
    }

    #[test]
    fn reused_memory_gives_the_same_bits() {
        let fresh = planted(40, 4).factor().unwrap();
        let mut reused = planted(90, 9).factor().unwrap().into_scratch();
        reused.reset(40, 4);
        let source = planted(40, 4);
        for i in 0..40_usize {
            for j in i.saturating_sub(4)..=i {
                reused.add(i, j, source.get(i, j));
            }
        }
        let reused = reused.factor().unwrap();
        let (mut a, mut b) = (vec![1.0; 40], vec![1.0; 40]);
        fresh.solve(&mut a);
        reused.solve(&mut b);
        assert_eq!(a, b);
    }

    #[test]
    fn names_the_row_of_a_bad_pivot() {
        let mut a = planted(8, 2);
        a.add(5, 5, -30.0);
        assert_eq!(a.factor().unwrap_err().row, 5);
        let mut a = planted(8, 2);
        a.add(3, 3, f64::NAN);
        assert_eq!(a.factor().unwrap_err().row, 3);
    }

    #[test]
    fn an_outer_product_is_its_entries() {
        let mut a = BandedMatrix::zeros(6, 2);
        a.add_outer(2, &[1.0, -2.0, 3.0], 0.5);
        assert_eq!(
            (a.get(2, 2), a.get(3, 2), a.get(2, 4), a.get(3, 4)),
            (0.5, -1.0, 1.5, -3.0)
        );
        assert_eq!((a.get(4, 4), a.get(5, 5), a.get(0, 5)), (4.5, 0.0, 0.0));
    }
}
