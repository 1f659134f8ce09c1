//! The documents of a run beside its maps: contact sheet, findings as JSON, CSV, text and marks.

use super::chart::{Charting, PathDone, frequencies};
use super::draw::is_skip;
use crate::board::Board;
use crate::diag::Diagnostic;
use crate::diag::code::run as code;
use crate::field::Couplings;
use crate::figure::outline;
use crate::finding::Finding;
use crate::finding::noise::Noise;
use crate::plan::Plan;
use crate::report::{
    ContactInput, Findings, Outlined, Picture, SheetInput, contact, csv, json, listing, marks, sheet,
};
use crate::review::Review;

/// Everything that the documents are made of.
pub struct Documents<'d, 'a> {
    pub board: &'d Board,
    pub review: &'d Review,
    pub plan: &'d Plan,
    pub messages: &'d [Diagnostic],
    pub done: &'d [PathDone<'a>],
    pub couplings: &'d [Couplings],
    pub noise: &'d [Noise],
    /// Whether there are pictures to link.
    pub pictures: bool,
}

impl Documents<'_, '_> {
    /// Findings in the order of their numbers.
    fn found(&self) -> Vec<&Finding> {
        self.done.iter().flat_map(|done| &done.findings).collect()
    }

    /// The contact sheets.
    pub fn contact(&self, charting: &Charting) -> Result<Vec<Picture>, Diagnostic> {
        let plan = self.plan;
        let sheets = contact(&ContactInput {
            board: self.board,
            review: self.review,
            columns: frequencies(plan).into_iter().map(|(band, hz)| (&plan.bands[band], hz)).collect(),
            rows: self.done.iter().flat_map(PathDone::contact).collect(),
            scale: charting.scale,
            style: charting.style,
            input_hash: charting.input_hash,
        });
        sheets.map_err(|fault| {
            let text = format!("contact sheet cannot be rendered: {}", fault.0);
            Diagnostic::error(code::CANNOT_RENDER, text)
        })
    }

    /// Names and bytes of the documents.
    pub fn files(&self) -> Vec<(&'static str, Vec<u8>)> {
        let found = self.found();
        let outlined: Vec<Outlined> = self.done.iter().flat_map(PathDone::outlined).collect();
        vec![
            ("findings.json", self.findings()),
            ("findings.csv", csv(&found, self.review.origin)),
            ("review.md", self.with_sheet(&found, sheet)),
            ("findings.gbr", marks(&outlined)),
        ]
    }

    /// The findings as plain text.
    pub fn listing(&self) -> String {
        self.with_sheet(&self.found(), listing)
    }

    fn findings(&self) -> Vec<u8> {
        let mut findings = Findings::new(&self.board.title, &self.board.revision, self.review.origin);
        self.done.iter().for_each(|done| done.add_to(&mut findings, self.plan));
        for couplings in self.couplings {
            findings.add_couplings(couplings, |path| &self.plan.paths[path].name);
        }
        self.noise.iter().for_each(|noise| findings.add_noise(noise));
        for (index, one) in self.done.iter().enumerate() {
            for other in &self.done[index + 1..] {
                for (plane, crowded) in &one.crowded {
                    let same = other.crowded.iter().find(|(known, _)| known == plane);
                    let area_m2 = same.map_or(0.0, |(_, region)| outline::overlap_m2(crowded, region));
                    if area_m2 > 0.0 {
                        findings.add_overlap([one.name(), other.name()], plane, area_m2);
                    }
                }
            }
        }
        self.plan.messages.iter().filter(|message| is_skip(message)).for_each(|m| findings.add_skipped(m));
        self.messages.iter().for_each(|message| findings.add_message(message));
        json(&findings)
    }

    fn with_sheet<T>(&self, found: &[&Finding], write: impl Fn(&SheetInput) -> T) -> T {
        let skipped = self.plan.messages.iter().filter(|message| is_skip(message));
        let withheld = self.done.iter().flat_map(PathDone::withheld);
        let mut missing: Vec<&Diagnostic> = Vec::new();
        for reason in skipped.chain(withheld) {
            if !missing.contains(&reason) {
                missing.push(reason);
            }
        }
        let paths: Vec<&str> = self.done.iter().map(PathDone::name).collect();
        write(&SheetInput {
            title: &self.board.title,
            revision: &self.board.revision,
            origin: self.review.origin,
            findings: found,
            paths: &paths,
            missing: &missing,
            picture: &|finding| {
                let stem = self.done.iter().find_map(|done| done.stem_of(finding, self.plan));
                stem.filter(|_| self.pictures).map(|stem| format!("maps/{stem}.svg"))
            },
            contact: self.pictures.then_some("contact-sheet-1.svg"),
            noise: self.noise,
        })
    }
}
