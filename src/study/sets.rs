//! The distinct sets of running pumps: interchangeable pumps of a bank count once.

use crate::network::{Network, Settings};
use crate::part::PumpId;

/// Pumps that may stand for one another: in one bank, with equal settings and equal parts.
pub type Group = Vec<PumpId>;

/// Puts pumps into groups, in the order of the network. A line of several pumps is switched pump by pump.
pub fn groups(network: &Network, settings: &Settings, pumps: &[PumpId]) -> Vec<Group> {
    let mut groups: Vec<Group> = Vec::new();
    for &pump in pumps {
        let alike = |group: &&mut Group| interchangeable(network, settings, group[0], pump);
        match groups.iter_mut().find(alike) {
            Some(group) => group.push(pump),
            None => groups.push(vec![pump]),
        }
    }
    groups
}

fn interchangeable(network: &Network, settings: &Settings, a: PumpId, b: PumpId) -> bool {
    let (line_a, line_b) = (network.line_of(a), network.line_of(b));
    let bank = network
        .banks()
        .iter()
        .find(|bank| bank.lines.contains(&line_a));
    let one_pump = |line| network.line(line).pumps().count() == 1;
    let same_setting = {
        let (a, b) = (settings.pump(a), settings.pump(b));
        (a.speed, a.trim, a.wear, a.leakage) == (b.speed, b.trim, b.wear, b.leakage)
    };
    bank.is_some_and(|bank| bank.lines.contains(&line_b))
        && one_pump(line_a)
        && one_pump(line_b)
        && same_setting
        && network.pump(a).model == network.pump(b).model
        && network.equal_parts(line_a, line_b, settings)
}

/// How many distinct sets there are, the empty one left out; saturates.
pub fn count(groups: &[Group]) -> usize {
    groups.iter().fold(1usize, |product, group| {
        product.saturating_mul(group.len() + 1)
    }) - 1
}

/// All distinct sets but the empty one: fewest pumps first, then in the order of the pumps.
pub fn all(groups: &[Group]) -> Vec<Vec<PumpId>> {
    let mut sets: Vec<Vec<PumpId>> = vec![Vec::new()];
    for group in groups {
        let before = std::mem::take(&mut sets);
        for set in before {
            for n in 0..=group.len() {
                let mut longer = set.clone();
                longer.extend(&group[..n]);
                sets.push(longer);
            }
        }
    }
    sets.retain(|set| !set.is_empty());
    sets.sort_by_key(|set| (set.len(), set.clone()));
    sets
}
