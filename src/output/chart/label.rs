//! Labels that do not overlap: each is tried at places near what it names, then further off with a line leading to it, and takes the
//! place where it covers least.

use super::text::width;

/// A rectangle on paper, mm, y downwards.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Area {
    pub left: f64,
    pub top: f64,
    pub right: f64,
    pub bottom: f64,
}

impl Area {
    pub fn overlaps(&self, other: &Self) -> bool {
        self.left < other.right
            && other.left < self.right
            && self.top < other.bottom
            && other.top < self.bottom
    }

    fn holds(&self, other: &Self) -> bool {
        self.left <= other.left
            && other.right <= self.right
            && self.top <= other.top
            && other.bottom <= self.bottom
    }

    fn widened(self, by: f64) -> Self {
        Self {
            left: self.left - by,
            right: self.right + by,
            ..self
        }
    }

    pub fn around(centre: [f64; 2], half: f64) -> Self {
        Self {
            left: centre[0] - half,
            top: centre[1] - half,
            right: centre[0] + half,
            bottom: centre[1] + half,
        }
    }

    /// Whether a straight line passes through it (Liang and Barsky's clipping: some part of the line is inside all four edges).
    pub fn is_crossed(&self, [a, b]: [[f64; 2]; 2]) -> bool {
        let (mut enters, mut leaves) = (0.0f64, 1.0f64);
        for (from, step, low, high) in [
            (a[0], b[0] - a[0], self.left, self.right),
            (a[1], b[1] - a[1], self.top, self.bottom),
        ] {
            if step.abs() < 1e-12 {
                if from <= low || from >= high {
                    return false;
                }
                continue;
            }
            let (first, last) = ((low - from) / step, (high - from) / step);
            enters = enters.max(first.min(last));
            leaves = leaves.min(first.max(last));
        }
        enters < leaves
    }
}

/// What is to be written, and where it belongs.
#[derive(Clone, Debug)]
pub(super) struct Wanted<'a> {
    /// The best first.
    pub texts: &'a [String],
    pub size: f64,
    /// Places on what it names, the best first.
    pub anchors: Vec<[f64; 2]>,
    /// How far from the place it has to stay, mm.
    pub gap: f64,
    /// Direction in which it is tried first, radians from the right, clockwise.
    pub towards: f64,
    /// Whether it is left out rather than led to.
    pub modest: bool,
}

/// To the upper right, as people write.
pub(super) const UPPER_RIGHT: f64 = -std::f64::consts::FRAC_PI_4;

/// Where a label has found its place.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Placed {
    pub text: String,
    pub area: Area,
    /// Left end of its base line.
    pub base: [f64; 2],
    /// From what it names to it, where it stands apart.
    pub leader: Option<[[f64; 2]; 2]>,
}

/// A pane with what stands in it already.
pub(super) struct Places {
    bounds: Area,
    taken: Vec<Area>,
    marks: Vec<Area>,
    lines: Vec<[[f64; 2]; 2]>,
}

/// Height of a line of text over its size: from the top of the tallest letter to the foot of the deepest.
const HEIGHT: f64 = 1.12;
/// Of that, above the base line.
const RISE: f64 = 0.84;
/// What a crossed line costs, against 1 per mm of distance.
const CROSSING: f64 = 9.0;
/// What a mark costs that a leader passes over.
const PASSING: f64 = 1.5;
/// What each further choice of text or place costs.
const CHOICE: f64 = 0.35;
const SHORTER: f64 = 6.0;
/// Distances at which a label is led to, mm, and in how many directions.
const RINGS: [(f64, usize); 6] = [
    (4.0, 16),
    (7.0, 16),
    (11.0, 24),
    (16.0, 32),
    (22.0, 40),
    (28.0, 48),
];
/// Left free to both sides of a label, mm.
const APART: f64 = 0.6;
/// A label that would cross more than this stands elsewhere.
const WORST: f64 = 60.0;

impl Places {
    pub fn new(bounds: Area) -> Self {
        Self {
            bounds,
            taken: Vec::new(),
            marks: Vec::new(),
            lines: Vec::new(),
        }
    }

    /// A mark stands here: no label may, but a leader can pass.
    pub fn mark(&mut self, area: Area) {
        self.marks.push(area);
    }

    /// A line that labels had better not cover.
    pub fn avoid(&mut self, points: &[[f64; 2]]) {
        self.lines
            .extend(points.windows(2).map(|pair| [pair[0], pair[1]]));
    }

    /// Finds the place that costs least, and takes it; none where there is no free one.
    pub fn place(&mut self, wanted: &Wanted) -> Option<Placed> {
        let mut best: Option<(f64, Placed)> = None;
        let mut consider = |cost: f64, placed: Placed| {
            if best.as_ref().is_none_or(|(least, _)| cost < *least) {
                best = Some((cost, placed));
            }
        };
        for (shorter, text) in wanted.texts.iter().enumerate() {
            let size = [width(text, wanted.size), HEIGHT * wanted.size];
            let base = SHORTER * shorter as f64;
            for (choice, anchor) in wanted.anchors.iter().enumerate() {
                let near = directions(8, wanted.towards);
                let cost = base + CHOICE * choice as f64;
                for (turn, direction) in near.iter().enumerate() {
                    let area = beside(*anchor, *direction, wanted.gap, size);
                    if let Some(covers) = self.cost(&area) {
                        let cost = cost + 0.1 * turn as f64 + covers;
                        consider(cost, placed(text, area, wanted.size, None));
                    }
                }
                if wanted.modest || choice % 2 == 1 {
                    continue;
                }
                for (distance, count) in RINGS {
                    for direction in directions(count, wanted.towards) {
                        let area = beside(*anchor, direction, distance, size);
                        let Some(covers) = self.cost(&area) else {
                            continue;
                        };
                        let leader = [*anchor, nearest(*anchor, &area)];
                        if self
                            .taken
                            .iter()
                            .any(|other| crosses_apart(other, leader, *anchor))
                        {
                            continue;
                        }
                        let passed = self.marks.iter();
                        let passed = passed
                            .filter(|mark| crosses_apart(mark, leader, *anchor))
                            .count();
                        let cost = cost + 2.0 + distance + covers + PASSING * passed as f64;
                        consider(cost, placed(text, area, wanted.size, Some(leader)));
                    }
                }
            }
        }
        let limit = if wanted.modest { CROSSING } else { WORST };
        let (_, placed) = best.filter(|(cost, _)| *cost < limit)?;
        self.taken.push(placed.area.widened(APART));
        if let Some(leader) = placed.leader {
            self.lines.push(leader);
        }
        Some(placed)
    }

    /// What standing there would cover; none where something stands.
    fn cost(&self, area: &Area) -> Option<f64> {
        let mut standing = self.taken.iter().chain(&self.marks);
        if !self.bounds.holds(area) || standing.any(|other| other.overlaps(area)) {
            return None;
        }
        let crossed = self
            .lines
            .iter()
            .filter(|line| area.is_crossed(**line))
            .count();
        // Several pieces of one curve under a label are no worse than two.
        Some(CROSSING * (crossed.min(6) as f64))
    }
}

/// Whether a leader passes through an area other than the one its anchor stands in.
fn crosses_apart(area: &Area, leader: [[f64; 2]; 2], anchor: [f64; 2]) -> bool {
    let own = Area::around(anchor, 1e-6);
    !area.overlaps(&own) && area.is_crossed(leader)
}

fn placed(text: &str, area: Area, size: f64, leader: Option<[[f64; 2]; 2]>) -> Placed {
    Placed {
        text: text.to_owned(),
        area,
        base: [area.left, area.top + RISE * size],
        leader,
    }
}

/// Directions all round, `first` first and then in turn to both sides of it.
fn directions(count: usize, first: f64) -> Vec<[f64; 2]> {
    let turn = std::f64::consts::TAU / count as f64;
    (0..count)
        .map(|i| {
            let side = if i % 2 == 1 { 1.0 } else { -1.0 };
            let angle = first + side * turn * i.div_ceil(2) as f64;
            [angle.cos(), angle.sin()]
        })
        .collect()
}

/// The area of a text at that distance and direction from an anchor: its nearest edge or corner stands there.
fn beside(anchor: [f64; 2], direction: [f64; 2], distance: f64, size: [f64; 2]) -> Area {
    let [x, y] = [0, 1].map(|i| anchor[i] + distance * direction[i]);
    // Straight above or beside, the middle of the edge looks at the anchor.
    let shift = |d: f64, extent: f64| {
        if d > 0.4 {
            0.0
        } else if d < -0.4 {
            -extent
        } else {
            -0.5 * extent
        }
    };
    let left = x + shift(direction[0], size[0]);
    let top = y + shift(direction[1], size[1]);
    Area {
        left,
        top,
        right: left + size[0],
        bottom: top + size[1],
    }
}

/// The point of an area's edge nearest to another point.
fn nearest(point: [f64; 2], area: &Area) -> [f64; 2] {
    [
        point[0].clamp(area.left, area.right),
        point[1].clamp(area.top, area.bottom),
    ]
}

#[cfg(test)]
mod tests {
    use super::*;

    fn wanted(texts: &[String], at: [f64; 2]) -> Wanted<'_> {
        Wanted {
            texts,
            size: 2.6,
            anchors: vec![at],
            gap: 1.0,
            towards: UPPER_RIGHT,
            modest: false,
        }
    }

    #[test]
    fn labels_of_one_place_stand_apart() {
        let bounds = Area {
            left: 0.0,
            top: 0.0,
            right: 60.0,
            bottom: 40.0,
        };
        let mut places = Places::new(bounds);
        let text = ["a label".to_owned()];
        let found: Vec<Placed> = (0..12)
            .filter_map(|_| places.place(&wanted(&text, [30.0, 20.0])))
            .collect();
        assert!(found.len() >= 8, "{} places", found.len());
        for (i, a) in found.iter().enumerate() {
            assert!(bounds.holds(&a.area));
            assert!(found[i + 1..].iter().all(|b| !a.area.overlaps(&b.area)));
        }
    }

    #[test]
    fn the_shorter_text_is_taken_where_the_longer_one_has_no_room() {
        let bounds = Area {
            left: 0.0,
            top: 0.0,
            right: 8.0,
            bottom: 10.0,
        };
        let texts = ["far too long to fit".to_owned(), "A".to_owned()];
        let found = Places::new(bounds)
            .place(&wanted(&texts, [4.0, 5.0]))
            .unwrap();
        assert_eq!(found.text, "A");
    }

    #[test]
    fn a_line_through_a_corner_is_seen() {
        let area = Area {
            left: 0.0,
            top: 0.0,
            right: 2.0,
            bottom: 2.0,
        };
        assert!(
            area.is_crossed([[-1.0, 1.5], [1.0, 3.0 - 0.1]])
                || area.is_crossed([[-1.0, 1.0], [3.0, 1.0]])
        );
        assert!(!area.is_crossed([[-1.0, 3.0], [3.0, 3.0]]));
        assert!(area.is_crossed([[0.5, 0.5], [0.6, 0.6]]));
    }
}
