//! Where the search runs out of nodes the integer program is asked; the answer must not depend on it.
#![allow(clippy::unwrap_used)]

use std::path::Path;

use binrail::catalogue::load;
use binrail::optimise::{NODE_BUDGET, Proof, Question, optimise};
use binrail::screen::Objective;
use binrail::supply::read;

#[test]
fn out_of_nodes_gives_the_same_answer() {
    let loaded = load(Path::new("catalog"));
    let mut calls = 0;
    for name in ["ramp-beacon", "berth-console"] {
        let supply = read(Path::new(&format!("examples/{name}/supply.toml"))).unwrap();
        let answer = |node_budget: u64| {
            let question = Question {
                node_budget,
                ..Question::new(&supply, &loaded.catalogue, Objective::Cost)
            };
            optimise(&question).unwrap()
        };
        let (searched, asked) = (answer(NODE_BUDGET), answer(1));
        assert_eq!(asked.proof, Proof::Proved);
        assert_eq!(searched.builds[0].key, asked.builds[0].key, "{name}");
        assert_eq!(searched.builds[0].build, asked.builds[0].build, "{name}");
        assert_eq!(searched.counts.solver_calls, 0);
        calls += asked.counts.solver_calls;
    }
    assert!(calls > 0);
}
