//! A solve allocates nothing, cold or warm: counted by an allocator of this test's own.
//!
//! Its own program, and one test in it, so that nothing else allocates meanwhile.

use std::alloc::{GlobalAlloc, Layout, System};
use std::cell::Cell;

use dutybank::network::{Network, Settings};
use dutybank::solve::Solver;

struct Counting;

thread_local! {
    /// Calls of this thread: that of the test harness allocates as it likes.
    static CALLS: Cell<u64> = const { Cell::new(0) };
}

fn count() {
    // A thread that is ending has no counter any more, and nothing left to be counted.
    let _ = CALLS.try_with(|calls| calls.set(calls.get() + 1));
}

// SAFETY: every call is handed on to the system's allocator as it came; counting touches nothing of it.
unsafe impl GlobalAlloc for Counting {
    unsafe fn alloc(&self, layout: Layout) -> *mut u8 {
        count();
        unsafe { System.alloc(layout) }
    }

    unsafe fn alloc_zeroed(&self, layout: Layout) -> *mut u8 {
        count();
        unsafe { System.alloc_zeroed(layout) }
    }

    unsafe fn realloc(&self, place: *mut u8, layout: Layout, size: usize) -> *mut u8 {
        count();
        unsafe { System.realloc(place, layout, size) }
    }

    unsafe fn dealloc(&self, place: *mut u8, layout: Layout) {
        unsafe { System.dealloc(place, layout) }
    }
}

#[global_allocator]
static ALLOCATOR: Counting = Counting;

#[path = "suite/random.rs"]
#[allow(dead_code)]
mod random;

/// Settings as an operator, a tank or a process may change them, one after the other.
fn changes(network: &Network) -> Vec<Settings> {
    let mut all = vec![network.settings().clone()];
    let mut random = random::Random(7);
    for step in 0..24 {
        let mut settings = all[all.len() - 1].clone();
        for id in network.pump_ids().filter(|_| step % 4 == 0) {
            settings.pump_mut(id).running = random.chance(0.7);
        }
        for id in network.pump_ids().filter(|_| step % 4 == 1) {
            settings.pump_mut(id).speed = random.between(0.6, 1.1);
        }
        for id in network.node_ids().filter(|_| step % 4 == 2) {
            settings.set_level(id, network.settings().level(id) * random.between(0.8, 1.2));
        }
        for id in network.node_ids().filter(|_| step % 4 == 3) {
            settings.set_draw(id, network.settings().draw(id) * random.between(0.2, 1.5));
        }
        for id in network.valve_ids().filter(|_| step % 4 == 3) {
            settings.valve_mut(id).opening = random.between(0.1, 1.0);
        }
        all.push(settings);
    }
    all
}

#[test]
fn a_solve_allocates_nothing() {
    let (mut cold_solves, mut warm_solves) = (0, 0);
    for seed in 0..200 {
        let network = random::network(seed, 2 + (seed % 59) as usize, random::Range::Ordinary);
        let changes = changes(&network);
        let mut solver = Solver::new(&network);
        for settings in &changes {
            let before = CALLS.get();
            let answered = solver.solve(settings).is_ok();
            let calls = CALLS.get() - before;
            // Only the search for the reason why there is no answer may take memory.
            assert!(!answered || calls == 0, "cold, seed {seed}: {calls} calls");
            cold_solves += u32::from(answered);
        }
        for settings in &changes {
            let before = CALLS.get();
            let answered = solver.resolve(settings).is_ok();
            let calls = CALLS.get() - before;
            assert!(!answered || calls == 0, "warm, seed {seed}: {calls} calls");
            warm_solves += u32::from(answered);
        }
    }
    assert!(cold_solves > 1000 && warm_solves > 1000);
    steps_over_time_allocate_nothing();
    // and it does count
    let before = CALLS.get();
    let kept = std::hint::black_box(vec![1_u8; 100]);
    assert!(CALLS.get() > before && kept.len() == 100);
}

/// A tank that drains for a day, and one that drains for ten: what is allocated is for the run, not for its steps.
fn steps_over_time_allocate_nothing() {
    let text = "
nodes: {tank: {tank: {floor: 5 m, depth: 9 m, area: 4000 m2, level: 8 m, inflow: 3}}, out: {outlet: 0}}
lines: {drain: {from: tank, to: out, pipe: {length: 400 m, bore: 150 mm, roughness: 0.1 mm}}}
shift: {starts: \"00:00\", lasts: 24 h}
";
    let none = |_: &str| Err(std::io::Error::other("no other file"));
    let document = dutybank::read::Document::parse(text.as_bytes()).unwrap();
    let system = document.system(&[], &none).unwrap();
    let mut shift = document.over_time(&system, &[], &none).unwrap().shift;
    let plan = dutybank::shift::Plan::default();
    let mut allocated = |days: f64| {
        shift.lasts = days * 86_400.0;
        let before = CALLS.get();
        let outcome = dutybank::shift::run(&system.network, &shift, &plan, &mut ()).unwrap();
        (CALLS.get() - before, outcome.effort.steps)
    };
    let (day, few) = allocated(1.0);
    let (ten_days, many) = allocated(10.0);
    assert!(many > few, "{few} and {many} steps");
    assert_eq!(day, ten_days, "calls for {few} and {many} steps");
}
