//! `tolerances`: which figures are not known exactly, and between which limits they lie.
//!
//! ```text
//! tolerances:
//!   samples: 10000
//!   seed: 1
//!   pumps: {grade: 2B}                                             every pump as built, each its own
//!   main.roughness: {from: 0.1 mm, to: 1 mm, shape: log_even}      any path that a case can change
//!   duty.wear: {from: 0 %, to: 10 %, vary: together}
//! ```

mod pumps;

use super::changes::Change;
use super::context::{Bound, Context, Fields, found};
use super::yaml::{Form, Key, Marked, Scalar};
use super::{Document, Load, System};
use crate::diagnostic::{Diagnostic, Diagnostics, Place};
use crate::network::{Figure, Network, Shape, Spread};
use crate::units::Unit;

/// The section of the file.
pub(super) const SECTION: &str = "tolerances";

/// Most samples that can be asked for.
pub const MOST_SAMPLES: usize = 10_000_000;

/// Standard deviations from the middle to a limit where the file does not say.
const LIMITS_AT: f64 = 2.0;

const SHAPES: [&str; 3] = ["even", "log_even", "normal"];

/// What the file says about tolerances.
#[derive(Clone, Debug, Default)]
pub struct Tolerances {
    /// How many cases to draw.
    pub samples: Option<usize>,
    /// What the draws start from.
    pub seed: Option<u64>,
    /// What is not known exactly.
    pub inputs: Vec<Tolerance>,
    /// Whether pumps are said to be of a grade.
    pub graded: bool,
}

/// One thing that is not known exactly.
#[derive(Clone, Debug)]
pub struct Tolerance {
    /// How it is called.
    pub name: String,
    /// Symbol of the unit of its limits; empty without one.
    pub unit: &'static str,
    /// Its limits in that unit, and what lies between.
    pub spread: Spread,
    /// What it acts on.
    pub acts_on: ActsOn,
    /// Where it stands.
    pub place: Place,
}

/// What a tolerance acts on.
#[derive(Clone, Debug)]
pub enum ActsOn {
    /// The value of a path of the file.
    Path(PathRange),
    /// Figures of pumps as built, in per cent above or below 1.
    Built(Vec<Figure>),
}

/// A path of the file with its values at both limits.
#[derive(Clone, Debug)]
pub struct PathRange {
    path: Key,
    low: Marked,
    high: Marked,
}

impl Tolerance {
    /// The change of the file that puts it at a share `t` of its way; none if it acts on no path.
    pub fn change(&self, t: f64) -> Option<Change> {
        let ActsOn::Path(PathRange { path, low, high }) = &self.acts_on else {
            return None;
        };
        let value = if t <= 0.0 {
            low.clone()
        } else if t >= 1.0 {
            high.clone()
        } else {
            let text = format!("{} {}", self.spread.at(t), self.unit);
            Marked {
                place: low.place,
                value: Form::Scalar(Scalar::resolved(text.trim_end())),
            }
        };
        Some(Change::marked(path.clone(), value))
    }
}

impl Document {
    /// What the file says about tolerances, for the system that it gives with these changes. Both ends of every range pass the
    /// checks of the file.
    ///
    /// # Errors
    /// All problems of the section.
    pub fn tolerances(
        &self,
        system: &System,
        changes: &[Change],
        load: Load,
    ) -> Result<Tolerances, Diagnostics> {
        let mut cx = Context::new();
        cx.units = system.units.clone();
        let section = cx
            .any_map(&self.root, "a system file", "nodes")
            .and_then(|fields| fields.get(SECTION));
        let read = section.and_then(|node| tolerances(&mut cx, node, &system.network));
        let mut diagnostics = cx.diagnostics;
        let tolerances = read.unwrap_or_default();
        for input in &tolerances.inputs {
            for end in [0.0, 1.0] {
                let Some(change) = input.change(end) else {
                    continue;
                };
                let mut all = changes.to_vec();
                all.push(change);
                if let Err(problems) = self.system(&all, load) {
                    diagnostics.add_errors(&problems);
                    break;
                }
            }
        }
        diagnostics.sort();
        if diagnostics.has_errors() {
            Err(diagnostics)
        } else {
            Ok(tolerances)
        }
    }

    /// Whether the file has the section.
    pub(super) fn has_tolerances(&self) -> bool {
        matches!(&self.root.value, Form::Map(entries) if entries.iter().any(|(key, _)| key.name == SECTION))
    }
}

fn tolerances(cx: &mut Context, node: &Marked, network: &Network) -> Option<Tolerances> {
    let fields = cx.any_map(
        node,
        "`tolerances`",
        "main.roughness: {from: 0.1 mm, to: 1 mm}",
    )?;
    let mut all = Tolerances::default();
    for (key, value) in fields.entries() {
        match key.name.as_str() {
            "samples" => {
                all.samples =
                    whole(cx, value, "samples", 1, MOST_SAMPLES as u64).map(|n| n as usize)
            }
            "seed" => all.seed = whole(cx, value, "seed", 0, 1 << 53),
            "pumps" => {
                let items = match &value.value {
                    Form::List(items) => items.as_slice(),
                    _ => std::slice::from_ref(value),
                };
                for item in items {
                    pumps::pumps(cx, item, network, &mut all);
                }
            }
            path if path.contains('.') => by_path(cx, key, value, network, &mut all.inputs),
            other => {
                let known = ["samples", "seed", "pumps"];
                let message = format!("`tolerances` has no key `{other}`");
                let help = match crate::diagnostic::nearest(other, known) {
                    Some(near) => format!("did you mean `{near}`?"),
                    None => {
                        "it knows `samples`, `seed`, `pumps` and paths such as `main.roughness`"
                            .to_owned()
                    }
                };
                cx.push(Diagnostic::error("unknown-key", key.place, message).help(help));
            }
        }
    }
    if all.inputs.is_empty() && !cx.diagnostics.has_errors() {
        let message = "`tolerances` names nothing that varies";
        let help = "add for example `pumps: {grade: 2B}`";
        cx.push(Diagnostic::error("missing-key", node.place, message).help(help));
    }
    Some(all)
}

fn whole(cx: &mut Context, node: &Marked, key: &str, least: u64, most: u64) -> Option<u64> {
    let value = cx.number(node, format_args!("`{key}` of `tolerances`"), Bound::Any)?;
    if value.fract() == 0.0 && value >= least as f64 && value <= most as f64 {
        return Some(value as u64);
    }
    let message = format!(
        "`{key}` of `tolerances` must be a whole number from {least} to {most}, found {}",
        found(node)
    );
    cx.error("out-of-range", node.place, message);
    None
}

/// Whether members vary each on its own.
fn each(cx: &mut Context, fields: &Fields, what: &str, default: bool) -> Option<bool> {
    let Some(node) = fields.get("vary") else {
        return Some(default);
    };
    one_of(
        cx,
        node,
        &format!("`vary` of {what}"),
        &["each", "together"],
    )
    .map(|i| i == 0)
}

/// The position of a word among those that fit.
fn one_of(cx: &mut Context, node: &Marked, what: &str, words: &[&str]) -> Option<usize> {
    let word = cx.text(node, what)?;
    let position = words.iter().position(|known| *known == word);
    if position.is_none() {
        let message = format!("{what} cannot be `{word}`");
        let help = match crate::diagnostic::nearest(&word, words.iter().copied()) {
            Some(near) => format!("did you mean `{near}`?"),
            None => format!("it can be `{}`", words.join("`, `")),
        };
        cx.push(Diagnostic::error("unknown-name", node.place, message).help(help));
    }
    position
}

fn shape(cx: &mut Context, fields: &Fields, what: &str) -> Option<Shape> {
    let shape = match fields.get("shape") {
        None => Shape::Even,
        Some(node) => match one_of(cx, node, &format!("`shape` of {what}"), &SHAPES)? {
            0 => Shape::Even,
            1 => Shape::LogEven,
            _ => Shape::Normal {
                limits_at: LIMITS_AT,
            },
        },
    };
    let Some(node) = fields.get("limits_at") else {
        return Some(shape);
    };
    let label = format!("`limits_at` of {what}");
    let limits_at = cx.number(node, &label, Bound::Positive)?;
    if !(0.1..=10.0).contains(&limits_at) {
        let message = format!(
            "{label} must be from 0.1 to 10 standard deviations, found {}",
            found(node)
        );
        cx.error("out-of-range", node.place, message);
        return None;
    }
    if !matches!(shape, Shape::Normal { .. }) {
        let message = format!("{label} goes with `shape: normal` only");
        let place = fields.key_place("limits_at");
        cx.push(
            Diagnostic::error("stray-key", place, message)
                .help("remove it, or add `shape: normal`"),
        );
        return None;
    }
    Some(Shape::Normal { limits_at })
}

/// `PATH: {from, to, shape, limits_at, vary}`.
fn by_path(
    cx: &mut Context,
    key: &Key,
    node: &Marked,
    network: &Network,
    inputs: &mut Vec<Tolerance>,
) {
    let what = format!("tolerance `{}`", key.name);
    let keys = ["from", "to", "shape", "limits_at", "vary"];
    let Some(fields) = cx.map(node, &what, &keys) else {
        return;
    };
    let from = cx.required(&fields, "from", &what, "0.1 mm");
    let to = cx.required(&fields, "to", &what, "1 mm");
    let shape = shape(cx, &fields, &what);
    let each = each(cx, &fields, &what, false);
    let (Some(from), Some(to), Some(shape), Some(each)) = (from, to, shape, each) else {
        return;
    };
    let Some((low, high, unit)) = limits(cx, from, to, &what) else {
        return;
    };
    let Some(spread) = spread(cx, (low, high), shape, from, to, &what) else {
        return;
    };
    let Some(paths) = paths(cx, key, network, each) else {
        return;
    };
    inputs.extend(paths.into_iter().map(|path| Tolerance {
        name: path.name.clone(),
        unit: unit.map_or("", |unit| unit.symbol),
        spread,
        place: key.place,
        acts_on: ActsOn::Path(PathRange {
            path,
            low: from.clone(),
            high: to.clone(),
        }),
    }));
}

/// The paths to vary: the one that was written, or that of every member of the bank that it names.
fn paths(cx: &mut Context, key: &Key, network: &Network, each: bool) -> Option<Vec<Key>> {
    if !each {
        return Some(vec![key.clone()]);
    }
    let (name, rest) = key.name.split_once('.').unwrap_or((&key.name, ""));
    let Some(bank) = network.banks().iter().find(|bank| bank.name == name) else {
        let message = format!(
            "`{}` cannot vary each on its own: `{name}` is no bank",
            key.name
        );
        let help = "only members of a bank (`count`) vary so; give single lines a tolerance each";
        cx.push(Diagnostic::error("change", key.place, message).help(help));
        return None;
    };
    let member = |line: &crate::network::LineId| Key {
        name: format!("{}.{rest}", network.line(*line).name),
        place: key.place,
    };
    Some(bank.lines.iter().map(member).collect())
}

/// Both limits in the unit of the first.
fn limits(
    cx: &mut Context,
    from: &Marked,
    to: &Marked,
    what: &str,
) -> Option<(f64, f64, Option<&'static Unit>)> {
    let low = cx.any_quantity(from, format_args!("`from` of {what}"), None);
    let high = cx.any_quantity(to, format_args!("`to` of {what}"), None);
    let (low, high) = (low?, high?);
    match (low.unit(), high.unit()) {
        (None, None) => Some((low.number(), high.number(), None)),
        (Some(a), Some(b)) if a.kind == b.kind => {
            let high = if a.symbol == b.symbol {
                high.number()
            } else {
                a.from_si(b.to_si(high.number()))
            };
            Some((low.number(), high, Some(a)))
        }
        (a, b) => {
            let said = |unit: Option<&Unit>| {
                unit.map_or("a bare number".to_owned(), |unit| unit.kind.with_article())
            };
            let message = format!("`from` of {what} is {}, and `to` is {}", said(a), said(b));
            let help = "give both limits in units of one kind, or both without";
            cx.push(Diagnostic::error("wrong-unit", to.place, message).help(help));
            None
        }
    }
}

fn spread(
    cx: &mut Context,
    (low, high): (f64, f64),
    shape: Shape,
    from: &Marked,
    to: &Marked,
    what: &str,
) -> Option<Spread> {
    if low >= high {
        let message = format!(
            "`to` of {what} must lie above `from`, found {} to {}",
            found(from),
            found(to)
        );
        cx.push(
            Diagnostic::error("out-of-range", to.place, message).help("put the smaller one first"),
        );
        return None;
    }
    if shape == Shape::LogEven && low <= 0.0 {
        let message = format!(
            "{what} is even in the logarithm: `from` must be above zero, found {}",
            found(from)
        );
        cx.error("out-of-range", from.place, message);
        return None;
    }
    Some(Spread { low, high, shape })
}
