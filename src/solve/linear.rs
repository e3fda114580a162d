//! The sparse symmetric system in the heads: ordered and analysed once per network, filled and factorised many times.

use super::supernodal::Supernodal;

/// The system in the heads, factorised in the way that suits its size.
pub(crate) enum Factor {
    /// Entry by entry.
    Small(Simplicial),
    /// Block by block.
    Large(Box<Supernodal>),
}

/// Unknowns from which blocks pay: at 1,000 the two take the same time on street networks, at 100,000 blocks are three times as
/// fast there and eight times on grids (`benches/solve.rs`).
const LARGE: usize = 1500;

impl Factor {
    /// For `n` unknowns coupled pairwise as in `couplings`. Returns one slot per coupling.
    pub fn new(n: usize, couplings: &[(u32, u32)]) -> (Self, Vec<Slot>) {
        if n >= LARGE
            && let Some((large, slots)) = Supernodal::new(n, couplings)
        {
            return (Self::Large(Box::new(large)), slots);
        }
        let (small, slots) = Simplicial::new(n, couplings);
        (Self::Small(small), slots)
    }

    /// Number of unknowns.
    pub fn unknowns(&self) -> usize {
        match self {
            Self::Small(small) => small.unknowns(),
            Self::Large(large) => large.unknowns(),
        }
    }

    /// Sets the matrix to zero.
    pub fn clear(&mut self) {
        match self {
            Self::Small(small) => small.clear(),
            Self::Large(large) => large.clear(),
        }
    }

    /// Adds to the diagonal entry of unknown `i`; one past the last is a place that no equation reads.
    #[inline]
    pub fn add_diagonal(&mut self, i: u32, value: f64) {
        match self {
            Self::Small(small) => small.add_diagonal(i, value),
            Self::Large(large) => large.add_diagonal(i, value),
        }
    }

    /// Adds to an off-diagonal entry.
    #[inline]
    pub fn add(&mut self, slot: Slot, value: f64) {
        match self {
            Self::Small(small) => small.add(slot, value),
            Self::Large(large) => large.add(slot, value),
        }
    }

    /// Factorises; false if a figure is not finite.
    pub fn factorise(&mut self) -> bool {
        match self {
            Self::Small(small) => small.factorise(),
            Self::Large(large) => large.factorise(),
        }
    }

    /// Solves with the last factorisation; `right` holds the right side, then the answer.
    pub fn solve(&mut self, right: &mut [f64]) {
        match self {
            Self::Small(small) => small.solve(right),
            Self::Large(large) => large.solve(right),
        }
    }
}

/// `L D L'` of a symmetric positive definite matrix whose pattern never changes.
///
/// Ordering by approximate minimum degree; up-looking factorisation over a pattern of L worked out once, so that
/// factorising and solving write numbers only and allocate nothing.
///
/// # Source
/// P. R. Amestoy, T. A. Davis, I. S. Duff, "An approximate minimum degree ordering algorithm", SIAM J. Matrix Anal. Appl. 17,
/// 1996; T. A. Davis, "Algorithm 849: a concise sparse Cholesky factorization package", ACM TOMS 31, 2005.
#[derive(Clone, Debug)]
pub(crate) struct Simplicial {
    n: usize,
    /// Position of each unknown in elimination order, and one past the last.
    position: Vec<u32>,
    /// Upper triangle of the permuted matrix by column: row indices, and values from place 1 on.
    a_first: Vec<u32>,
    a_row: Vec<u32>,
    a: Vec<f64>,
    diagonal: Vec<f64>,
    /// L by column, rows ascending.
    l_first: Vec<u32>,
    l_row: Vec<u32>,
    l: Vec<f64>,
    /// 1/D.
    inverse: Vec<f64>,
    /// Per row of L, its columns ascending (an order in which elimination is valid).
    row_first: Vec<u32>,
    row_column: Vec<u32>,
    /// Entries written so far per column.
    filled: Vec<u32>,
    work: Vec<f64>,
}

/// Where an off-diagonal entry lives; handed out when the system is made.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Slot(u32);

impl Slot {
    /// An entry that no equation reads: where a line ends at a held head.
    pub const UNUSED: Self = Self(0);

    pub(super) fn at(place: u32) -> Self {
        Self(place)
    }

    pub(super) fn place(self) -> usize {
        self.0 as usize
    }
}

impl Simplicial {
    /// For `n` unknowns coupled pairwise as in `couplings`. Returns one slot per coupling.
    pub fn new(n: usize, couplings: &[(u32, u32)]) -> (Self, Vec<Slot>) {
        let position = elimination_order(n, couplings);
        // upper triangle in elimination order, parallel couplings sharing one entry
        let placed = |&(i, j): &(u32, u32)| {
            let (i, j) = (position[i as usize], position[j as usize]);
            (i.max(j), i.min(j))
        };
        let mut entries: Vec<(u32, u32)> = couplings.iter().map(placed).collect();
        entries.sort_unstable();
        entries.dedup();
        let slots = couplings
            .iter()
            .map(|coupling| {
                Slot(1 + entries.partition_point(|entry| *entry < placed(coupling)) as u32)
            })
            .collect();
        let mut a_first = vec![0; n + 1];
        for &(column, _) in &entries {
            a_first[column as usize + 1] += 1;
        }
        prefix_sums(&mut a_first);
        let a_row: Vec<u32> = entries.iter().map(|&(_, row)| row).collect();
        let (row_first, row_column, l_first, l_row) = symbolic(n, &a_first, &a_row);
        let mut position = position;
        position.push(n as u32);
        let factor = Self {
            n,
            a: vec![0.0; 1 + a_row.len()],
            a_first,
            a_row,
            diagonal: vec![0.0; n + 1],
            l: vec![0.0; l_row.len()],
            filled: vec![0; n],
            l_first,
            l_row,
            inverse: vec![0.0; n],
            row_first,
            row_column,
            work: vec![0.0; n],
            position,
        };
        (factor, slots)
    }

    /// Number of unknowns.
    pub fn unknowns(&self) -> usize {
        self.n
    }

    /// Sets the matrix to zero.
    pub fn clear(&mut self) {
        self.a.fill(0.0);
        self.diagonal.fill(0.0);
    }

    /// Adds to the diagonal entry of unknown `i`; one past the last is a place that no equation reads.
    #[inline]
    pub fn add_diagonal(&mut self, i: u32, value: f64) {
        self.diagonal[self.position[i as usize] as usize] += value;
    }

    /// Adds to an off-diagonal entry.
    #[inline]
    pub fn add(&mut self, slot: Slot, value: f64) {
        self.a[slot.0 as usize] += value;
    }

    /// Factorises; false if a figure is not finite.
    ///
    /// An unknown without any entry stays zero. A pivot that vanishes beside its diagonal entry belongs to a set of nodes that no open line joins to a held head.
    /// The head of its last node is then pinned: its unknown is zero in every solution.
    pub fn factorise(&mut self) -> bool {
        const VANISHED: f64 = 1e-14;
        self.filled.copy_from_slice(&self.l_first[..self.n]);
        for k in 0..self.n {
            for p in self.a_first[k] as usize..self.a_first[k + 1] as usize {
                self.work[self.a_row[p] as usize] = self.a[p + 1];
            }
            let mut pivot = self.diagonal[k];
            for p in self.row_first[k] as usize..self.row_first[k + 1] as usize {
                let i = self.row_column[p] as usize;
                let y = std::mem::take(&mut self.work[i]);
                let (start, end) = (self.l_first[i] as usize, self.filled[i] as usize);
                for (row, l) in self.l_row[start..end].iter().zip(&self.l[start..end]) {
                    self.work[*row as usize] -= l * y;
                }
                let l = y * self.inverse[i];
                pivot -= l * y;
                self.l[end] = l;
                self.filled[i] += 1;
            }
            if !pivot.is_finite() {
                self.work.fill(0.0);
                return false;
            }
            self.inverse[k] = if pivot > VANISHED * self.diagonal[k] {
                1.0 / pivot
            } else {
                0.0
            };
        }
        true
    }

    /// Solves with the last factorisation; `right` holds the right side, then the answer.
    pub fn solve(&mut self, right: &mut [f64]) {
        let x = &mut self.work;
        for (i, &p) in self.position[..self.n].iter().enumerate() {
            x[p as usize] = right[i];
        }
        for k in 0..self.n {
            let y = x[k];
            for p in self.l_first[k] as usize..self.l_first[k + 1] as usize {
                x[self.l_row[p] as usize] -= self.l[p] * y;
            }
        }
        for k in (0..self.n).rev() {
            let mut y = x[k] * self.inverse[k];
            for p in self.l_first[k] as usize..self.l_first[k + 1] as usize {
                y -= self.l[p] * x[self.l_row[p] as usize];
            }
            x[k] = y;
        }
        for (i, &p) in self.position[..self.n].iter().enumerate() {
            right[i] = std::mem::take(&mut x[p as usize]);
        }
        x.fill(0.0);
    }
}

/// Position of each unknown in an order that keeps the fill low.
fn elimination_order(n: usize, couplings: &[(u32, u32)]) -> Vec<u32> {
    let natural = || (0..n as u32).collect();
    let mut pairs: Vec<(u32, u32)> = couplings
        .iter()
        .flat_map(|&(i, j)| [(i, j), (j, i)])
        .collect();
    pairs.sort_unstable();
    pairs.dedup();
    let mut first = vec![0i64; n + 1];
    for &(column, _) in &pairs {
        first[column as usize + 1] += 1;
    }
    for i in 0..n {
        first[i + 1] += first[i];
    }
    let rows: Vec<i64> = pairs.iter().map(|&(_, row)| i64::from(row)).collect();
    match amd::order(n as i64, &first, &rows, &amd::Control::default()) {
        Ok((_, inverse, _)) => inverse.iter().map(|&p| p as u32).collect(),
        // An order is only ever a matter of speed.
        Err(_) => natural(),
    }
}

/// Pattern of L: per row its columns ascending, per column its rows ascending.
fn symbolic(n: usize, a_first: &[u32], a_row: &[u32]) -> (Vec<u32>, Vec<u32>, Vec<u32>, Vec<u32>) {
    const NONE: u32 = u32::MAX;
    let mut parent = vec![NONE; n];
    let mut flag = vec![NONE; n];
    let mut row_first = vec![0u32; n + 1];
    let mut row_column: Vec<u32> = Vec::new();
    let mut l_first = vec![0u32; n + 1];
    for k in 0..n {
        flag[k] = k as u32;
        let start = row_column.len();
        for &row in &a_row[a_first[k] as usize..a_first[k + 1] as usize] {
            // up the elimination tree from each entry of the column
            let mut i = row;
            while flag[i as usize] != k as u32 {
                flag[i as usize] = k as u32;
                row_column.push(i);
                l_first[i as usize + 1] += 1;
                if parent[i as usize] == NONE {
                    parent[i as usize] = k as u32;
                }
                i = parent[i as usize];
            }
        }
        row_column[start..].sort_unstable();
        row_first[k + 1] = row_column.len() as u32;
    }
    prefix_sums(&mut l_first);
    let mut next = l_first.clone();
    let mut l_row = vec![0u32; row_column.len()];
    for k in 0..n {
        for &i in &row_column[row_first[k] as usize..row_first[k + 1] as usize] {
            l_row[next[i as usize] as usize] = k as u32;
            next[i as usize] += 1;
        }
    }
    (row_first, row_column, l_first, l_row)
}

fn prefix_sums(counts: &mut [u32]) {
    for i in 1..counts.len() {
        counts[i] += counts[i - 1];
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Factor and solve equal nalgebra's dense Cholesky on random Laplacians with grounded nodes.
    #[test]
    fn equals_dense_cholesky() {
        let mut state = 7u64;
        let mut random = move || {
            state = state
                .wrapping_mul(6364136223846793005)
                .wrapping_add(1442695040888963407);
            (state >> 33) as f64 / (1u64 << 31) as f64
        };
        for n in [1usize, 2, 3, 6, 17, 60] {
            let mut couplings: Vec<(u32, u32)> = (1..n)
                .map(|i| ((random() * i as f64) as u32, i as u32))
                .collect();
            for _ in 0..n {
                let (i, j) = ((random() * n as f64) as u32, (random() * n as f64) as u32);
                if i != j {
                    couplings.push((i, j));
                }
            }
            let (mut factor, slots) = Simplicial::new(n, &couplings);
            let mut dense = nalgebra::DMatrix::<f64>::zeros(n, n);
            for _ in 0..2 {
                factor.clear();
                dense.fill(0.0);
                for i in 0..n {
                    let d = 0.1 + random();
                    factor.add_diagonal(i as u32, d);
                    dense[(i, i)] += d;
                }
                for (&(i, j), &slot) in couplings.iter().zip(&slots) {
                    let y = 0.01 + random();
                    for k in [i, j] {
                        factor.add_diagonal(k, y);
                        dense[(k as usize, k as usize)] += y;
                    }
                    factor.add(slot, -y);
                    dense[(i as usize, j as usize)] -= y;
                    dense[(j as usize, i as usize)] -= y;
                }
                let right: Vec<f64> = (0..n).map(|_| random() - 0.5).collect();
                let mut x = right.clone();
                assert!(factor.factorise());
                factor.solve(&mut x);
                let expected = dense
                    .clone()
                    .cholesky()
                    .unwrap()
                    .solve(&nalgebra::DVector::from_vec(right));
                for i in 0..n {
                    assert!((x[i] - expected[i]).abs() < 1e-12 * (1.0 + expected[i].abs()));
                }
            }
        }
    }

    /// Two nodes joined to each other alone: the second is pinned, the first takes what the line between them asks.
    #[test]
    fn a_set_without_a_held_head_is_pinned() {
        let (mut factor, slots) = Simplicial::new(2, &[(0, 1)]);
        factor.clear();
        factor.add_diagonal(0, 3.0);
        factor.add_diagonal(1, 3.0);
        factor.add(slots[0], -3.0);
        assert!(factor.factorise());
        let mut x = [6.0, -6.0];
        factor.solve(&mut x);
        assert!((x[0] - x[1] - 2.0).abs() < 1e-15 && x.contains(&0.0));
        factor.add_diagonal(0, f64::NAN);
        assert!(!factor.factorise());
    }
}
