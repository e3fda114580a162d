//! The sparse symmetric system in the heads: ordered and analysed once per network, filled and factorised many times.

use super::supernodal::Supernodal;

/// The system in the heads, factorised in the way that suits its size. There is one per solver, so its own size is no matter.
#[allow(clippy::large_enum_variant)]
pub(crate) enum Factor {
    /// Entry by entry.
    Small(Simplicial),
    /// Block by block.
    Large(Box<Supernodal>),
}

/// Multiplications of one factorisation from which blocks pay. On a grid of 10,000 nodes (1e7) a whole solve takes the
/// same time either way, on one of 100,000 (5e8) blocks are 1.8 times as fast; on street networks, which fill in little, they never
/// are (`benches/solve.rs`).
const MUCH_WORK: f64 = 2e8;

impl Factor {
    /// For `n` unknowns coupled pairwise as in `couplings`. Returns one slot per coupling.
    pub fn new(n: usize, couplings: &[(u32, u32)]) -> (Self, Vec<Slot>) {
        let (small, slots) = Simplicial::new(n, couplings);
        if small.work() > MUCH_WORK
            && let Some((large, slots)) = Supernodal::new(n, couplings)
        {
            return (Self::Large(Box::new(large)), slots);
        }
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

    /// Adds a conductance between unknown `i` and a held head; one past the last is a place that no equation reads.
    #[inline]
    pub fn ground(&mut self, i: u32, conductance: f64) {
        match self {
            Self::Small(small) => small.ground(i, conductance),
            Self::Large(large) => large.add_diagonal(i, conductance),
        }
    }

    /// Adds a conductance between two unknowns whose entry is `slot`; without an entry, from each of them to a held head.
    #[inline]
    pub fn join(&mut self, i: u32, j: u32, slot: Slot, conductance: f64) {
        match self {
            Self::Small(small) => small.join(i, j, slot, conductance),
            Self::Large(large) => {
                large.add_diagonal(i, conductance);
                large.add_diagonal(j, conductance);
                large.add(slot, -conductance);
            }
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

/// `L D L'` of a network of conductances whose pattern never changes.
///
/// The matrix has the negative conductances between unknowns off its diagonal; each diagonal entry is the sum of all
/// conductances at its unknown, those to held heads included. Kept apart, conductances stay conductances while unknowns
/// are eliminated:
///
/// ```text
/// pivot  p_k  = g_k + sum_j y_kj               g_k: to held heads
/// then   y_ij += y_ik y_kj / p_k,    g_i += y_ik g_k / p_k
/// ```
///
/// Nothing is ever subtracted, so that each figure is good to rounding even where a set of nodes hangs on the rest by a
/// conductance far below the rounding of those inside it; and a set that hangs on nothing shows as a pivot of exactly zero.
///
/// Ordering by approximate minimum degree; left-looking factorisation over a pattern of L worked out once, so that
/// factorising and solving write numbers only and allocate nothing.
///
/// # Source
/// W. K. Grassmann, M. I. Taksar, D. P. Heyman, "Regenerative analysis and steady state distributions for Markov chains",
/// Operations Research 33, 1985 (elimination without subtraction); P. R. Amestoy, T. A. Davis, I. S. Duff, "An approximate
/// minimum degree ordering algorithm", SIAM J. Matrix Anal. Appl. 17, 1996; T. A. Davis, "Algorithm 849: a concise sparse
/// Cholesky factorization package", ACM TOMS 31, 2005 (the pattern of L).
#[derive(Clone, Debug)]
pub(crate) struct Simplicial {
    n: usize,
    /// Position of each unknown in elimination order, and one past the last.
    position: Vec<u32>,
    /// Conductances between unknowns by column in elimination order: rows below the diagonal, and values from place 1 on.
    a_first: Vec<u32>,
    a_row: Vec<u32>,
    a: Vec<f64>,
    /// Conductance to held heads.
    ground: Vec<f64>,
    /// Minus L by column, rows ascending.
    l_first: Vec<u32>,
    l_row: Vec<u32>,
    l: Vec<f64>,
    /// D and 1/D.
    pivot: Vec<f64>,
    inverse: Vec<f64>,
    /// Conductance to held heads when the unknown is eliminated.
    grounded: Vec<f64>,
    /// Per row of L, its columns ascending.
    row_first: Vec<u32>,
    row_column: Vec<u32>,
    /// Entries used so far per column.
    used: Vec<u32>,
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
        // lower triangle in elimination order by column, parallel couplings sharing one entry
        let placed = |&(i, j): &(u32, u32)| {
            let (i, j) = (position[i as usize], position[j as usize]);
            (i.min(j), i.max(j))
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
        let (a_first, a_row) = columns(n, &entries);
        // the same by row
        let mut transposed: Vec<(u32, u32)> = entries.iter().map(|&(i, j)| (j, i)).collect();
        transposed.sort_unstable();
        let (upper_first, upper_row) = columns(n, &transposed);
        let (row_first, row_column, l_first, l_row) = symbolic(n, &upper_first, &upper_row);
        let mut position = position;
        position.push(n as u32);
        let factor = Self {
            n,
            a: vec![0.0; 1 + a_row.len()],
            a_first,
            a_row,
            ground: vec![0.0; n + 1],
            l: vec![0.0; l_row.len()],
            used: vec![0; n],
            l_first,
            l_row,
            pivot: vec![0.0; n],
            inverse: vec![0.0; n],
            grounded: vec![0.0; n],
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

    /// Multiplications of one factorisation: the squares of the columns' lengths.
    fn work(&self) -> f64 {
        let lengths = self
            .l_first
            .windows(2)
            .map(|pair| f64::from(pair[1] - pair[0]));
        lengths.map(|length| length * length).sum()
    }

    /// Sets the matrix to zero.
    pub fn clear(&mut self) {
        self.a.fill(0.0);
        self.ground.fill(0.0);
    }

    /// See [`Factor::ground`].
    #[inline]
    pub fn ground(&mut self, i: u32, conductance: f64) {
        self.ground[self.position[i as usize] as usize] += conductance;
    }

    /// See [`Factor::join`].
    #[inline]
    pub fn join(&mut self, i: u32, j: u32, slot: Slot, conductance: f64) {
        if slot == Slot::UNUSED {
            self.ground(i, conductance);
            self.ground(j, conductance);
        } else {
            self.a[slot.0 as usize] += conductance;
        }
    }

    /// Factorises; false if a figure is not finite.
    ///
    /// An unknown without any entry stays zero. A pivot of zero belongs to the last node of a set that no open line joins to
    /// a held head: that head is pinned, its unknown zero in every solution.
    pub fn factorise(&mut self) -> bool {
        self.used.copy_from_slice(&self.l_first[..self.n]);
        for k in 0..self.n {
            for p in self.a_first[k] as usize..self.a_first[k + 1] as usize {
                self.work[self.a_row[p] as usize] = self.a[p + 1];
            }
            let mut ground = self.ground[k];
            for p in self.row_first[k] as usize..self.row_first[k + 1] as usize {
                let i = self.row_column[p] as usize;
                let (here, end) = (self.used[i] as usize, self.l_first[i + 1] as usize);
                self.used[i] += 1;
                let share = self.l[here];
                ground += share * self.grounded[i];
                let y = share * self.pivot[i];
                for (row, l) in self.l_row[here + 1..end].iter().zip(&self.l[here + 1..end]) {
                    self.work[*row as usize] += l * y;
                }
            }
            let column = self.l_first[k] as usize..self.l_first[k + 1] as usize;
            let rows = &self.l_row[column.clone()];
            let mut pivot = ground;
            for row in rows {
                pivot += self.work[*row as usize];
            }
            if !pivot.is_finite() {
                self.work.fill(0.0);
                return false;
            }
            let inverse = if pivot > 0.0 { 1.0 / pivot } else { 0.0 };
            for (row, l) in rows.iter().zip(&mut self.l[column]) {
                *l = inverse * std::mem::take(&mut self.work[*row as usize]);
            }
            (self.grounded[k], self.pivot[k], self.inverse[k]) = (ground, pivot, inverse);
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
                x[self.l_row[p] as usize] += self.l[p] * y;
            }
        }
        for k in (0..self.n).rev() {
            let mut y = x[k] * self.inverse[k];
            for p in self.l_first[k] as usize..self.l_first[k + 1] as usize {
                y += self.l[p] * x[self.l_row[p] as usize];
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
    // the diagonal too: the library takes it to be there
    pairs.extend((0..n as u32).map(|i| (i, i)));
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

/// Entries sorted by column and row: where each column starts, and the rows.
fn columns(n: usize, entries: &[(u32, u32)]) -> (Vec<u32>, Vec<u32>) {
    let mut first = vec![0; n + 1];
    for &(column, _) in entries {
        first[column as usize + 1] += 1;
    }
    prefix_sums(&mut first);
    (first, entries.iter().map(|&(_, row)| row).collect())
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
                    factor.ground(i as u32, d);
                    dense[(i, i)] += d;
                }
                for (&(i, j), &slot) in couplings.iter().zip(&slots) {
                    let y = 0.01 + random();
                    factor.join(i, j, slot, y);
                    for k in [i, j] {
                        dense[(k as usize, k as usize)] += y;
                    }
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
        factor.join(0, 1, slots[0], 3.0);
        assert!(factor.factorise());
        let mut x = [6.0, -6.0];
        factor.solve(&mut x);
        assert!((x[0] - x[1] - 2.0).abs() < 1e-15 && x.contains(&0.0));
        factor.ground(0, f64::NAN);
        assert!(!factor.factorise());
    }

    /// Three nodes tied together strongly hang on a held head by a conductance far below the rounding of their ties.
    #[test]
    fn a_weak_tie_to_a_held_head_is_not_lost() {
        let (mut factor, slots) = Simplicial::new(3, &[(0, 1), (1, 2), (0, 2)]);
        factor.clear();
        for (&(i, j), &slot) in [(0, 1), (1, 2), (0, 2)].iter().zip(&slots) {
            factor.join(i, j, slot, 1e7);
        }
        factor.ground(1, 1e-13);
        assert!(factor.factorise());
        let mut x = [1e-13, 0.0, 0.0];
        factor.solve(&mut x);
        assert!(x.iter().all(|x| (x - 1.0).abs() < 1e-14), "{x:?}");
    }
}
