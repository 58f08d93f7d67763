//! scratch
use binrail::*;
fn main() {
    let a: Vec<String> = std::env::args().collect();
    let supply = supply::read(std::path::Path::new(&a[1])).unwrap();
    let folder = std::path::Path::new(&a[1])
        .parent()
        .unwrap()
        .join(supply.catalogue.clone().unwrap());
    let t = std::time::Instant::now();
    let loaded = catalogue::load(&folder);
    for f in &loaded.faults {
        println!("{f}");
    }
    println!("read {:?}", t.elapsed());
    let t = std::time::Instant::now();
    let q = optimise::Question {
        supply: &supply,
        catalogue: &loaded.catalogue,
        objective: if a[2] == "heat" {
            screen::Objective::Heat
        } else {
            screen::Objective::Cost
        },
        top: a[3].parse().unwrap(),
        without: Default::default(),
        with: vec![],
        stop: screen::Stop {
            deadline: Some(std::time::Instant::now() + std::time::Duration::from_secs(20)),
            ..Default::default()
        },
    };
    let out = optimise::optimise(&q).unwrap();
    println!("{:?} {:?} {:?}", t.elapsed(), out.proof, out.counts);
    for f in out.builds.iter().take(3) {
        println!("{} {} {}", f.key.cost, f.key.heat, f.key.text.replace('\0', " "));
    }
}
