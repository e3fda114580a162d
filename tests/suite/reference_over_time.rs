//! A day of the meadow station against SciPy's solve_ivp at rtol 1e-10 (`tests/reference/over_time.py`).

use dutybank::read::Document;
use dutybank::shift::{Record, What, run};
use serde_json::Value;

#[test]
fn a_day_equals_the_one_of_solve_ivp() {
    let root = env!("CARGO_MANIFEST_DIR");
    let text = std::fs::read(format!("{root}/networks/meadow_lift_station.yaml")).unwrap();
    let none = |_: &str| Err(std::io::Error::other("no other file"));
    let document = Document::parse(&text).unwrap();
    let system = document.system(&[], &none).unwrap();
    let read = document.over_time(&system, &[], &none).unwrap();
    let plan = read
        .plans
        .iter()
        .find(|plan| plan.name == "wide_common_stop")
        .unwrap();
    let mut record = Record::new();
    let outcome = run(&system.network, &read.shift, plan, &mut record).unwrap();

    let path = format!("{root}/tests/reference/expected_over_time/meadow_wide_common_stop.json");
    let expected: Value = serde_json::from_slice(&std::fs::read(path).unwrap()).unwrap();
    let switches = record
        .events()
        .iter()
        .filter(|event| matches!(event.what, What::Start | What::Stop));
    let times: Vec<f64> = switches.map(|event| event.time).collect();
    let wanted = expected["events"].as_array().unwrap();
    assert_eq!(times.len(), wanted.len());
    let mut worst: f64 = 0.0;
    for (time, wanted) in times.iter().zip(wanted) {
        worst = worst.max((time - wanted["time"].as_f64().unwrap()).abs());
    }
    // 116 switches, each from the one before: errors of both add up
    assert!(worst < 1e-4, "a switch is off by {worst:e} s");
    let end = expected["end_level"].as_f64().unwrap();
    assert!((outcome.score.tanks[0].end_level - end).abs() < 1e-6);
}
