//! Times the main job's steps: one table, everything in the same run. `--quick` runs each step a few times only, to
//! show that it works.

#![allow(clippy::print_stdout)] // its whole purpose

use std::hint::black_box;
use std::path::Path;
use std::time::{Duration, Instant};

use binrail::catalogue::load;
use binrail::optimise::{Disagreement, Outcome, Proof, Question, front, optimise};
use binrail::physics::raw_section::{RawSection, steady_state};
use binrail::screen::Objective;
use binrail::supply::read;

/// Median over runs; enough runs to fill about a second, at least three.
fn median(quick: bool, mut run: impl FnMut()) -> Duration {
    let mut times = Vec::new();
    let begun = Instant::now();
    while times.len() < 3 || (!quick && begun.elapsed() < Duration::from_secs(1) && times.len() < 1000) {
        let begun = Instant::now();
        run();
        times.push(begun.elapsed());
    }
    times.sort_unstable();
    times[times.len() / 2]
}

fn row(what: &str, time: Duration, each: f64, unit: &str) {
    println!("{what:<44} {:>12.3} ms   {each:>10.3} {unit}", time.as_secs_f64() * 1e3);
}

/// A time counts only for an answer that is proved.
fn proved(answer: &Result<Outcome, Disagreement>) {
    assert!(matches!(answer, Ok(outcome) if outcome.proof == Proof::Proved));
}

fn main() -> Result<(), String> {
    let quick = std::env::args().any(|a| a == "--quick");
    let base = RawSection {
        source_rms_v: 9.0,
        mains_hz: 50.0,
        full_wave: true,
        series_ohm: 0.8,
        drop_v: 1.6,
        bank_f: 4.7e-3,
        bank_esr_ohm: 0.03,
        load_a: 1.1,
        load_s: 0.0,
    };
    let sections: Vec<RawSection> = (0..1000)
        .map(|i| RawSection {
            load_a: 0.2 + 0.001 * f64::from(i),
            bank_f: 1e-3 + 5e-6 * f64::from(i),
            ..base
        })
        .collect();
    let time = median(quick, || {
        for section in &sections {
            black_box(steady_state(black_box(section)).map(|w| (w.valley_v(), w.mean_v(), w.source_rms_a())));
        }
    });
    row(
        "1000 raw sections: valley, mean, rms",
        time,
        time.as_secs_f64() * 1e3,
        "us each",
    );
    let catalog = Path::new("catalog");
    let time = median(quick, || {
        black_box(load(catalog));
    });
    row("reading the demo catalogue", time, time.as_secs_f64() * 1e3, "ms");
    let loaded = load(catalog);
    for name in ["tide-gauge", "ramp-beacon", "fog-signal", "berth-console"] {
        let path = format!("examples/{name}/supply.toml");
        let supply = read(Path::new(&path)).map_err(|faults| format!("{path}: {faults:?}"))?;
        let per_rail =
            |time: Duration| time.as_secs_f64() * 1e3 / f64::from(u32::try_from(supply.rails.len()).unwrap_or(1));
        for (objective, top) in [(Objective::Cost, 1), (Objective::Heat, 1), (Objective::Cost, 20)] {
            let question = Question {
                top,
                ..Question::new(&supply, &loaded.catalogue, objective)
            };
            let time = median(quick, || proved(&optimise(&question)));
            let what = format!("{name}: {top} best by {}", objective.word());
            row(&what, time, per_rail(time), "ms per rail");
        }
        let question = Question::new(&supply, &loaded.catalogue, Objective::Cost);
        let time = median(quick, || proved(&front(&question)));
        row(&format!("{name}: the whole front"), time, per_rail(time), "ms per rail");
    }
    Ok(())
}
