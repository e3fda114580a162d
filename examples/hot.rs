#[path = "/work/main/benches/station.rs"]
mod station;
fn main() {
    let network = station::station();
    let mut solver = dutybank::solve::Solver::new(&network);
    let settings = network.settings().clone();
    let mut sum = 0.0;
    for _ in 0..1_000_000 {
        sum += solver.solve(&settings).unwrap().flows()[0];
    }
    println!("{sum}");
}
