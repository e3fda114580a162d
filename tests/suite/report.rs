//! The page of `report`: whole, without outside requests, every figure of the tables in it, names escaped.

use assert_cmd::Command;

fn page(arguments: &[&str], input: Option<&str>) -> String {
    let folder = tempfile::tempdir().unwrap();
    let out = folder.path().join("page.html");
    let mut command = Command::cargo_bin("dutybank").unwrap();
    command.current_dir(env!("CARGO_MANIFEST_DIR"));
    command.arg("report").args(arguments).arg("--out").arg(&out);
    if let Some(input) = input {
        command.write_stdin(input);
    }
    command.assert().success();
    std::fs::read_to_string(out).unwrap()
}

const NETWORKS: [&str; 6] = [
    "starter",
    "mill_pond_transfer",
    "meadow_lift_station",
    "plant_cooling_loop",
    "two_lift_high_reservoir",
    "orchard_sprinkler_loop",
];

/// Start and end tags in the order of the page, void elements aside.
fn is_balanced(html: &str) -> bool {
    const VOID: [&str; 3] = ["meta", "br", "!DOCTYPE"];
    let mut open: Vec<&str> = Vec::new();
    let style = html.find("<style>").unwrap()..html.find("</style>").unwrap();
    let without_style = [&html[..style.start], &html[style.end + 8..]];
    for part in without_style
        .iter()
        .flat_map(|half| half.split('<').skip(1))
    {
        let tag = part.split('>').next().unwrap();
        let name = tag
            .trim_start_matches('/')
            .split([' ', '\n'])
            .next()
            .unwrap();
        if VOID.contains(&name) || tag.ends_with('/') {
            continue;
        }
        if tag.starts_with('/') {
            if open.pop() != Some(name) {
                return false;
            }
        } else {
            open.push(name);
        }
    }
    open.is_empty()
}

#[test]
fn every_shipped_network_makes_a_page_that_asks_for_nothing() {
    for name in NETWORKS {
        let page = page(&[&format!("networks/{name}.yaml")], None);
        assert!(is_balanced(&page), "{name}");
        // the namespace of SVG is a name, not a request
        let rest = page.replace("http://www.w3.org/2000/svg", "");
        for asks in ["http", "src=", "@import", "url(", "<script src", "<link"] {
            assert!(!rest.contains(asks), "{name}: {asks}");
        }
        for section in [
            "Answer",
            "Cautions",
            "Basis",
            "Inputs",
            "Limits",
            "Balance certificate",
        ] {
            assert!(
                page.contains(&format!(">{section}</h2>")),
                "{name}: {section}"
            );
        }
        assert_eq!(
            page,
            self::page(&[&format!("networks/{name}.yaml")], None),
            "same bytes"
        );
    }
}

#[test]
fn figures_of_the_answer_stand_in_the_page() {
    let page = page(
        &[
            "networks/mill_pond_transfer.yaml",
            "--job",
            "Spare & standby",
        ],
        None,
    );
    // demo (a), solved apart from this program: 60.6 and 88.3 L/s, 46 % more
    for figure in [
        "60.60 L/s",
        "88.32 L/s",
        "+46 %, not +100 %",
        "transfer.1 at 121 % of BEP",
    ] {
        assert!(page.contains(figure), "{figure}");
    }
    assert!(page.contains("Spare &amp; standby"));
    assert!(page.contains("One operating point, step by step"));
    // the fingerprint is that of the file, by another program: see any SHA-256 of the same bytes
    assert!(page.contains("SHA-256"));
}

#[test]
fn names_cannot_break_the_page() {
    let file = "
title: <b>Tanks & \"pumps\"</b>
nodes: {pond: {reservoir: 0 m}, tower: {reservoir: 9 m}}
lines: {lift: {from: pond, to: tower, pump: {model: P, elevation: 0 m}}}
pump_models: {P: {curve: {flow: [0, 60, 120], head: [20, 18, 8], efficiency: [0, 70, 60]}}}
";
    let page = page(&["-"], Some(file));
    assert!(is_balanced(&page));
    assert!(!page.contains("<b>"));
    assert!(page.contains("&lt;b&gt;Tanks &amp; &quot;pumps&quot;&lt;/b&gt;"));
}

#[test]
fn the_worked_point_leaves_nothing_over() {
    use dutybank::solve::Solver;
    for name in NETWORKS {
        let path = format!("{}/networks/{name}.yaml", env!("CARGO_MANIFEST_DIR"));
        let system = dutybank::read::system(&std::fs::read_to_string(path).unwrap()).unwrap();
        let network = &system.network;
        let settings = network.settings();
        let solution = Solver::new(network).solve(settings).unwrap().clone();
        let worked = dutybank::study::worked::worked(network, settings, &solution);
        assert!(
            worked.is_some_and(|worked| worked.remainder().abs() < 1e-8),
            "{name}"
        );
    }
}
