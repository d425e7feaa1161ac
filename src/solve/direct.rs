//! Dense LU with partial pivoting, in place, by faer.
//!
//! The matrix is overwritten by its factors, so that the peak memory is one matrix. The residual is nevertheless
//! checked: before factorisation the matrix is multiplied from the left by a few vectors v of random signs, and the
//! mean of |v.(b - A x)|² over them is an unbiased estimate of |b - A x|² (`Hutchinson1990`, `Freivalds1979`).

use crate::solve::{SolveError, SolveInfo};
use faer::dyn_stack::{MemBuffer, MemStack};
use faer::linalg::lu::partial_pivoting::{factor, solve};
use faer::linalg::matmul::matmul;
use faer::perm::PermRef;
use faer::{Accum, Conj, Mat, MatMut, MatRef, Par, Spec};

/// Vectors of random signs. With m of them the estimate of a residual's size has a relative spread of about 1/sqrt(2 m).
const N_PROBES: usize = 16;

/// The factors of a matrix, which solve with it and with its transpose.
#[derive(Debug, Clone)]
pub struct Factor {
    lu: Mat<f64>,
    perm: Vec<usize>,
    perm_inv: Vec<usize>,
    /// `N_PROBES × n`: random signs.
    probes: Mat<f64>,
    /// `N_PROBES × n`: the same times the matrix.
    probed: Mat<f64>,
}

/// Rayon with as many threads as the current pool has.
fn par() -> Par {
    Par::rayon(rayon::current_num_threads())
}

impl Factor {
    /// The factors of `matrix`, which is overwritten.
    ///
    /// # Errors
    /// [`SolveError::Singular`] when a pivot is zero or not finite.
    pub fn new(matrix: Mat<f64>) -> Result<Self, SolveError> {
        let n = matrix.nrows();
        let mut lu = matrix;
        let mut signs = Signs(0x9E37_79B9_7F4A_7C15);
        let probes = Mat::from_fn(N_PROBES, n, |_, _| signs.next());
        let mut probed = Mat::zeros(N_PROBES, n);
        matmul(&mut probed, Accum::Replace, &probes, &lu, 1.0, par());
        let (mut perm, mut perm_inv) = (vec![0usize; n], vec![0usize; n]);
        let scratch = factor::lu_in_place_scratch::<usize, f64>(n, n, par(), Spec::default());
        let mut memory = MemBuffer::try_new(scratch).map_err(|_| SolveError::Singular { panels: n })?;
        let stack = MemStack::new(&mut memory);
        factor::lu_in_place(lu.as_mut(), &mut perm, &mut perm_inv, par(), stack, Spec::default());
        let regular = (0..n).all(|k| lu[(k, k)] != 0.0 && lu[(k, k)].is_finite());
        if regular {
            Ok(Factor { lu, perm, perm_inv, probes, probed })
        } else {
            Err(SolveError::Singular { panels: n })
        }
    }

    /// Solves A X = B.
    ///
    /// - `right_sides`: `n × n_columns`.
    #[must_use]
    pub fn solve(&self, right_sides: MatRef<'_, f64>) -> Mat<f64> {
        self.with(right_sides, |lu, perm, rhs, stack| {
            solve::solve_in_place_with_conj(lu, lu, perm, Conj::No, rhs, par(), stack);
        })
    }

    /// Solves Aᵀ X = B.
    ///
    /// - `right_sides`: `n × n_columns`.
    #[must_use]
    pub fn solve_transpose(&self, right_sides: MatRef<'_, f64>) -> Mat<f64> {
        self.with(right_sides, |lu, perm, rhs, stack| {
            solve::solve_transpose_in_place_with_conj(lu, lu, perm, Conj::No, rhs, par(), stack);
        })
    }

    fn with(
        &self,
        right_sides: MatRef<'_, f64>,
        solve_in_place: impl FnOnce(MatRef<'_, f64>, PermRef<'_, usize>, MatMut<'_, f64>, &mut MemStack),
    ) -> Mat<f64> {
        let n = self.lu.nrows();
        let mut out = right_sides.to_owned();
        let scratch = solve::solve_in_place_scratch::<usize, f64>(n, out.ncols(), par());
        let mut memory = MemBuffer::new(scratch);
        let perm = PermRef::new_checked(&self.perm, &self.perm_inv, n);
        solve_in_place(self.lu.as_ref(), perm, out.as_mut(), MemStack::new(&mut memory));
        out
    }

    /// How well `solution` solves A X = B: estimated as the head of this file says.
    ///
    /// - `right_sides`, `solution`: `n × n_columns`.
    #[must_use]
    pub fn info(&self, right_sides: MatRef<'_, f64>, solution: MatRef<'_, f64>) -> SolveInfo {
        let mut defect = Mat::zeros(N_PROBES, right_sides.ncols());
        matmul(&mut defect, Accum::Replace, &self.probes, right_sides, 1.0, Par::Seq);
        matmul(&mut defect, Accum::Add, &self.probed, solution, -1.0, Par::Seq);
        let relative = (0..right_sides.ncols()).map(|c| {
            let mean2 = (0..N_PROBES).map(|k| defect[(k, c)] * defect[(k, c)]).sum::<f64>() / N_PROBES as f64;
            let size = right_sides.col(c).norm_l2();
            // A net without panels has nothing on the right, and nothing to solve.
            if size > 0.0 { mean2.sqrt() / size } else { mean2.sqrt() }
        });
        // A maximum that keeps what is not a number.
        let relative_residual = relative.fold(0.0, |a: f64, b| if a >= b { a } else { b });
        SolveInfo { method: "dense LU".to_owned(), relative_residual }
    }
}

/// A sequence of +1 and -1 (xorshift of `Marsaglia2003`).
struct Signs(u64);

impl Signs {
    fn next(&mut self) -> f64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        if self.0 >> 63 == 0 { 1.0 } else { -1.0 }
    }
}
