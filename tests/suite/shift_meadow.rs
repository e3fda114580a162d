//! One day of the wet well under six rules: the figures of the table, each within its rounding.

use crate::meadow::{self, Meadow, NARROW, WIDE_COMMON, WIDE_STEPPED};
use dutybank::shift::{Outcome, Plan, Record, Rotate, run};

fn level() -> f64 {
    std::env::var("LEVEL").map_or(1.0, |x| x.parse().unwrap())
}
fn outcome(meadow: &Meadow, plan: &Plan, storm: bool, one_out: bool) -> Outcome {
    let mut shift = meadow::day(meadow, storm, level());
    if one_out {
        shift.faults.push(dutybank::shift::Fault {
            at: 0.0,
            lasts: None,
            kind: dutybank::shift::FaultKind::PumpOut(meadow.pumps[2]),
        });
    }
    run(&meadow.network, &shift, plan, &mut ()).unwrap()
}

#[test]
fn print_table() {
    let meadow = meadow::station();
    let rules: [(&str, &[(f64, f64)], Rotate, bool, bool); 6] = [
        (
            "wide common fixed",
            &WIDE_COMMON,
            Rotate::Never,
            false,
            false,
        ),
        (
            "wide stepped alt",
            &WIDE_STEPPED,
            Rotate::EachStart,
            false,
            false,
        ),
        ("narrow alt", &NARROW, Rotate::EachStart, false, false),
        ("narrow fixed", &NARROW, Rotate::Never, false, false),
        ("peak hold", &WIDE_STEPPED, Rotate::EachStart, true, false),
        ("one out", &WIDE_STEPPED, Rotate::EachStart, false, true),
    ];
    for (name, steps, rotate, peak, one_out) in rules {
        let mut plan = meadow::plan(&meadow, steps, rotate);
        if peak {
            meadow::hold_peak(&mut plan);
        }
        if one_out {}
        for storm in [false, true] {
            let out = outcome(&meadow, &plan, storm, one_out);
            let s = &out.score;
            let starts: Vec<u32> = s.pumps.iter().map(|p| p.starts).collect();
            println!(
                "{name} storm {storm}: starts {starts:?} worst {} kWh {:.1} {:.4} cost {:.2} max {:.3} alarm {:.1} min spilled {:.1} peak {:.1} err {:e} {:?} owed {:.2}",
                s.worst_hour_starts,
                s.energy.unwrap() / 3.6e6,
                s.specific_energy.unwrap() / 3.6e6,
                s.cost.unwrap(),
                s.tanks[0].highest,
                s.above_alarm / 60.0,
                s.spilled,
                s.peak_power.unwrap() / 1e3,
                s.volume_error,
                out.effort,
                s.owed,
            );
        }
    }
    let mut record = Record::new();
    let plan = meadow::plan(&meadow, &WIDE_STEPPED, Rotate::EachStart);
    let t = std::time::Instant::now();
    run(
        &meadow.network,
        &meadow::day(&meadow, true, 1.0),
        &plan,
        &mut record,
    )
    .unwrap();
    println!(
        "{:?} {} rows {} events",
        t.elapsed(),
        record.times().len(),
        record.events().len()
    );
    for e in record.events().iter().take(12) {
        println!(
            "{:.6} {}",
            e.time,
            e.words(&meadow.network, &|k, x| format!("{x:.2} {k:?}"))
        );
    }
}
