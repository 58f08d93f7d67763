//! Owns how a build is put together, as text: transformer, section, rail, each with its parts.

use super::Report;
use super::page::{Page, wrapped};
use super::text::{engineering, printable};
use crate::build::Section;
use crate::catalogue::Sink;

/// Which part sits where: each transformer with its sections, each section with its rails.
pub(super) fn wiring(report: &Report, page: Page) -> String {
    let build = &report.build;
    let mut out = String::new();
    let mut line = |indent: usize, text: &str| {
        let (first, later) = (" ".repeat(indent), " ".repeat(indent + 4));
        out.push_str(&wrapped(&printable(text), &first, &later, page.width));
    };
    for (place, transformer) in build.transformers.iter().enumerate() {
        line(0, &format!("{} {}", transformer.id, transformer.part.part.name));
        for section in build.sections.iter().filter(|s| s.transformer == place) {
            let bank = format!("{} x {}", section.cans, section.reservoir.part.name);
            line(2, &format!("{}: {}, {bank}", section.id, source(report, section)));
            for &rail in &section.rails {
                let (rail, choice) = (&report.supply.rails[rail], &build.rails[rail]);
                let (volts, amps) = (engineering(rail.voltage_v, "V"), engineering(rail.current_a, "A"));
                let device = format!("{}{}", choice.pass.part.name, on(choice.sink));
                line(4, &format!("{} {volts} {amps}: {device}", rail.name));
            }
        }
    }
    out
}

/// Winding and rectifier of a section; those of a dual pair stand on its positive half.
fn source(report: &Report, section: &Section) -> String {
    let pair = section.pair.map(|other| &report.build.sections[other].id);
    if let Some(positive) = pair.filter(|_| section.is_negative_half()) {
        return format!("negative half of {positive}");
    }
    let places: Vec<String> = section.hookup.secondaries.iter().map(ToString::to_string).collect();
    let (hookup, path) = (section.hookup.kind.word(), section.path.word());
    // Centre-tap and dual name both.
    let path = if hookup == path {
        String::new()
    } else {
        format!("{path} ")
    };
    let rectifier = format!(
        "{} x {}{}",
        section.rectifier_pieces(),
        section.rectifier.part.name,
        on(section.rectifier_sink)
    );
    let both = pair.map_or(String::new(), |negative| format!(" for {} and {negative}", section.id));
    format!("secondary {} {hookup}, {path}{rectifier}{both}", places.join("+"))
}

fn on(sink: Option<&Sink>) -> String {
    sink.map_or(String::new(), |sink| format!(" on sink {}", sink.part.name))
}
