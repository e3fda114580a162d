//! Changes to a system by path, `NAME.key: value`: what `cases` are made of, and the options of the command line.
//!
//! A change is made in the tree of the file before that is read, so that a changed value passes the same checks as a written
//! one. The place of the new value is the place in the case.

use std::collections::BTreeMap;

use super::context::{Context, scalar_text};
use super::edit::{entry, find, get, part_keys, parts_mut, section_mut, set};
use super::lines::PARTS;
use super::names::EVERY;
use super::yaml::{Form, Key, Marked, Scalar};
use crate::diagnostic::{Diagnostic, Place, nearest};

/// One change.
#[derive(Clone, Debug)]
pub struct Change {
    path: Key,
    value: Marked,
}

impl Change {
    /// From text, as on a command line: `Change::new("duty.1.speed", "90 %")`.
    pub fn new(path: &str, value: &str) -> Self {
        let place = Place::default();
        Self {
            path: Key {
                name: path.to_owned(),
                place,
            },
            value: Marked {
                place,
                value: Form::Scalar(Scalar::resolved(value)),
            },
        }
    }

    pub(super) fn marked(path: Key, value: Marked) -> Self {
        Self { path, value }
    }

    /// The path as written.
    pub fn path(&self) -> &str {
        &self.path.name
    }

    /// The value as written.
    pub fn value(&self) -> String {
        scalar_text(&self.value).unwrap_or("(a map)").to_owned()
    }
}

/// Changes to single members of a bank: by line and number.
#[derive(Default)]
pub(super) struct MemberChanges {
    by_member: BTreeMap<(String, u32), Vec<PartChange>>,
}

/// A key of some parts of a line.
#[derive(Clone)]
struct PartChange {
    /// The parts of this kind, and for a pump with a name only that one.
    kind: &'static str,
    pump: Option<String>,
    key: Key,
    value: Marked,
}

impl MemberChanges {
    pub fn members_of(&self, line: &str) -> Vec<u32> {
        self.by_member
            .keys()
            .filter(|(name, _)| name == line)
            .map(|(_, member)| *member)
            .collect()
    }

    pub fn applied(&self, line: &str, member: u32, node: &Marked) -> Marked {
        let mut node = node.clone();
        for change in self
            .by_member
            .get(&(line.to_owned(), member))
            .into_iter()
            .flatten()
        {
            change.apply(&mut node);
        }
        node
    }
}

impl PartChange {
    fn apply(&self, line: &mut Marked) {
        for (kind, part) in parts_mut(line) {
            let named =
                |pump: &String| get(part, "name").and_then(scalar_text) == Some(pump.as_str());
            if kind == self.kind && self.pump.as_ref().is_none_or(named) {
                let is_k_beside_friction = self.kind == "pipe" && self.key.name == "k";
                set(part, &self.key, &self.value, !is_k_beside_friction);
            }
        }
    }
}

/// Makes the changes in the tree; those to members of banks are handed back.
pub(super) fn apply(cx: &mut Context, root: &mut Marked, changes: &[Change]) -> MemberChanges {
    let mut members = MemberChanges::default();
    for change in changes {
        if let Err(diagnostic) = one(root, change, &mut members) {
            cx.push(*diagnostic);
        }
    }
    members
}

type Outcome = Result<(), Box<Diagnostic>>;

fn fail(change: &Change, message: String, help: impl Into<String>) -> Outcome {
    Err(Box::new(
        Diagnostic::error("change", change.path.place, message).help(help),
    ))
}

fn one(root: &mut Marked, change: &Change, members: &mut MemberChanges) -> Outcome {
    let path = change.path.name.clone();
    let mut words: Vec<&str> = path.split('.').collect();
    let key = match words.pop() {
        Some(key) if !words.is_empty() => Key {
            name: key.to_owned(),
            place: change.path.place,
        },
        _ => {
            let message = format!("`{path}` is no path to a value");
            return fail(
                change,
                message,
                "write `NAME.key`, for example `duty.1.speed` or `rising_main.roughness`",
            );
        }
    };
    match words[0] {
        name @ ("fluid" | "site") if words.len() == 1 => {
            let Some(section) = entry(root, name, change.path.place) else {
                return Ok(());
            };
            // The water's temperature gives all; a property of another liquid makes it no water.
            let other = ["density", "viscosity", "vapour_pressure"].contains(&key.name.as_str());
            let was_water = get(section, "water").is_some();
            if name == "fluid" && (key.name == "water" || other && was_water) {
                section.value = Form::Map(Vec::new());
            }
            set(section, &key, &change.value, true);
            Ok(())
        }
        EVERY => every(root, &words[1..], &key, change),
        name => named(root, name, &words[1..], key, change, members),
    }
}

/// `all.KEY` and `all.PART.KEY`.
fn every(root: &mut Marked, words: &[&str], key: &Key, change: &Change) -> Outcome {
    let mut present: Vec<&'static str> = section_mut(root, "lines")
        .into_iter()
        .flat_map(|(_, line)| parts_mut(line))
        .map(|(kind, _)| kind)
        .collect();
    present.sort_unstable();
    present.dedup();
    let kind = match words {
        [] => kind_with_key(&present, key, change, EVERY)?,
        [kind] => match PARTS.iter().find(|part| *part == kind) {
            Some(kind) => kind,
            None => {
                return fail(
                    change,
                    format!("no part is called `{kind}`"),
                    format!("parts are `{}`", PARTS.join("`, `")),
                );
            }
        },
        _ => {
            return fail(
                change,
                format!("`{}` is no path to a value", change.path.name),
                "write `all.key` or `all.PART.key`",
            );
        }
    };
    let mut count = 0;
    for (_, line) in section_mut(root, "lines") {
        for (found, part) in parts_mut(line) {
            // One way of giving friction does not turn into another for every pipe at once.
            let by_c = ["c_factor", "friction_factor"]
                .iter()
                .find(|way| get(part, way).is_some());
            let other_way = match key.name.as_str() {
                "roughness" | "material" => by_c.is_some(),
                way @ ("c_factor" | "friction_factor") => by_c != Some(&way),
                _ => false,
            };
            if found == kind && !other_way {
                set(
                    part,
                    key,
                    &change.value,
                    !(kind == "pipe" && key.name == "k"),
                );
                count += 1;
            }
        }
    }
    if count == 0 {
        return fail(
            change,
            format!("`{}` changes nothing", change.path.name),
            match present.contains(&kind) {
                true => "no pipe gives its friction in this way",
                false => "there is no such part",
            },
        );
    }
    Ok(())
}

/// The one kind of part that has this key; an error that lists the ways where it is not one.
fn kind_with_key(
    kinds: &[&'static str],
    key: &Key,
    change: &Change,
    name: &str,
) -> Result<&'static str, Box<Diagnostic>> {
    let mut fitting: Vec<&'static str> = kinds
        .iter()
        .copied()
        .filter(|kind| part_keys(kind).contains(&key.name.as_str()))
        .collect();
    fitting.dedup();
    match fitting.as_slice() {
        [kind] => Ok(kind),
        [] => {
            let known: Vec<&str> = kinds
                .iter()
                .flat_map(|kind| part_keys(kind))
                .copied()
                .collect();
            let near = nearest(&key.name, known.iter().copied());
            let help = near.map_or(format!("keys there: `{}`", known.join("`, `")), |near| {
                format!("did you mean `{near}`?")
            });
            fail(
                change,
                format!("`{name}` has nothing called `{}`", key.name),
                help,
            )
            .map(|()| "")
        }
        several => {
            let ways: Vec<String> = several
                .iter()
                .map(|kind| format!("`{name}.{kind}.{}`", key.name))
                .collect();
            let message = format!("`{}` of `{name}` could be that of several parts", key.name);
            fail(change, message, format!("say which: {}", ways.join(" or "))).map(|()| "")
        }
    }
}

/// A node, line, bank member, pump or pump model by its name.
fn named(
    root: &mut Marked,
    name: &str,
    words: &[&str],
    key: Key,
    change: &Change,
    members: &mut MemberChanges,
) -> Outcome {
    if let (Some(node), []) = (find(root, "nodes", name), words) {
        return node_change(node, key, change);
    }
    if let Some(line) = find(root, "lines", name) {
        return line_change(line, name, None, words, key, change, members);
    }
    let named_pump = section_mut(root, "lines")
        .into_iter()
        .find_map(|(line_name, line)| {
            let has = parts_mut(line).into_iter().any(|(kind, part)| {
                kind == "pump" && get(part, "name").and_then(scalar_text) == Some(name)
            });
            has.then(|| (line_name.to_owned(), line))
        });
    if let Some((line_name, line)) = named_pump {
        return line_change(line, &line_name, Some(name), words, key, change, members);
    }
    if let (Some(model), []) = (find(root, "pump_models", name), words) {
        set(model, &key, &change.value, true);
        return Ok(());
    }
    let mut names: Vec<String> = Vec::new();
    for section in ["nodes", "lines", "pump_models"] {
        names.extend(
            section_mut(root, section)
                .into_iter()
                .map(|(name, _)| name.to_owned()),
        );
    }
    for (_, line) in section_mut(root, "lines") {
        let pumps = parts_mut(line)
            .into_iter()
            .filter(|(kind, _)| *kind == "pump");
        names.extend(
            pumps.filter_map(|(_, pump)| Some(scalar_text(get(pump, "name")?)?.to_owned())),
        );
    }
    let near = nearest(name, names.iter().map(String::as_str));
    let help = near.map_or(
        "names are those of nodes, lines, pumps and pump models".to_owned(),
        |near| format!("did you mean `{near}`?"),
    );
    fail(
        change,
        format!(
            "`{}` leads nowhere: nothing is called `{name}`",
            change.path.name
        ),
        help,
    )
}

fn node_change(node: &mut Marked, mut key: Key, change: &Change) -> Outcome {
    let Form::Map(kinds) = &mut node.value else {
        return Ok(());
    };
    let [(kind, inner)] = kinds.as_mut_slice() else {
        return Ok(());
    };
    let short = if kind.name == "reservoir" {
        "surface"
    } else {
        "elevation"
    };
    if scalar_text(inner).is_some() {
        let written = Key {
            name: short.to_owned(),
            place: inner.place,
        };
        let map = Form::Map(vec![(written, inner.clone())]);
        *inner = Marked {
            place: inner.place,
            value: map,
        };
    }
    if kind.name == "reservoir" && key.name == "level" {
        key.name = "surface".to_owned();
    }
    set(inner, &key, &change.value, true);
    Ok(())
}

fn line_change(
    line: &mut Marked,
    line_name: &str,
    pump: Option<&str>,
    words: &[&str],
    key: Key,
    change: &Change,
    members: &mut MemberChanges,
) -> Outcome {
    let count = get(line, "count")
        .and_then(scalar_text)
        .and_then(|count| count.parse::<u32>().ok());
    let (member, words) = match words {
        [number, rest @ ..] if number.parse::<u32>().is_ok() => (number.parse::<u32>().ok(), rest),
        _ => (None, words),
    };
    if let Some(member) = member {
        let highest = count.unwrap_or(0);
        if member == 0 || member > highest {
            let message = format!("`{line_name}` has no member {member}");
            let help = match highest {
                0 => format!("it is a single line: write `{line_name}.{}`", key.name),
                highest => format!("its members are `{line_name}.1` to `{line_name}.{highest}`"),
            };
            return fail(change, message, help);
        }
    }
    let kinds: Vec<&'static str> = {
        let mut kinds: Vec<&'static str> =
            parts_mut(line).into_iter().map(|(kind, _)| kind).collect();
        kinds.sort_unstable();
        kinds.dedup();
        kinds
    };
    if pump.is_none()
        && member.is_none()
        && words.is_empty()
        && ["count", "from_port", "to_port"].contains(&key.name.as_str())
    {
        set(line, &key, &change.value, true);
        return Ok(());
    }
    let shown = pump.unwrap_or(line_name);
    let kind = match (pump, words) {
        (Some(_), []) => kind_with_key(&["pump"], &key, change, shown)?,
        (None, []) => kind_with_key(&kinds, &key, change, shown)?,
        (None, [word]) => match kinds.iter().find(|kind| *kind == word) {
            Some(kind) => kind_with_key(&[*kind], &key, change, shown)?,
            None => {
                return fail(
                    change,
                    format!("`{line_name}` has no part `{word}`"),
                    format!("its parts are `{}`", kinds.join("`, `")),
                );
            }
        },
        _ => {
            return fail(
                change,
                format!("`{}` is no path to a value", change.path.name),
                "write `NAME.key` or `NAME.PART.key`",
            );
        }
    };
    let part_change = PartChange {
        kind,
        pump: pump.map(str::to_owned),
        key,
        value: change.value.clone(),
    };
    match member {
        Some(member) => members
            .by_member
            .entry((line_name.to_owned(), member))
            .or_default()
            .push(part_change),
        None => part_change.apply(line),
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::network::Network;
    use crate::read::{Document, System};

    const TEXT: &str = "
fluid: {water: 20 C}
nodes:
  pond: {reservoir: 3 m}
  well: {tank: {floor: 0 m, depth: 4 m, area: 9 m2, level: 2 m}}
  header: {point: 1 m}
  outfall: {outlet: 12 m}
lines:
  duty:
    from: pond
    to: header
    count: 2
    parts:
      - pipe: {length: 3 m, bore: 200 mm, roughness: 0.1 mm, k: 1}
      - pump: {model: P200, elevation: 0.5 m}
      - valve: {k: 2}
      - check_valve: {k: 1}
  lift:
    from: well
    to: header
    parts:
      - pump: {model: P200, elevation: 0.5 m, name: lead}
      - pump: {model: P200, elevation: 0.5 m, name: booster}
  main: {from: header, to: outfall, pipe: {length: 100 m, bore: 250 mm, roughness: 0.1 mm}}
  old: {from: header, to: outfall, pipe: {length: 100 m, bore: 250 mm, c_factor: 110}}
pump_models:
  P200: {speed: 1480 rpm, impeller: 320 mm, curve: {flow: [0, 120, 240], head: [42, 38, 22]}}
";

    fn changed(changes: &[(&str, &str)]) -> Result<System, String> {
        let document = Document::parse(TEXT.as_bytes()).unwrap();
        let changes: Vec<Change> = changes.iter().map(|(p, v)| Change::new(p, v)).collect();
        let none = |_: &str| Err(std::io::Error::other("no files here"));
        document
            .system(&changes, &none)
            .map_err(|problems| problems.render(TEXT, "station.yaml", false))
    }

    fn with(path: &str, value: &str) -> System {
        changed(&[(path, value)]).unwrap_or_else(|problems| panic!("{path}: {problems}"))
    }

    fn refused(path: &str, value: &str) -> String {
        changed(&[(path, value)]).map_or_else(|problems| problems, |_| panic!("{path} was read"))
    }

    fn speeds(system: &System) -> Vec<f64> {
        let pumps = ["duty.1", "duty.2", "lead", "booster"];
        let speed = |name| pump(&system.network, name).speed;
        pumps.map(speed).to_vec()
    }

    fn pump(network: &Network, name: &str) -> crate::network::PumpSetting {
        *network.settings().pump(network.find_pump(name).unwrap())
    }

    fn level(system: &System, name: &str) -> f64 {
        let network = &system.network;
        network.settings().level(network.find_node(name).unwrap())
    }

    #[test]
    fn a_node_is_changed_by_its_name() {
        assert_eq!(level(&with("well.level", "1.5 m"), "well"), 1.5);
        assert_eq!(level(&with("well.level", "0.5"), "well"), 0.5);
        // a reservoir's level is its surface
        assert_eq!(level(&with("pond.level", "2 m"), "pond"), 2.0);
        assert_eq!(level(&with("pond.surface", "2 m"), "pond"), 2.0);
        let drawn = with("header.draw", "36 m3/h").network;
        let header = drawn.find_node("header").unwrap();
        assert!((drawn.settings().draw(header) - 0.01).abs() < 1e-15);
    }

    #[test]
    fn a_bank_a_member_and_a_named_pump_are_told_apart() {
        assert_eq!(speeds(&with("duty.speed", "90 %")), [0.9, 0.9, 1.0, 1.0]);
        assert_eq!(speeds(&with("duty.2.speed", "90 %")), [1.0, 0.9, 1.0, 1.0]);
        assert_eq!(
            speeds(&with("duty.pump.speed", "740")),
            [0.5, 0.5, 1.0, 1.0]
        );
        assert_eq!(
            speeds(&with("duty.2.pump.speed", "740 rpm")),
            [1.0, 0.5, 1.0, 1.0]
        );
        assert_eq!(speeds(&with("booster.speed", "80 %")), [1.0, 1.0, 1.0, 0.8]);
        assert_eq!(speeds(&with("lift.speed", "80 %")), [1.0, 1.0, 0.8, 0.8]);
        assert_eq!(speeds(&with("all.speed", "80 %")), [0.8; 4]);
        assert_eq!(speeds(&with("all.pump.speed", "80 %")), [0.8; 4]);
        let both = changed(&[("duty.speed", "90 %"), ("duty.1.speed", "75 %")]).unwrap();
        assert_eq!(speeds(&both), [0.75, 0.9, 1.0, 1.0]);
    }

    #[test]
    fn values_are_read_as_in_the_file() {
        assert!(!pump(&with("lead.running", "false").network, "lead").running);
        assert_eq!(pump(&with("duty.wear", "5 %").network, "duty.1").wear, 0.05);
        assert_eq!(pump(&with("duty.wear", "5").network, "duty.1").wear, 0.05);
        assert_eq!(
            pump(&with("duty.impeller", "240").network, "duty.2").trim,
            0.75
        );
        assert_eq!(with("duty.count", "3").network.banks()[0].lines.len(), 3);
        assert_eq!(with("P200.speed", "740 rpm").network.lines().len(), 5);
        let change = Change::new("duty.1.speed", "90 %");
        assert_eq!(
            (change.path(), change.value().as_str()),
            ("duty.1.speed", "90 %")
        );
    }

    #[test]
    fn the_liquid_and_the_place_are_changed_by_their_sections() {
        let warm = with("fluid.water", "60 C").network;
        assert!(warm.fluid().density < 984.0);
        let other = changed(&[
            ("fluid.density", "870 kg/m3"),
            ("fluid.viscosity", "12 cSt"),
        ]);
        assert_eq!(other.unwrap().network.fluid().density, 870.0);
        assert_eq!(
            with("site.barometer", "0.9 bar").network.barometer(),
            90_000.0
        );
        assert!(with("site.elevation", "1000 m").network.barometer() < 90_000.0);
    }

    #[test]
    fn one_way_of_giving_friction_takes_the_place_of_another_where_a_line_is_named() {
        assert!(changed(&[("main.c_factor", "120")]).is_ok());
        assert!(changed(&[("old.roughness", "1 mm")]).is_ok());
        assert!(changed(&[("main.material", "ductile_iron"), ("main.k", "3")]).is_ok());
        // for all at once, only where the way is the same: a roughness that is too rough spoils none that has a C factor
        let problems = refused("all.roughness", "40 mm");
        assert!(
            problems.contains("of line `main`") && !problems.contains("of line `old`"),
            "{problems}"
        );
    }

    #[test]
    fn what_leads_nowhere_is_refused_with_a_way_out() {
        for (path, value, expected) in [
            ("duti.speed", "1", "nothing is called `duti`"),
            ("duti.speed", "1", "did you mean `duty`?"),
            ("boster.speed", "1", "did you mean `booster`?"),
            ("duty.sped", "1", "did you mean `speed`?"),
            ("P200.sped", "1", "pump model `P200` has no key `sped`"),
            ("well.levl", "1", "node `well` has no key `levl`"),
            ("fluid.waters", "1", "`fluid` has no key `waters`"),
            (
                "duty.k",
                "1",
                "`duty.check_valve.k` or `duty.pipe.k` or `duty.valve.k`",
            ),
            ("duty.3.speed", "1", "`duty.1` to `duty.2`"),
            ("duty.0.speed", "1", "`duty` has no member 0"),
            ("lift.1.speed", "1", "write `lift.speed`"),
            ("duty.loss.k", "1", "`duty` has no part `loss`"),
            ("all.motor.speed", "1", "no part is called `motor`"),
            ("all.equipment.at", "1", "changes nothing"),
            ("duty", "1", "is no path to a value"),
            ("", "1", "is no path to a value"),
            (".", "1", "nothing is called ``"),
            ("duty.", "1", "has nothing called ``"),
            ("a.b.c.d.e", "1", "nothing is called `a`"),
            ("duty.pump.speed.x", "1", "is no path to a value"),
            ("duty.2.speed", "-5 %", "must be above zero, found `-5 %`"),
            ("well.level", "5 m", "above its depth"),
            ("main.length", "3 kW", "must be a length, found `3 kW`"),
            ("main.length", "", "found an empty text"),
            ("main.length", "{", "must be a length, found `{`"),
        ] {
            let problems = refused(path, value);
            assert!(problems.contains(expected), "{path}: {problems}");
            // a change from the command line stands at no place of the file
            assert!(!problems.contains("station.yaml:"), "{path}: {problems}");
        }
    }
}
