#[path = "/work/main/benches/station.rs"]
mod station;
fn main() {
    let network = station::station();
    let mut solver = dutybank::solve::Solver::new(&network);
    let settings = network.settings().clone();
    let s = solver.solve(&settings).unwrap();
    for id in network.line_ids() {
        println!("{} {:.5}", network.line(id).name, s.flow(id));
    }
}
