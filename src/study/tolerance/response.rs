//! From the place of every input between its limits to the figures of a network.
//!
//! What a path of the file does to the figures of a network is found by reading the file at a few places between the limits
//! and comparing the networks; then no text is read again. A figure that follows its input on a straight line is met exactly;
//! any other by a curve through [`PLACES`] readings. Figures under several inputs are products of what each makes of them
//! (loss coefficients, Darcy's and Reynolds' are products of powers), and sums where they are zero in the middle. Whether that
//! holds is tested on readings with all inputs changed at once.

use std::collections::BTreeMap;

use super::draw::Draw;
use crate::network::{Figure, Network, Settings, Spread, Varied};
use crate::part::curve::Curve;

/// Readings behind a curve.
const PLACES: usize = 65;
/// How well a straight line has to fit, relative to the figure.
const STRAIGHT: f64 = 1e-10;
/// How well what is read with all inputs changed has to be met, relative to the figure.
const TOGETHER: f64 = 1e-5;
/// Places of the inputs in those readings, taken in turn.
const TRIALS: [[f64; 3]; 4] = [
    [0.0, 1.0, 0.3],
    [1.0, 0.0, 0.8],
    [0.9, 0.85, 0.1],
    [0.15, 0.4, 0.95],
];

/// Something that is not known exactly.
#[derive(Clone, Debug)]
pub struct Input {
    /// How the user calls it.
    pub name: String,
    /// Its limits and what lies between.
    pub spread: Spread,
    /// What it acts on.
    pub effect: Effect,
}

/// What an input acts on.
#[derive(Clone, Debug)]
pub enum Effect {
    /// What reading the file shows.
    Read,
    /// These figures become 1 + x/100.
    Percent(Vec<Figure>),
}

/// Gives the network with each input at a place between its limits.
pub type Reading<'r, E> = dyn Fn(&[f64]) -> Result<Network, E> + 'r;

/// Why no responses could be found.
#[derive(Clone, Debug, PartialEq)]
pub enum ResponseError<E> {
    /// The file cannot be read so.
    Read(E),
    /// The input, by its place, changes more than figures: what runs, a curve, the number of parts.
    NotFigures(usize),
    /// The input changes nothing.
    Nothing(usize),
    /// Two inputs act on the same figure in a way that cannot be put together.
    Clash(usize, usize),
}

/// How a figure follows one input.
#[derive(Clone, Debug)]
enum Course {
    /// Between its values at the limits.
    Straight { low: f64, high: f64 },
    /// Over the place of the input.
    Bent(Curve),
}

impl Course {
    fn at(&self, draw: Draw) -> f64 {
        match self {
            Self::Straight { low, high } => low + draw.straight * (high - low),
            Self::Bent(curve) => curve.at(draw.place).value,
        }
    }
}

/// A figure and the inputs that act on it.
#[derive(Clone, Debug)]
struct Followed {
    figure: Figure,
    middle: f64,
    courses: Vec<(usize, Course)>,
}

impl Followed {
    fn at(&self, draws: &[Draw]) -> f64 {
        match self.courses.as_slice() {
            [(input, course)] => course.at(draws[*input]),
            courses if self.middle == 0.0 => courses
                .iter()
                .map(|(input, course)| course.at(draws[*input]))
                .sum(),
            courses => courses
                .iter()
                .fold(self.middle, |product, (input, course)| {
                    product * (course.at(draws[*input]) / self.middle)
                }),
        }
    }
}

/// The network in the middle of all limits, and how its figures follow the inputs.
#[derive(Clone, Debug)]
pub struct Responses {
    /// With every input in the middle of its limits.
    pub middle: Network,
    inputs: Vec<Input>,
    figures: Vec<Followed>,
}

impl Responses {
    /// For these inputs; `read` gives the network with each input at a place between its limits, those that act on no
    /// file aside.
    ///
    /// # Errors
    /// [`ResponseError`].
    pub fn find<E>(inputs: Vec<Input>, read: &Reading<E>) -> Result<Self, ResponseError<E>> {
        let at = |places: &[f64]| read(places).map_err(ResponseError::Read);
        let mut places = vec![0.5; inputs.len()];
        let file_middle = at(&places)?;
        let mut figures: BTreeMap<Figure, Followed> = BTreeMap::new();
        let mut follow = |figure, middle, input, course| {
            figures
                .entry(figure)
                .or_insert_with(|| Followed {
                    figure,
                    middle,
                    courses: Vec::new(),
                })
                .courses
                .push((input, course));
        };
        let mut varied = file_middle.varied();
        let mut settings = file_middle.settings().clone();
        for (i, input) in inputs.iter().enumerate() {
            match &input.effect {
                Effect::Percent(acted_on) => {
                    let Spread { low, high, .. } = input.spread;
                    let (low, high) = (1.0 + low / 100.0, 1.0 + high / 100.0);
                    for figure in acted_on {
                        let course = Course::Straight { low, high };
                        let middle = course.at(Draw::at(&input.spread, 0.5));
                        varied.set(&mut settings, *figure, middle);
                        follow(*figure, middle, i, course);
                    }
                }
                Effect::Read => {
                    let mut at_place = |t: f64| {
                        places[i] = t;
                        let network = at(&places);
                        places[i] = 0.5;
                        changed(&file_middle, &network?, i)
                    };
                    for (figure, middle, course) in courses(&input.spread, i, &mut at_place)? {
                        follow(figure, middle, i, course);
                    }
                }
            }
        }
        let responses = Self {
            middle: varied.into_network(settings),
            inputs,
            figures: figures.into_values().collect(),
        };
        responses.try_together(&file_middle, read)?;
        Ok(responses)
    }

    /// The inputs.
    pub fn inputs(&self) -> &[Input] {
        &self.inputs
    }

    /// Writes every figure that follows the inputs.
    pub fn write(&self, draws: &[Draw], network: &mut Varied, settings: &mut Settings) {
        for followed in &self.figures {
            network.set(settings, followed.figure, followed.at(draws));
        }
    }

    /// Reads with all inputs changed at once and compares.
    fn try_together<E>(
        &self,
        file_middle: &Network,
        read: &Reading<E>,
    ) -> Result<(), ResponseError<E>> {
        let shared: Vec<&Followed> = self
            .figures
            .iter()
            .filter(|followed| followed.courses.len() > 1)
            .collect();
        if shared.is_empty() {
            return Ok(());
        }
        for trial in TRIALS {
            let places: Vec<f64> = (0..self.inputs.len()).map(|i| trial[i % 3]).collect();
            let draws: Vec<Draw> = self
                .inputs
                .iter()
                .zip(&places)
                .map(|(input, place)| Draw::at(&input.spread, *place))
                .collect();
            let network = read(&places).map_err(ResponseError::Read)?;
            let (first, _) = shared[0].courses[0];
            let read: BTreeMap<Figure, f64> = figures_of(file_middle, &network, first)?
                .into_iter()
                .collect();
            for followed in &shared {
                let (expected, found) = (read.get(&followed.figure), followed.at(&draws));
                let fits = |read: &f64| (read - found).abs() <= TOGETHER * read.abs().max(1e-12);
                if !expected.is_some_and(fits) {
                    let (a, b) = (followed.courses[0].0, followed.courses[1].0);
                    return Err(ResponseError::Clash(a, b));
                }
            }
        }
        Ok(())
    }
}

/// Figures that differ: what they are in the middle, and there.
type Changed = BTreeMap<Figure, (f64, f64)>;

/// All figures of `network`, where it differs from `middle` in figures only.
fn figures_of<E>(
    middle: &Network,
    network: &Network,
    input: usize,
) -> Result<Vec<(Figure, f64)>, ResponseError<E>> {
    let figures = network.figures(network.settings());
    let mut varied = middle.varied();
    let mut settings = middle.settings().clone();
    for (figure, value) in &figures {
        varied.set(&mut settings, *figure, *value);
    }
    if varied.into_network(settings) == *network {
        Ok(figures)
    } else {
        Err(ResponseError::NotFigures(input))
    }
}

fn changed<E>(
    middle: &Network,
    network: &Network,
    input: usize,
) -> Result<Changed, ResponseError<E>> {
    let there = figures_of(middle, network, input)?;
    let here = middle.figures(middle.settings());
    let pairs = here.into_iter().zip(there);
    Ok(pairs
        .filter(|((_, a), (_, b))| a != b)
        .map(|((figure, a), (_, b))| (figure, (a, b)))
        .collect())
}

/// How each figure that an input changes follows it.
fn courses<E>(
    spread: &Spread,
    input: usize,
    at: &mut dyn FnMut(f64) -> Result<Changed, ResponseError<E>>,
) -> Result<Vec<(Figure, f64, Course)>, ResponseError<E>> {
    let (low, high) = (at(0.0)?, at(1.0)?);
    let tests = [0.25, 0.75];
    let read: Vec<Changed> = tests.iter().map(|t| at(*t)).collect::<Result<_, _>>()?;
    let mut figures: Vec<(Figure, f64)> = Vec::new();
    for (figure, (middle, _)) in low.iter().chain(&high) {
        if !figures.iter().any(|(known, _)| known == figure) {
            figures.push((*figure, *middle));
        }
    }
    if figures.is_empty() {
        return Err(ResponseError::Nothing(input));
    }
    let value = |changed: &Changed, figure: &Figure, middle: f64| {
        changed.get(figure).map_or(middle, |(_, there)| *there)
    };
    let mut bent: Vec<Changed> = Vec::new();
    let mut found = Vec::new();
    for (figure, middle) in figures {
        let course = Course::Straight {
            low: value(&low, &figure, middle),
            high: value(&high, &figure, middle),
        };
        let mut known = tests
            .iter()
            .zip(&read)
            .map(|(t, changed)| (*t, value(changed, &figure, middle)))
            .chain([(0.5, middle)]);
        let straight = known.all(|(t, value)| {
            let off = course.at(Draw::at(spread, t)) - value;
            off.abs() <= STRAIGHT * value.abs().max(1e-12)
        });
        if straight {
            found.push((figure, middle, course));
            continue;
        }
        let place = |k: usize| k as f64 / (PLACES - 1) as f64;
        if bent.is_empty() {
            bent = (0..PLACES)
                .map(|k| at(place(k)))
                .collect::<Result<_, _>>()?;
        }
        let x: Vec<f64> = (0..PLACES).map(place).collect();
        let y: Vec<f64> = bent
            .iter()
            .map(|changed| value(changed, &figure, middle))
            .collect();
        let curve = Curve::through(&x, &y).map_err(|_| ResponseError::NotFigures(input))?;
        found.push((figure, middle, Course::Bent(curve)));
    }
    Ok(found)
}
