//! What the iterations write.

/// Heads, flows and shut one-way lines: what the iterations write.
#[derive(Debug)]
pub(super) struct State {
    /// Per node, m.
    pub heads: Vec<f64>,
    /// Per line, m3/s.
    pub flows: Vec<f64>,
    /// Per line: a live one-way line that is held shut.
    pub shut: Vec<bool>,
    /// Nothing is known of the flows in passive lines: what stands there is a size without a direction.
    pub cold: bool,
}

impl Clone for State {
    fn clone(&self) -> Self {
        Self {
            heads: self.heads.clone(),
            flows: self.flows.clone(),
            shut: self.shut.clone(),
            cold: self.cold,
        }
    }

    /// Writes over what is there; allocates nothing where the sizes agree.
    fn clone_from(&mut self, other: &Self) {
        self.heads.clone_from(&other.heads);
        self.flows.clone_from(&other.flows);
        self.shut.clone_from(&other.shut);
        self.cold = other.cold;
    }
}
