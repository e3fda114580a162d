//! One operating point in lines that a calculator can follow.

use maud::{Markup, html};

use super::Report;
use crate::output::words::Words;
use crate::study::worked::{Step, What, Worked};

/// The way through the pump, part by part, in SI so that the equations hold as they stand.
pub(super) fn table(words: &Words, report: &Report, worked: &Worked) -> Markup {
    let network = words.network;
    let pump = &report.assessment.pumps[worked.pump.index()];
    let name = &network.pump(worked.pump).name;
    let mut head = worked.start.1;
    let rows: Vec<(String, String, f64, f64)> = worked
        .steps
        .iter()
        .map(|step| {
            head -= step.loss;
            let line = network.line(step.line).name.clone();
            (line, working(words, step), -step.loss, head)
        })
        .collect();
    let fluid = network.fluid();
    html! {
        p { "The way through " (name) " that carries most, in SI units: q in m3/s, lengths and heads in m, g = "
            (format!("{:.5}", network.gravity())) " m/s2, density " (format!("{:.2}", fluid.density))
            " kg/m3, kinematic viscosity " (format!("{:.4e}", fluid.kinematic_viscosity)) " m2/s. "
            "Pipes: h = f (L/D) v2/(2 g), with 1/sqrt f = -2 log10( e/(3.7 D) + 2.51/(Re sqrt f) )." }
        div class="scroll" tabindex="0" role="region" aria-label="One operating point" {
            table {
                caption { "From " (network.node(worked.start.0).name) " to " (network.node(worked.end.0).name) }
                thead { tr {
                    th scope="col" class="words" { "line" } th scope="col" class="words" { "part and working" }
                    th scope="col" class="figure" { "change of head, m" } th scope="col" class="figure" { "head, m" }
                } }
                tbody {
                    tr { td class="words" { (network.node(worked.start.0).name) } td class="words" { "head there" }
                         td class="figure" {} td class="figure" { (format!("{:.4}", worked.start.1)) } }
                    @for (line, working, change, head) in &rows {
                        tr { td class="words" { (line) } td class="words" { (working) }
                             td class="figure" { (format!("{change:+.4}")) } td class="figure" { (format!("{head:.4}")) } }
                    }
                    tr { td class="words" { (network.node(worked.end.0).name) } td class="words" { "head there; what is left over" }
                         td class="figure" { (format!("{:.1e}", worked.remainder())) } td class="figure" { (format!("{:.4}", worked.end.1)) } }
                }
            }
        }
        ul {
            @for line in of_pump(words, pump, worked) { li { (line) } }
        }
    }
}

fn working(words: &Words, step: &Step) -> String {
    let q = step.flow;
    match step.what {
        What::Pipe {
            length,
            bore,
            velocity,
            reynolds,
            relative_roughness,
            factor,
        } => format!(
            "pipe, q {q:.5}, L {length:.1}, D {bore:.4}: v = {velocity:.4}, Re = {reynolds:.4e}, e/D = {relative_roughness:.3e}, f = {factor:.5}"
        ),
        What::OtherPipe {
            length,
            bore,
            velocity,
        } => format!("pipe, q {q:.5}, L {length:.1}, D {bore:.4}: v = {velocity:.4}"),
        What::Loss(r) => format!("loss, h = r q2 with r = {r:.3}, q {q:.5}"),
        What::Valve(r) => format!("valve, h = r q2 with r = {r:.3}, q {q:.5}"),
        What::Regulator(r) => {
            format!("regulating part, h = r q2 with r = {r:.3} as it stands, q {q:.5}")
        }
        What::CheckValve(r) => format!("check valve, h = r q2 with r = {r:.3}, q {q:.5}"),
        What::Pump(pump) => format!(
            "pump {} at q {q:.5}, from its curve",
            words.network.pump(pump).name
        ),
    }
}

/// Power and NPSH of the pump.
fn of_pump(
    words: &Words,
    pump: &crate::solve::operation::PumpOperation,
    worked: &Worked,
) -> Vec<String> {
    let network = words.network;
    let weight = network.fluid().density * network.gravity();
    let mut lines = Vec::new();
    if let (Some(head), Some(efficiency), Some(power)) =
        (pump.head, pump.efficiency, pump.shaft_power)
    {
        lines.push(format!(
            "Shaft power = density g q H / efficiency = {:.2} x {:.5} x {:.5} x {head:.3} / {efficiency:.4} = {power:.0} W",
            network.fluid().density,
            network.gravity(),
            pump.flow
        ));
    }
    if let (Some(available), Some(suction), Some(vapour)) = (
        pump.npsh_available,
        pump.suction_pressure,
        network.fluid().vapour_pressure,
    ) {
        lines.push(format!(
            "NPSH available = (barometer - vapour pressure + suction pressure) / (density g) = ({:.0} - {vapour:.0} + {suction:.0}) / {weight:.1} \
             = {available:.3} m at elevation {:.2} m",
            network.barometer(),
            network.pump(worked.pump).elevation
        ));
    }
    lines
}
