//! Places of nodes and lines in a drawing: left to right by flow, every line with a height of its own so that no label meets another.
//!
//! Nodes stand in even columns, the middles of lines in odd ones; a line that spans several columns passes each at a height of its
//! own. Within a column, items are put in the order of the mean height of their neighbours, a few times over and back: K. Sugiyama,
//! S. Tagawa, M. Toda, "Methods for visual understanding of hierarchical system structures", IEEE Transactions SMC 11(2), 1981.

/// A line to be drawn: from one node to another, by position, in the direction of its flow.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Edge {
    pub from: usize,
    pub to: usize,
}

/// Where things stand: columns from 0, heights in units of the least distance, from 0 down.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Layout {
    /// Per node: column and height.
    pub nodes: Vec<(usize, f64)>,
    /// Per line: the places it passes between its ends, in order from `from` to `to`.
    pub ways: Vec<Vec<(usize, f64)>>,
    /// Number of columns.
    pub columns: usize,
    /// Height of the lowest item.
    pub height: f64,
}

/// Sweeps over the columns; more change nothing in networks small enough to be drawn.
const SWEEPS: usize = 12;

/// An item of a column.
struct Item {
    neighbours: Vec<usize>,
    column: usize,
    height: f64,
}

pub(super) fn layout(nodes: usize, edges: &[Edge]) -> Layout {
    let ranks = ranks(nodes, edges);
    let mut items: Vec<Item> = ranks
        .iter()
        .map(|rank| Item {
            neighbours: Vec::new(),
            column: 2 * rank,
            height: 0.0,
        })
        .collect();
    let ways: Vec<Vec<usize>> = edges.iter().map(|edge| way(edge, &mut items)).collect();
    let columns = 1 + items.iter().map(|item| item.column).max().unwrap_or(0);
    let mut by_column: Vec<Vec<usize>> = vec![Vec::new(); columns];
    for (i, item) in items.iter().enumerate() {
        by_column[item.column].push(i);
    }
    for column in &by_column {
        for (height, item) in column.iter().enumerate() {
            items[*item].height = height as f64;
        }
    }
    for sweep in 0..SWEEPS {
        let forth = sweep % 2 == 0;
        for step in 0..columns {
            let column = if forth { step } else { columns - 1 - step };
            settle(&mut by_column[column], &mut items);
        }
    }
    let top = items.iter().map(|item| item.height).fold(0.0, f64::min);
    let place = |item: &usize| (items[*item].column, items[*item].height - top);
    let all: Vec<usize> = (0..nodes).collect();
    Layout {
        nodes: all.iter().map(place).collect(),
        ways: ways
            .iter()
            .map(|way| way.iter().map(place).collect())
            .collect(),
        columns,
        height: items
            .iter()
            .map(|item| item.height - top)
            .fold(0.0, f64::max),
    }
}

/// Per node, the most lines that lead to it one after the other; lines that close a circle do not count.
fn ranks(nodes: usize, edges: &[Edge]) -> Vec<usize> {
    let mut ranks: Vec<usize> = vec![0; nodes];
    // Each round carries ranks one line further; a way without a circle has fewer lines than there are nodes.
    let forward = without_circles(nodes, edges);
    for _ in 0..nodes {
        let mut changed = false;
        for edge in &forward {
            let next = ranks[edge.from] + 1;
            if ranks[edge.to] < next {
                ranks[edge.to] = next;
                changed = true;
            }
        }
        if !changed {
            break;
        }
    }
    // A node that only sends stands next to its nearest receiver rather than far left.
    for _ in 0..nodes {
        for node in 0..nodes {
            let receives = forward.iter().any(|edge| edge.to == node);
            let nearest = forward
                .iter()
                .filter(|edge| edge.from == node)
                .map(|edge| ranks[edge.to])
                .min();
            if let (false, Some(nearest)) = (receives, nearest) {
                ranks[node] = nearest.saturating_sub(1);
            }
        }
    }
    ranks
}

/// The edges, those that lead back into a way already walked left out.
fn without_circles(nodes: usize, edges: &[Edge]) -> Vec<Edge> {
    const NEW: u8 = 0;
    const OPEN: u8 = 1;
    const DONE: u8 = 2;
    let mut state = vec![NEW; nodes];
    let mut kept = Vec::new();
    let receives = |node: usize| edges.iter().any(|edge| edge.to == node);
    let mut starts: Vec<usize> = (0..nodes).collect();
    starts.sort_by_key(|node| receives(*node));
    for start in starts {
        if state[start] != NEW {
            continue;
        }
        // A stack of nodes with the next edge to look at.
        let mut stack = vec![(start, 0)];
        state[start] = OPEN;
        while let Some((node, next)) = stack.pop() {
            let Some(offset) = edges[next..].iter().position(|edge| edge.from == node) else {
                state[node] = DONE;
                continue;
            };
            let at = next + offset;
            stack.push((node, at + 1));
            let to = edges[at].to;
            if state[to] != OPEN {
                kept.push(edges[at]);
            }
            if state[to] == NEW {
                state[to] = OPEN;
                stack.push((to, 0));
            }
        }
    }
    kept
}

/// Makes the items that a line passes between its ends, and ties them together.
fn way(edge: &Edge, items: &mut Vec<Item>) -> Vec<usize> {
    let (from, to) = (items[edge.from].column, items[edge.to].column);
    let columns: Vec<usize> = if from < to {
        (from + 1..to).collect()
    } else if to < from {
        (to + 1..from).rev().collect()
    } else {
        vec![from + 1]
    };
    let mut last = edge.from;
    let mut way = Vec::new();
    for column in columns {
        let item = items.len();
        items.push(Item {
            neighbours: vec![last],
            column,
            height: 0.0,
        });
        items[last].neighbours.push(item);
        way.push(item);
        last = item;
    }
    items[last].neighbours.push(edge.to);
    items[edge.to].neighbours.push(last);
    way
}

/// Orders a column by the mean height of the neighbours, and moves its items towards it, at least 1 apart.
fn settle(column: &mut [usize], items: &mut [Item]) {
    let wanted = |item: usize| {
        let neighbours = &items[item].neighbours;
        if neighbours.is_empty() {
            return items[item].height;
        }
        let sum: f64 = neighbours.iter().map(|n| items[*n].height).sum();
        sum / neighbours.len() as f64
    };
    let mut wishes: Vec<(f64, usize)> = column.iter().map(|item| (wanted(*item), *item)).collect();
    wishes.sort_by(|a, b| a.0.total_cmp(&b.0));
    let mut heights: Vec<f64> = Vec::with_capacity(wishes.len());
    for (wish, _) in &wishes {
        let least = heights.last().map_or(f64::NEG_INFINITY, |last| last + 1.0);
        heights.push(wish.max(least));
    }
    // Pushing down only would drift: move all by the mean of what they were pushed.
    let pushed: f64 = wishes
        .iter()
        .zip(&heights)
        .map(|((wish, _), height)| height - wish)
        .sum();
    let mean = pushed / wishes.len().max(1) as f64;
    for (place, ((_, item), height)) in wishes.iter().zip(heights).enumerate() {
        items[*item].height = height - mean;
        column[place] = *item;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn edges(pairs: &[(usize, usize)]) -> Vec<Edge> {
        pairs.iter().map(|&(from, to)| Edge { from, to }).collect()
    }

    #[test]
    fn a_station_stands_left_to_right_its_bank_side_by_side() {
        // tank, header, outfall; three lines of a bank and a main
        let found = layout(3, &edges(&[(0, 1), (0, 1), (0, 1), (1, 2)]));
        assert_eq!(
            found.nodes.iter().map(|node| node.0).collect::<Vec<_>>(),
            [0, 2, 4]
        );
        let mut bank: Vec<f64> = found.ways[..3].iter().map(|way| way[0].1).collect();
        bank.sort_by(f64::total_cmp);
        assert!(
            bank.windows(2).all(|pair| pair[1] - pair[0] >= 1.0 - 1e-9),
            "{bank:?}"
        );
    }

    #[test]
    fn circles_and_lonely_nodes_have_places() {
        let found = layout(4, &edges(&[(0, 1), (1, 2), (2, 0)]));
        assert_eq!(found.nodes.len(), 4);
        assert!(found.ways.iter().all(|way| !way.is_empty()));
        for column in 0..found.columns {
            let mut heights: Vec<f64> = found
                .nodes
                .iter()
                .chain(found.ways.iter().flatten())
                .filter(|place| place.0 == column)
                .map(|place| place.1)
                .collect();
            heights.sort_by(f64::total_cmp);
            assert!(
                heights
                    .windows(2)
                    .all(|pair| pair[1] - pair[0] >= 1.0 - 1e-9)
            );
        }
    }
}
