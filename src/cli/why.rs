//! Owns `why`.

use clap::Args;

use super::asked::{Asked, no_build};
use super::output::{Answer, page};
use super::{Common, Failure, Format, call_fault, input};
use crate::optimise::{Outcome, Proof};
use crate::report::json;
use crate::report::why::WhyReport;
use crate::study::why::why;

#[derive(Args, Debug)]
pub(super) struct Why {
    #[command(flatten)]
    asked: Asked,
    /// The part
    part: String,
}

impl Why {
    pub(super) fn run(&self, common: &Common) -> Result<Answer, Failure> {
        let read = self.asked.read()?;
        let (question, _ticker) = self.asked.question(&read, common)?;
        let mut faults = Vec::new();
        let id = input::part(&self.part, "PART", question.catalogue, &mut faults);
        let part = id.and_then(|id| question.catalogue.parts().find(|part| part.id == id));
        let Some(part) = part else {
            return Err(Failure::Input(faults));
        };
        if question.without.contains(&part.id) {
            let hint = "ask about a part that may be used";
            let fault = call_fault("--without", &part.name, "is the part that is asked about", hint);
            return Err(Failure::Input(vec![fault]));
        }
        let answer = why(&question, part.id).map_err(Failure::Bug)?;
        let counts = answer.counts;
        let answer = match WhyReport::new(&question, part, answer.verdict) {
            None => {
                let open = Outcome {
                    builds: Vec::new(),
                    proof: Proof::Open { bound: 0 },
                    counts,
                };
                no_build(&question, &open, common)?
            }
            Some(report) => {
                let text = match common.format {
                    Format::Table => report.table(page(common)),
                    Format::Json => json::text(&report.json()),
                    Format::Csv => report.csv(),
                };
                let code = match (report.proved(), report.fits()) {
                    (true, true) => 0,
                    (true, false) => 1,
                    (false, _) => 3,
                };
                Answer::new(text, code)
            }
        };
        Ok(read.finish(answer, &counts))
    }
}
