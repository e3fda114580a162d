//! The picture: geometry against the figures, names of every kind, and the command.

use super::svg::{Element, distance, is_tidy, parse};
use super::{NETWORKS, drawn, of_text, systems};
use assert_cmd::Command;
use dutybank::network::Network;
use dutybank::output::chart::{
    Axis, AxisKind, Bars, Curve, Figure, Mark, Pane, Plot, Strip, Surface, draw, ticks,
};
use dutybank::output::curves::{Telling, figure, points, rows};
use dutybank::read::System;
use dutybank::study::curves::Curves;

fn with<T>(systems: &[(String, System)], curves: &Curves, then: impl FnOnce(&Telling) -> T) -> T {
    let cases: Vec<(String, &Network)> = systems
        .iter()
        .map(|(name, system)| (name.clone(), &system.network))
        .collect();
    let title = systems[0].1.title.clone().unwrap_or_default();
    let telling = Telling {
        curves,
        cases: &cases,
        units: &systems[0].1.units,
        title: &title,
    };
    then(&telling)
}

fn picture(systems: &[(String, System)], surface: Surface) -> String {
    let curves = drawn(systems, None).unwrap();
    with(systems, &curves, |telling| {
        draw(&figure(telling, "curves"), surface)
    })
}

/// The paths of curves of a kind and tag; a curve past its end counts with it.
fn paths(elements: &[Element], kinds: &[&str], tag: &str) -> Vec<Vec<[f64; 2]>> {
    let of_curve = |element: &&Element| {
        element.name == "path"
            && element.inside.iter().any(|at| {
                let group = &elements[*at];
                kinds.contains(&group.get("data-kind")) && group.get("data-tag") == tag
            })
    };
    elements
        .iter()
        .filter(of_curve)
        .map(Element::path)
        .collect()
}

/// Where a mark is drawn: the centre of its circle.
fn centre(elements: &[Element], group: usize) -> [f64; 2] {
    let circle = elements
        .iter()
        .find(|element| element.name == "circle" && element.inside.contains(&group))
        .unwrap();
    [circle.number("cx"), circle.number("cy")]
}

#[test]
fn pictures_are_well_formed_inside_their_paper_and_without_overlap() {
    for name in NETWORKS {
        for surface in [Surface::StandAlone, Surface::Embedded] {
            let elements = parse(&picture(&systems(name), surface));
            assert!(is_tidy(&elements, name) > 40, "{name} has few labels");
            let svg = &elements[0];
            assert_eq!((svg.name.as_str(), svg.get("role")), ("svg", "img"));
            let named: Vec<&str> = svg.get("aria-labelledby").split(' ').collect();
            for id in named {
                let found = elements
                    .iter()
                    .find(|element| element.get("id") == id)
                    .unwrap();
                assert!(!found.text.is_empty(), "{name}: {id} says nothing");
            }
        }
    }
}

/// On paper each operating point stands on its system curve and on its combined curve, to a tenth of a line's width.
#[test]
fn points_stand_on_their_curves_on_paper() {
    for name in NETWORKS {
        let systems = systems(name);
        let elements = parse(&picture(&systems, Surface::StandAlone));
        let mut seen = 0;
        for (group, element) in elements.iter().enumerate() {
            if element.get("data-kind") != "operating point" {
                continue;
            }
            let tag = element.get("data-tag");
            let split = tag.find(|c: char| c.is_ascii_digit()).unwrap();
            let (letter, number) = tag.split_at(split);
            let at = centre(&elements, group);
            for (kinds, tag) in [
                (&["system"][..], letter),
                (&["combined", "past the end"][..], number),
            ] {
                let near = paths(&elements, kinds, tag)
                    .iter()
                    .map(|path| distance(at, path))
                    .fold(f64::INFINITY, f64::min);
                assert!(
                    near < 0.05,
                    "{name}: {tag} is {near} mm off its {}",
                    kinds[0]
                );
            }
            seen += 1;
        }
        assert_eq!(seen, drawn(&systems, None).unwrap().points.len(), "{name}");
    }
}

/// Every operating point of the shipped networks is labelled at its place, not in the table only.
#[test]
fn every_point_is_labelled() {
    for name in NETWORKS {
        let systems = systems(name);
        let elements = parse(&picture(&systems, Surface::StandAlone));
        let upper = elements
            .iter()
            .position(|element| element.get("class") == "pane")
            .unwrap();
        let tags: Vec<&str> = elements
            .iter()
            .filter(|element| element.get("data-kind") == "operating point")
            .map(|element| element.get("data-tag"))
            .collect();
        for tag in tags {
            let labelled = elements.iter().any(|element| {
                let words = element.text.split("  ").next();
                element.name == "text" && element.inside.contains(&upper) && words == Some(tag)
            });
            assert!(labelled, "{name}: {tag}");
        }
    }
}

/// All marks of the upper plot lie on one linear map from figures to paper.
#[test]
fn paper_is_linear_in_the_figures() {
    let elements = parse(&picture(
        &systems("mill_pond_transfer"),
        Surface::StandAlone,
    ));
    let points: Vec<([f64; 2], [f64; 2])> = elements
        .iter()
        .enumerate()
        .filter(|(_, element)| element.get("data-kind") == "operating point")
        .map(|(group, element)| {
            let figures = [element.number("data-flow"), element.number("data-head")];
            (figures, centre(&elements, group))
        })
        .collect();
    let (first, last) = (points[0], *points.last().unwrap());
    for axis in 0..2 {
        let scale = (last.1[axis] - first.1[axis]) / (last.0[axis] - first.0[axis]);
        for (figures, paper) in &points {
            let expected = first.1[axis] + scale * (figures[axis] - first.0[axis]);
            assert!(
                (paper[axis] - expected).abs() < 0.03,
                "{figures:?} at {paper:?}"
            );
        }
    }
}

#[test]
fn the_same_file_gives_the_same_bytes() {
    for name in ["mill_pond_transfer", "plant_cooling_loop"] {
        let first = picture(&systems(name), Surface::StandAlone);
        assert_eq!(
            first,
            picture(&systems(name), Surface::StandAlone),
            "{name}"
        );
    }
}

#[test]
fn names_of_every_kind_are_written_safely() {
    // as long as names may be
    let long = "a very long name of a case that goes on, says all about it, and ends late";
    let text = format!(
        r#"
title: "<Pumps> & \"sons\" of 'Ölmühle' 泵站 {long} {long} {long}"
nodes: {{Fülle: {{reservoir: 2 m}}, ヘッダ: {{point: 1 m}}, outfall: {{outlet: 14 m}}}}
lines:
  π: {{from: Fülle, to: ヘッダ, count: 2, parts: [{{pump: {{model: m, elevation: 1 m}}}}, {{check_valve: {{k: 2, bore: 150 mm}}}}]}}
  main: {{from: ヘッダ, to: outfall, pipe: {{length: 420 m, bore: 200 mm, roughness: 0.1 mm}}}}
pump_models:
  m: {{curve: {{flow: [0, 60, 120, 150], head: [28, 26, 20, 15.5], efficiency: [0, 65, 78, 70]}}}}
cases:
  "old <pipe> & \"new\" rust": {{main.roughness: 1 mm}}
  "{long}": {{Fülle.level: 1 m}}
  "{long} worn": {{π.2.wear: 10 %}}
"#
    );
    let systems = of_text(&text);
    let svg = picture(&systems, Surface::StandAlone);
    assert!(!svg.contains("<Pumps>") && !svg.contains("<pipe>"));
    let elements = parse(&svg);
    is_tidy(&elements, "names");
    let title = elements
        .iter()
        .find(|element| element.get("id") == "curves-title")
        .unwrap();
    assert!(
        title
            .text
            .starts_with("<Pumps> & \"sons\" of 'Ölmühle' 泵站")
    );
    let cases = elements
        .iter()
        .any(|element| element.get("data-case") == "old <pipe> & \"new\" rust");
    assert!(cases);
    // CSV keeps them whole
    let curves = drawn(&systems, None).unwrap();
    let bytes = with(&systems, &curves, |telling| {
        rows(telling).csv(telling.units).unwrap()
    });
    let mut reader = csv::Reader::from_reader(bytes.as_slice());
    let whole = reader
        .records()
        .any(|record| record.unwrap()[2].contains(long));
    assert!(whole);
}

/// Points in the CSV are those that were solved, in the file's units.
#[test]
fn rows_for_programs_are_the_points_that_were_solved() {
    let systems = systems("mill_pond_transfer");
    let curves = drawn(&systems, None).unwrap();
    let bytes = with(&systems, &curves, |telling| {
        rows(telling).csv(telling.units).unwrap()
    });
    let mut reader = csv::Reader::from_reader(bytes.as_slice());
    let headings: Vec<String> = reader
        .headers()
        .unwrap()
        .iter()
        .map(str::to_owned)
        .collect();
    assert_eq!(
        headings[..7],
        [
            "what",
            "tag",
            "case",
            "running",
            "pump",
            "flow [L/s]",
            "head [m]"
        ]
        .map(str::to_owned)
    );
    let records: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    let of = |what: &str, tag: &str| -> Vec<(f64, f64)> {
        let fits = |record: &&csv::StringRecord| &record[0] == what && &record[1] == tag;
        let figures =
            |record: &csv::StringRecord| (record[5].parse().unwrap(), record[6].parse().unwrap());
        records.iter().filter(fits).map(figures).collect()
    };
    let combined = of("combined curve", "2");
    assert_eq!(combined.len(), curves.combined[1].points.len());
    for ((flow, head), point) in combined.iter().zip(&curves.combined[1].points) {
        assert!((flow / 1000.0 - point.flow).abs() < 1e-12 && (head - point.head).abs() < 1e-12);
    }
    // demo system (a): 88.3 L/s
    let (flow, head) = of("operating point", "A2")[0];
    assert!((flow - 88.3).abs() < 0.1, "{flow}");
    assert!(
        of("system curve", "A").contains(&(
            flow,
            of("system curve", "A")
                .iter()
                .find(|p| p.0 == flow)
                .unwrap()
                .1
        ))
    );
    assert!((of("pump at point", "A2")[0].0 - 0.5 * flow).abs() < 1e-6 && head > 34.0);
    assert_eq!(of("shut-off", "1").len() + of("end of curve", "1").len(), 2);
    assert_eq!(of("preferred from", "1")[0].0, 35.0);
    let grid = with(&systems, &curves, points);
    assert_eq!(grid.rows.len(), curves.points.len());
}

fn dutybank(arguments: &[&str]) -> (Option<i32>, String, String) {
    let mut command = Command::cargo_bin("dutybank").unwrap();
    command.current_dir(env!("CARGO_MANIFEST_DIR"));
    let output = command.args(arguments).output().unwrap();
    let text = |bytes: Vec<u8>| String::from_utf8(bytes).unwrap();
    (
        output.status.code(),
        text(output.stdout),
        text(output.stderr),
    )
}

const POND: &str = "networks/mill_pond_transfer.yaml";

#[test]
fn the_command_writes_picture_and_rows_and_tells_the_points() {
    let folder = tempfile::tempdir().unwrap();
    let (svg, csv) = (folder.path().join("c.svg"), folder.path().join("c.csv"));
    let (svg_name, csv_name) = (svg.to_str().unwrap(), csv.to_str().unwrap());
    let (code, out, _) = dutybank(&["curves", POND, "--svg", svg_name, "--csv", csv_name]);
    assert_eq!(code, Some(0));
    assert!(
        out.contains("Operating points") && out.contains("88.32"),
        "{out}"
    );
    let text = std::fs::read_to_string(&svg).unwrap();
    is_tidy(&parse(&text), "command");
    assert!(
        std::fs::read_to_string(&csv)
            .unwrap()
            .starts_with("what,tag,case,running,pump,flow [L/s],")
    );
    // neither file asked for, and standard output is a pipe: the picture itself, the same bytes
    let (code, piped, _) = dutybank(&["curves", POND]);
    assert_eq!((code, piped == text), (Some(0), true));
    let (code, piped, _) = dutybank(&["curves", POND, "--csv", "-"]);
    assert!(code == Some(0) && piped.starts_with("what,"));
}

#[test]
fn cases_pumps_and_banks_are_chosen_by_name() {
    let (code, out, _) = dutybank(&[
        "curves",
        POND,
        "--svg",
        "-",
        "--cases",
        "as-is,one pump, low level,old pipe",
    ]);
    assert_eq!(code, Some(0));
    let elements = parse(&out);
    let cases: Vec<&str> = elements
        .iter()
        .filter(|element| element.get("data-kind") == "system")
        .map(|element| element.get("data-case"))
        .collect();
    assert_eq!(
        cases,
        ["as the file stands", "one pump, low level", "old pipe"]
    );
    let two_lift = "networks/two_lift_high_reservoir.yaml";
    let (code, out, _) = dutybank(&[
        "curves",
        two_lift,
        "--bank",
        "upper_lift",
        "--cases",
        "as-is",
        "--svg",
        "-",
    ]);
    assert!(
        code == Some(0) && out.contains("no one system curve: other pumps run (lower_lift)"),
        "{out}"
    );
    for (arguments, expected) in [
        (["--bank", "transfr"], "did you mean `transfer`?"),
        (["--cases", "old pipes"], "has no case `old pipes`"),
        (["--pumps", "transfer.3"], "no pump is called `transfer.3`"),
        (["--svg", "no/such/folder/x.svg"], "cannot be written"),
    ] {
        let (code, _, why) = dutybank(&["curves", POND, arguments[0], arguments[1]]);
        assert!(code == Some(2) && why.contains(expected), "{why}");
    }
}

/// Demo system (b): 20, 19 and 19 starts on the dry day, alternating; one bar each.
#[test]
fn a_run_is_drawn_with_a_bar_for_each_start() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("run.svg");
    let meadow = "networks/meadow_lift_station.yaml";
    let plan = "wide_stepped_alternating";
    let (code, _, why) = dutybank(&[
        "shift",
        meadow,
        "--plan",
        plan,
        "--svg",
        path.to_str().unwrap(),
    ]);
    assert_eq!(code, Some(0), "{why}");
    let elements = parse(&std::fs::read_to_string(&path).unwrap());
    is_tidy(&elements, "run");
    let bars = |name: &str| {
        let group = elements
            .iter()
            .position(|element| element.get("data-name") == name)
            .unwrap();
        let of_row = |element: &&Element| element.name == "rect" && element.inside.contains(&group);
        elements.iter().filter(of_row).count()
    };
    for (pump, starts) in [("lift.1", 20), ("lift.2", 19), ("lift.3", 19)] {
        let drawn = bars(pump);
        assert!(drawn.abs_diff(starts) <= 1, "{pump}: {drawn} bars");
    }
    let says = |text: &str| {
        elements
            .iter()
            .any(|element| element.name == "text" && element.text == text)
    };
    for label in [
        "alarm 2.50",
        "overflow 3.20",
        "start 1, stop 3 1.50",
        "stop 1 0.90",
    ] {
        assert!(says(label), "no `{label}`");
    }
}

/// A year of five-minute rows and twenty thousand runs: no more is drawn than can be seen.
#[test]
fn long_runs_make_small_drawings() {
    let year = 365.0 * 86_400.0;
    let points: Vec<[f64; 2]> = (0..105_120)
        .map(|i| [300.0 * f64::from(i), 1.5 + (f64::from(i) * 0.7).sin()])
        .collect();
    let bars: Vec<(f64, f64)> = (0..20_000)
        .map(|i| (year * f64::from(i) / 2e4, year * (f64::from(i) + 0.5) / 2e4))
        .collect();
    let figure = Figure {
        id: "year".to_owned(),
        x: Axis {
            label: "Time".to_owned(),
            range: (0.0, year),
            kind: AxisKind::Clock { starts: 0.0 },
        },
        panes: vec![
            Pane::Plot(Plot {
                height: 40.0,
                y: Axis {
                    range: (0.0, 3.0),
                    ..Axis::default()
                },
                curves: vec![Curve {
                    points,
                    ..Curve::default()
                }],
                ..Plot::default()
            }),
            Pane::Strip(Strip {
                rows: vec![Bars {
                    name: "p".to_owned(),
                    bars,
                    ..Bars::default()
                }],
            }),
        ],
        ..Figure::default()
    };
    let svg = draw(&figure, Surface::StandAlone);
    assert!(svg.len() < 300_000, "{} bytes", svg.len());
    let elements = parse(&svg);
    is_tidy(&elements, "year");
    // the extremes are still there: 0.5 and 2.5 of 3 on 40 mm
    let path = elements
        .iter()
        .find(|element| element.name == "path")
        .unwrap()
        .path();
    let heights = path.iter().map(|point| point[1]);
    let (least, most) = heights.fold((f64::INFINITY, 0.0f64), |(a, b), y| (a.min(y), b.max(y)));
    assert!(
        (most - least - 40.0 * 2.0 / 3.0).abs() < 0.05,
        "{least} to {most}"
    );
}

/// How many of the labels of 24 marks within a few millimetres find a place.
fn crowded(words: impl Fn(usize) -> String) -> usize {
    let mark = |i: usize| Mark {
        at: [5.0 + 0.08 * (i % 6) as f64, 5.0 + 0.2 * (i / 6) as f64],
        labels: vec![words(i)],
        ..Mark::default()
    };
    let plot = Plot {
        height: 50.0,
        y: Axis {
            range: (0.0, 10.0),
            ..Axis::default()
        },
        marks: (0..24).map(mark).collect(),
        ..Plot::default()
    };
    let figure = Figure {
        id: "crowd".to_owned(),
        x: Axis {
            range: (0.0, 10.0),
            ..Axis::default()
        },
        panes: vec![Pane::Plot(plot)],
        ..Figure::default()
    };
    let elements = parse(&draw(&figure, Surface::Embedded));
    is_tidy(&elements, "crowd");
    let written = |i: &usize| {
        let mut texts = elements.iter().filter(|element| element.name == "text");
        texts.any(|element| element.text == words(*i))
    };
    (0..24).filter(written).count()
}

#[test]
fn labels_crowded_on_one_spot_never_overlap() {
    let short = crowded(|i| format!("P{i}"));
    let long = crowded(|i| format!("point number {i} of many"));
    assert!(short >= 15 && long >= 5, "{short} and {long} found a place");
}

#[test]
fn nothing_to_draw_is_still_a_picture() {
    let empty = draw(
        &Figure {
            id: "none".to_owned(),
            ..Figure::default()
        },
        Surface::StandAlone,
    );
    parse(&empty);
    let broken = Plot {
        height: 20.0,
        y: Axis {
            range: (0.0, f64::NAN),
            ..Axis::default()
        },
        curves: vec![Curve {
            points: vec![[0.0, f64::NAN], [1.0, 1.0], [2.0, f64::INFINITY]],
            ..Curve::default()
        }],
        ..Plot::default()
    };
    let figure = Figure {
        id: "nan".to_owned(),
        panes: vec![Pane::Plot(broken)],
        ..Figure::default()
    };
    let svg = draw(&figure, Surface::StandAlone);
    parse(&svg);
    assert!(!svg.contains("NaN") && !svg.contains("inf"));
    assert!(ticks((0.0, 0.0), AxisKind::Number, 5).is_empty());
}
