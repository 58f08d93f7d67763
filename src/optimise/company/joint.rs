//! Owns what cannot hold together: the limits of the whole supply that stand between rails which each pass alone.

use std::collections::BTreeMap;

use crate::audit::{Check, Limit, Margin, audit, whole};
use crate::catalogue::{Catalogue, Part, PartId};
use crate::optimise::{Disagreement, Proof, Question, optimise};
use crate::screen::Objective;
use crate::supply::Supply;

/// A limit that cannot hold together with the rest.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
pub struct Joint {
    /// Cost, heat or stock.
    pub limit: Limit,
    /// The part that is short, for stock.
    pub part: Option<String>,
}

impl Joint {
    /// The limit's word, stock with its part.
    #[must_use]
    pub fn words(&self) -> String {
        match &self.part {
            Some(part) => format!("{} {part}", self.limit.word()),
            None => self.limit.word().to_owned(),
        }
    }
}

/// What cannot hold together.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Together {
    /// Each limit of cost, heat and stock without which the supply has a build; if there is none, each that is among the
    /// fewest that must go together.
    pub joint: Vec<Joint>,
    /// What fails in the best build without the first of them.
    pub failing: Vec<Margin>,
    /// Whether all of that is proved.
    pub proved: bool,
}

/// What stands between rails that each pass alone, for a question to which [`optimise`] has proved that there is no
/// build.
///
/// # Errors
/// When the audit rejects a build that the search found with a limit dropped: a bug to report.
pub fn joint(question: &Question) -> Result<Together, Disagreement> {
    let caps = &question.supply.caps;
    let mut limits = Vec::new();
    limits.extend(caps.cost.map(|_| Limit::Cost));
    limits.extend(caps.heat_w.map(|_| Limit::Heat));
    limits.extend(
        question
            .catalogue
            .parts()
            .any(|p| p.stock.is_some())
            .then_some(Limit::Stock),
    );
    let mut proved = true;
    let mut found: Vec<Joint> = Vec::new();
    let mut first: Option<Vec<Margin>> = None;
    for size in 1..=limits.len() {
        for set in subsets(&limits, size) {
            let ask = |lifted: &dyn Fn(&Part) -> bool| Changed::new(question, &set, lifted).overdrawn(question);
            let short = match ask(&|_| true)? {
                Answer::Short(short, failing) => {
                    first.get_or_insert(failing);
                    short
                }
                Answer::None => continue,
                Answer::Open => {
                    proved = false;
                    continue;
                }
            };
            found
                .extend((set.iter().filter(|&&limit| limit != Limit::Stock)).map(|&limit| Joint { limit, part: None }));
            // Of the parts that are short in one build one alone may be enough.
            let mut enough = Vec::new();
            for &part in short.iter().filter(|_| short.len() > 1) {
                match ask(&|p| p.id == part)? {
                    Answer::Short(..) => enough.push(part),
                    Answer::None => {}
                    Answer::Open => proved = false,
                }
            }
            let named = if enough.is_empty() { short } else { enough };
            let names = question.catalogue.parts().filter(|p| named.contains(&p.id));
            found.extend(names.map(|p| Joint {
                limit: Limit::Stock,
                part: Some(p.name.clone()),
            }));
        }
        if !found.is_empty() || !proved {
            break;
        }
    }
    found.sort();
    found.dedup();
    Ok(Together {
        joint: found,
        failing: first.unwrap_or_default(),
        proved,
    })
}

/// All subsets of that size, in order.
fn subsets(limits: &[Limit], size: usize) -> Vec<Vec<Limit>> {
    let pick = |set: usize| (0..limits.len()).filter(move |i| set & (1 << i) != 0);
    (0..1_usize << limits.len())
        .filter(|set| set.count_ones() as usize == size)
        .map(|set| pick(set).map(|i| limits[i]).collect())
        .collect()
}

enum Answer {
    /// There is a build; it takes more of these parts than there are, and fails these limits.
    Short(Vec<PartId>, Vec<Margin>),
    /// There is none.
    None,
    /// Stopped before either.
    Open,
}

/// A question with limits lifted.
struct Changed {
    supply: Supply,
    catalogue: Catalogue,
}

impl Changed {
    fn new(question: &Question, lifted: &[Limit], unlimited: &dyn Fn(&Part) -> bool) -> Changed {
        let mut supply = question.supply.clone();
        let mut catalogue = question.catalogue.clone();
        if lifted.contains(&Limit::Cost) {
            supply.caps.cost = None;
        }
        if lifted.contains(&Limit::Heat) {
            supply.caps.heat_w = None;
        }
        if lifted.contains(&Limit::Stock) {
            for part in catalogue.parts_mut() {
                if unlimited(part) {
                    part.stock = None;
                }
            }
        }
        Changed { supply, catalogue }
    }

    /// The parts that its best build takes too many of, as the question has them.
    fn overdrawn(&self, question: &Question) -> Result<Answer, Disagreement> {
        let outcome = optimise(&Question {
            supply: &self.supply,
            catalogue: &self.catalogue,
            top: 1,
            // The search ends where the cap on what it minimises is passed.
            objective: match (self.supply.caps.cost, self.supply.caps.heat_w) {
                (Some(_), _) => Objective::Cost,
                (None, Some(_)) => Objective::Heat,
                (None, None) => question.objective,
            },
            ..question.clone()
        })?;
        let Some(best) = outcome.builds.first() else {
            return Ok(match outcome.proof {
                Proof::Proved => Answer::None,
                Proof::Open { .. } => Answer::Open,
            });
        };
        let verdict = audit(&self.supply, &best.build);
        let mut failing = Vec::new();
        let mut whole = |of: &str, check: Option<Check>| {
            failing.extend(check.filter(|c| !c.met()).map(|check| Margin {
                of: of.to_owned(),
                check,
            }));
        };
        whole("supply", whole::cost(question.supply, verdict.cost));
        whole("supply", whole::heat(question.supply, verdict.heat_w.ok_or("heat")));
        // The rows as the question has them, with their stock.
        let stock: BTreeMap<PartId, &Part> = question.catalogue.parts().map(|p| (p.id, p)).collect();
        let mut short = Vec::new();
        for line in best.build.lines(question.supply) {
            let part = stock.get(&line.part.id).copied();
            let check = part.and_then(|part| whole::stock(question.supply, part, line.qty));
            if check.is_some_and(|c| !c.met()) {
                short.push(line.part.id);
            }
            whole(&line.part.name, check);
        }
        Ok(Answer::Short(short, failing))
    }
}
