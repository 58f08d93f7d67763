//! Owns what is said about a part: what forcing it in costs, or what keeps it out.

use serde_json::{Value, json};

use super::json::{margin, unit_of};
use super::page::{Page, headline, set, sheet, wrapped};
use super::table::margin_row;
use super::text::{digits, margin_text, money, printable, signed};
use super::verdict::figures;
use super::{Report, csv, less};
use crate::audit::{Limit, Margin};
use crate::catalogue::Part;
use crate::optimise::{Joint, Question};
use crate::study::why::Verdict;
use crate::units::Money;

/// The answer about one part.
#[derive(Debug, Clone)]
pub struct WhyReport<'c> {
    part: &'c Part,
    rail: Option<String>,
    failing: Vec<Margin>,
    currency: Option<String>,
    says: Says<'c>,
}

#[derive(Debug, Clone)]
enum Says<'c> {
    Fits {
        with: Box<Report<'c>>,
        best: Option<Box<Report<'c>>>,
        proved: bool,
    },
    /// The best company's bill of materials.
    Fails {
        parts: String,
    },
    Joint {
        joint: Vec<String>,
        others_pass: bool,
        proved: bool,
    },
    NoUse {
        rule: String,
    },
}

impl<'c> WhyReport<'c> {
    /// From a verdict; `None` when the search was stopped before there was one.
    #[must_use]
    pub fn new(question: &Question<'c>, part: &'c Part, verdict: Verdict<'c>) -> Option<WhyReport<'c>> {
        let currency = question.catalogue.currency.clone();
        let name = |rail: usize| question.supply.rails.get(rail).map(|rail| rail.name.clone());
        let report = |build| Report::new(question.supply, build, None, currency.clone(), String::new());
        let (rail, failing, says) = match verdict {
            Verdict::Open => return None,
            Verdict::Fits {
                with,
                best,
                rail,
                proved,
            } => {
                let says = Says::Fits {
                    with: Box::new(report(with.build)),
                    best: best.map(|best| Box::new(report(best.build))),
                    proved,
                };
                (name(rail), Vec::new(), says)
            }
            Verdict::Fails { company, failing } => {
                let alone = Report::new(&company.supply, company.build.clone(), None, None, String::new());
                (name(company.rail), failing, Says::Fails { parts: alone.parts() })
            }
            Verdict::Joint {
                alone,
                joint,
                failing,
                others_pass,
                proved,
            } => {
                let says = Says::Joint {
                    joint: joint.iter().map(Joint::words).collect(),
                    others_pass,
                    proved,
                };
                (name(alone.rail), failing, says)
            }
            Verdict::NoUse(rule) => (None, Vec::new(), Says::NoUse { rule }),
        };
        Some(WhyReport {
            part,
            rail,
            failing,
            currency,
            says,
        })
    }

    /// Whether a whole build passes with the part.
    #[must_use]
    pub fn fits(&self) -> bool {
        matches!(self.says, Says::Fits { .. })
    }

    /// Whether that is proved.
    #[must_use]
    pub fn proved(&self) -> bool {
        match self.says {
            Says::Fits { proved, .. } | Says::Joint { proved, .. } => proved,
            Says::Fails { .. } | Says::NoUse { .. } => true,
        }
    }

    /// Cost and heat of the best build with the part, less those of the best of all.
    fn extra(&self) -> (Option<Money>, Option<f64>) {
        let Says::Fits {
            with, best: Some(best), ..
        } = &self.says
        else {
            return (None, None);
        };
        let heat_w = with.audit.heat_w.zip(best.audit.heat_w).map(|(with, best)| with - best);
        (Some(less(with.audit.cost, best.audit.cost)), heat_w)
    }

    fn unit(&self, margin: &Margin) -> &str {
        unit_of(margin.check.limit, self.currency.as_deref())
    }

    /// binrail.why/1
    #[must_use]
    pub fn json(&self) -> Value {
        let (extra, extra_heat_w) = self.extra();
        let failing: Vec<Value> = self.failing.iter().map(|m| margin(m, self.unit(m))).collect();
        let (joint, rule) = match &self.says {
            Says::Joint { joint, .. } => (joint.clone(), None),
            Says::NoUse { rule } => (Vec::new(), Some(rule)),
            Says::Fits { .. } | Says::Fails { .. } => (Vec::new(), None),
        };
        json!({
            "schema": "binrail.why/1",
            "part": self.part.name,
            "slot": self.part.slot.word(),
            "rail": self.rail,
            "fits": self.fits(),
            "failing": failing,
            "joint": joint,
            "rule": rule,
            "extra_cost": extra.map(Money::value),
            "extra_heat_w": extra_heat_w,
        })
    }

    /// One row for each failing limit, or one that says that the part fits.
    #[must_use]
    pub fn csv(&self) -> String {
        let (extra, extra_heat_w) = self.extra();
        let mut header = vec!["part", "slot", "rail", "fits", "extra_cost", "extra_heat_w"];
        header.extend(csv::MARGIN);
        let row = |margin: Option<&Margin>| {
            let mut row = vec![
                self.part.name.clone(),
                self.part.slot.word().to_owned(),
                self.rail.clone().unwrap_or_default(),
                self.fits().to_string(),
                extra.map(|extra| extra.to_string()).unwrap_or_default(),
                csv::number(extra_heat_w),
            ];
            row.extend(match margin {
                Some(margin) => csv::margin(margin, self.unit(margin)),
                None => vec![String::new(); csv::MARGIN.len()],
            });
            row
        };
        let rows: Vec<Vec<String>> = if self.failing.is_empty() {
            vec![row(None)]
        } else {
            self.failing.iter().map(|margin| row(Some(margin))).collect()
        };
        csv::table(&header, rows)
    }

    /// As a page.
    #[must_use]
    pub fn table(&self, page: Page) -> String {
        let part = format!("{} ({})", printable(&self.part.name), self.part.slot.word());
        let rail = printable(self.rail.as_deref().unwrap_or(""));
        match &self.says {
            Says::Fits { with, best, proved } => self.fitting(&part, &rail, with, best.as_deref(), *proved, page),
            Says::Fails { parts } => {
                let worst = self.failing.first().map_or(String::new(), |m| self.short(m));
                let mut out = headline(&format!("{part} does not fit: {worst}"), false, page) + "\n";
                let says = format!("Its best company, rail {rail} alone: {parts}");
                out.push_str(&wrapped(&says, "", "  ", page.width));
                out + &self.failures("What fails there, the furthest from met first", page)
            }
            Says::Joint {
                joint,
                others_pass,
                proved,
            } => {
                let mut out = headline(
                    &format!("{part} does not fit: no whole build passes with it"),
                    false,
                    page,
                ) + "\n";
                let limits = match (joint.is_empty(), proved) {
                    (false, _) => format!("what stands between them: {}.", printable(&joint.join(", "))),
                    (true, true) => "no cap on cost or heat and no stock stands between them.".to_owned(),
                    (true, false) => "stopped before it was found what stands between them.".to_owned(),
                };
                let says = format!("Rail {rail} alone passes with it, but the rails together do not; {limits}");
                out.push_str(&wrapped(&says, "", "  ", page.width));
                if !others_pass {
                    let says = "The part is not to blame: no build passes without it either.";
                    out.push_str(&wrapped(says, "", "  ", page.width));
                }
                out + &self.failures("What fails in the best build with it when that is left aside", page)
            }
            Says::NoUse { rule } => {
                headline(&format!("{part} does not fit: it is in no build"), false, page)
                    + "\n"
                    + &wrapped(&format!("It {rule}."), "", "  ", page.width)
            }
        }
    }

    fn fitting(
        &self,
        part: &str,
        rail: &str,
        with: &Report,
        best: Option<&Report>,
        proved: bool,
        page: Page,
    ) -> String {
        let mut out = headline(&format!("{part} fits, rail {rail}: {}", figures(with)), proved, page);
        if !proved {
            out.push_str("stopped before the proof: a better build with it, or without it, may be there\n");
        }
        out.push('\n');
        let against = best.map(|best| with.against(best)).unwrap_or_default();
        let says = match (best, self.extra()) {
            (Some(best), (Some(extra), heat_w)) if !against.is_empty() => {
                let heat = heat_w.map_or("?".into(), |w| signed(&digits(w)));
                let extra = money(&signed(&extra.to_string()), self.currency.as_deref());
                format!(
                    "Forcing it in costs {extra} a unit and {heat} W against the best build ({}): {against}.",
                    figures(best)
                )
            }
            (Some(_), _) => "The best build holds it.".to_owned(),
            (None, _) => "No build passes without it.".to_owned(),
        };
        out.push_str(&wrapped(&says, "", "  ", page.width));
        out.push_str(&wrapped(&format!("The build: {}", with.parts()), "", "  ", page.width));
        out
    }

    fn failures(&self, title: &str, page: Page) -> String {
        if self.failing.is_empty() {
            return String::new();
        }
        let header = ["Of", "Limit", "Value", "Bound", "Margin", "Corner"];
        let mut table = sheet(&header, &[2, 3, 4], &[5], page);
        for margin in &self.failing {
            table.add_row(margin_row(margin, self.unit(margin)));
        }
        format!("\n{title}\n{}", set(&table))
    }

    /// The limit that is furthest from met, in a few words.
    fn short(&self, margin: &Margin) -> String {
        let corner = margin
            .check
            .corner
            .map_or(String::new(), |c| format!(" at {}", c.word()));
        match (margin.check.missing(), margin.check.margin()) {
            _ if margin.check.limit == Limit::Collapse => format!("its section collapses{corner}"),
            (None, Some(short)) => format!(
                "{} by {}{corner}",
                margin.check.limit.word(),
                margin_text(Some(-short), self.unit(margin))
            ),
            (column, _) => format!("{}, {} is blank", margin.check.limit.word(), column.unwrap_or("a cell")),
        }
    }
}
