//! The same system for large networks, by a library that works on blocks.

use faer::dyn_stack::{MemBuffer, MemStack};
use faer::linalg::cholesky::ldlt::factor::LdltRegularization;
use faer::sparse::linalg::cholesky::{
    CholeskySymbolicParams, SymbolicCholesky, SymmetricOrdering, factorize_symbolic_cholesky,
};
use faer::sparse::{SparseColMatRef, SymbolicSparseColMatRef};
use faer::{Conj, MatMut, Par, Side};

use super::linear::Slot;

/// `L D L'` by supernodes. Same interface and same guarantees as [`super::linear::Simplicial`].
pub(crate) struct Supernodal {
    n: usize,
    symbolic: SymbolicCholesky<u32>,
    /// Upper triangle by column.
    first: Vec<u32>,
    rows: Vec<u32>,
    /// Values; place 0 is read by no equation, entry k stands at k + 1.
    values: Vec<f64>,
    /// Per unknown, and one past the last, the place of its diagonal entry.
    diagonal: Vec<u32>,
    factor: Vec<f64>,
    signs: Vec<i8>,
    memory: MemBuffer,
}

impl Supernodal {
    /// For `n` unknowns coupled pairwise as in `couplings`; none if the analysis fails for want of memory.
    pub fn new(n: usize, couplings: &[(u32, u32)]) -> Option<(Self, Vec<Slot>)> {
        let placed = |&(i, j): &(u32, u32)| (i.max(j), i.min(j));
        let mut entries: Vec<(u32, u32)> = couplings.iter().map(placed).collect();
        entries.extend((0..n as u32).map(|i| (i, i)));
        entries.sort_unstable();
        entries.dedup();
        let place = |entry: (u32, u32)| 1 + entries.partition_point(|other| *other < entry) as u32;
        let slots = couplings
            .iter()
            .map(|coupling| Slot::at(place(placed(coupling))))
            .collect();
        let mut diagonal: Vec<u32> = (0..n as u32).map(|i| place((i, i))).collect();
        diagonal.push(0);
        let mut first = vec![0u32; n + 1];
        for &(column, _) in &entries {
            first[column as usize + 1] += 1;
        }
        for i in 0..n {
            first[i + 1] += first[i];
        }
        let rows: Vec<u32> = entries.iter().map(|&(_, row)| row).collect();
        let pattern = SymbolicSparseColMatRef::new_checked(n, n, &first, None, &rows);
        let symbolic = factorize_symbolic_cholesky(
            pattern,
            Side::Upper,
            SymmetricOrdering::Amd,
            CholeskySymbolicParams::default(),
        )
        .ok()?;
        let factorise =
            symbolic.factorize_numeric_ldlt_scratch::<f64>(Par::Seq, Default::default());
        let solve = symbolic.solve_in_place_scratch::<f64>(1, Par::Seq);
        let memory = MemBuffer::try_new(factorise.or(solve)).ok()?;
        let supernodal = Self {
            n,
            factor: vec![0.0; symbolic.len_val()],
            symbolic,
            values: vec![0.0; rows.len() + 1],
            first,
            rows,
            diagonal,
            signs: vec![1; n],
            memory,
        };
        Some((supernodal, slots))
    }

    pub fn unknowns(&self) -> usize {
        self.n
    }

    pub fn clear(&mut self) {
        self.values.fill(0.0);
    }

    #[inline]
    pub fn add_diagonal(&mut self, i: u32, value: f64) {
        self.values[self.diagonal[i as usize] as usize] += value;
    }

    #[inline]
    pub fn add(&mut self, slot: Slot, value: f64) {
        self.values[slot.place()] += value;
    }

    /// Factorises; false if that failed. Pivots that vanish are made so large that their unknowns stay zero.
    pub fn factorise(&mut self) -> bool {
        let mut smallest = f64::INFINITY;
        for &place in &self.diagonal[..self.n] {
            let value = &mut self.values[place as usize];
            if *value == 0.0 {
                *value = 1.0; // an unknown without any entry
            }
            smallest = smallest.min(*value);
        }
        let pattern =
            SymbolicSparseColMatRef::new_checked(self.n, self.n, &self.first, None, &self.rows);
        let matrix = SparseColMatRef::new(pattern, &self.values[1..]);
        let regularization = LdltRegularization {
            dynamic_regularization_signs: Some(self.signs.as_slice()),
            dynamic_regularization_delta: 1e100,
            dynamic_regularization_epsilon: 1e-14 * smallest,
        };
        let done = self.symbolic.factorize_numeric_ldlt(
            &mut self.factor,
            matrix,
            Side::Upper,
            regularization,
            Par::Seq,
            MemStack::new(&mut self.memory),
            Default::default(),
        );
        done.is_ok()
    }

    /// Solves with the last factorisation; `right` holds the right side, then the answer.
    pub fn solve(&mut self, right: &mut [f64]) {
        let factor = faer::sparse::linalg::cholesky::LdltRef::new(&self.symbolic, &self.factor);
        let right = MatMut::from_column_major_slice_mut(&mut right[..self.n], self.n, 1);
        let stack = MemStack::new(&mut self.memory);
        factor.solve_in_place_with_conj(Conj::No, right, Par::Seq, stack);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A chain of unit conductances grounded at its first node: the answer to a unit inflow at the last is 1, 2, 3 ..
    #[test]
    fn a_chain_is_solved() {
        let n = 200;
        let couplings: Vec<(u32, u32)> = (1..n as u32).map(|i| (i - 1, i)).collect();
        let (mut factor, slots) = Supernodal::new(n, &couplings).unwrap();
        for _ in 0..2 {
            factor.clear();
            factor.add_diagonal(0, 1.0);
            for (&(i, j), &slot) in couplings.iter().zip(&slots) {
                factor.add_diagonal(i, 1.0);
                factor.add_diagonal(j, 1.0);
                factor.add(slot, -1.0);
            }
            let mut x = vec![0.0; n];
            x[n - 1] = 1.0;
            assert!(factor.factorise());
            factor.solve(&mut x);
            for (i, x) in x.iter().enumerate() {
                assert!((x - (i + 1) as f64).abs() < 1e-9, "{i}: {x}");
            }
        }
    }
}
