//! Where each sum along the run lies in the integrator's vector: first the volumes, then what only adds up.

/// The places of the sums. Volumes come first: they alone are the state.
#[derive(Clone, Copy, Debug)]
pub(super) struct Books {
    /// Tanks.
    pub tanks: usize,
    /// Pumps.
    pub pumps: usize,
}

impl Books {
    /// Volume in tank `i`.
    pub fn volume(self, i: usize) -> usize {
        i
    }

    /// What flowed into tank `i`.
    pub fn inflow(self, i: usize) -> usize {
        self.tanks + i
    }

    /// What flowed out of tank `i`, spilled volume apart.
    pub fn outflow(self, i: usize) -> usize {
        2 * self.tanks + i
    }

    /// What tank `i` spilled.
    pub fn spilled(self, i: usize) -> usize {
        3 * self.tanks + i
    }

    /// What was drawn in vain from tank `i`.
    pub fn unmet(self, i: usize) -> usize {
        4 * self.tanks + i
    }

    /// What was drawn in vain at points.
    pub fn point_unmet(self) -> usize {
        5 * self.tanks
    }

    /// Inflow at points that had nowhere to go.
    pub fn point_spilled(self) -> usize {
        5 * self.tanks + 1
    }

    /// What went through pump `i`.
    pub fn pumped(self, i: usize) -> usize {
        5 * self.tanks + 2 + i
    }

    /// Shaft energy of pump `i`.
    pub fn shaft_energy(self, i: usize) -> usize {
        5 * self.tanks + 2 + self.pumps + i
    }

    /// Electrical energy of pump `i`.
    pub fn energy(self, i: usize) -> usize {
        5 * self.tanks + 2 + 2 * self.pumps + i
    }

    /// Electrical energy of all pumps.
    pub fn total_energy(self) -> usize {
        5 * self.tanks + 2 + 3 * self.pumps
    }

    /// How many sums there are.
    pub fn len(self) -> usize {
        self.total_energy() + 1
    }
}
