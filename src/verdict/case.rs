//! Everything known of one sample while it is judged, with the look-ups that the parts share.
//!
//! Indices come from the model; one that points nowhere yields nothing instead of a panic.

use super::thresholds::{
    COMPOSITION_KEPT_FROM, COMPOSITIONS_KEPT_MAX, COMPOSITIONS_KEPT_MIN, NAMED_FROM_PRESENCE,
};
use super::{RankedComposition, SubstanceFinding, SubstanceName, Weighed, sentence};
use crate::evidence::{CandidateFeature, Inference, Presence};
use crate::library::{Emitter, Feature, Library, PriorClass, Substance};
use crate::reduction::ReducedSample;
use crate::setup::Setup;

/// One sample before the judge.
#[derive(Clone, Copy)]
pub(super) struct Case<'a> {
    pub library: &'a Library,
    pub setup: &'a Setup,
    pub sample: &'a ReducedSample,
    pub weighed: &'a [Weighed],
    /// Substances asked for by name that this kind of source does not excite.
    pub not_excited: &'a [usize],
    pub inference: &'a Inference,
}

impl<'a> Case<'a> {
    /// The substance behind a candidate.
    pub fn substance(&self, candidate: usize) -> Option<&'a Substance> {
        self.library
            .substances
            .get(self.weighed.get(candidate)?.substance)
    }

    /// A candidate as reports name it.
    pub fn name(&self, candidate: usize) -> Option<SubstanceName> {
        self.substance(candidate).map(|substance| SubstanceName {
            id: substance.id.clone(),
            name: substance.name.clone(),
            symbol: substance.symbol.clone(),
            ubiquitous: self.is_ubiquitous(candidate),
        })
    }

    /// Several candidates as reports name them.
    pub fn names(&self, candidates: &[usize]) -> Vec<SubstanceName> {
        candidates
            .iter()
            .filter_map(|&candidate| self.name(candidate))
            .collect()
    }

    /// Whether a candidate is expected on nearly every sample read in this kind of source.
    pub fn is_ubiquitous(&self, candidate: usize) -> bool {
        self.substance(candidate).is_some_and(|substance| {
            substance.prior.get(self.setup.source().index()) == Some(&PriorClass::Ubiquitous)
        })
    }

    /// The emitter and the feature of the library behind a feature of a candidate.
    pub fn feature(&self, candidate: usize, feature: usize) -> Option<(&'a Emitter, &'a Feature)> {
        let origin = self.weighed.get(candidate)?.origins.get(feature)?;
        let emitter = self.substance(candidate)?.emitters.get(origin.emitter)?;
        Some((emitter, emitter.features.get(origin.feature)?))
    }

    /// Features of a candidate, each with its strength in decades relative to the strongest one
    /// that the set-up can see.
    pub fn relative_features(&self, candidate: usize) -> Vec<(&'a CandidateFeature, f64)> {
        let features = self
            .weighed
            .get(candidate)
            .map_or(&[][..], |weighed| &weighed.candidate.features);
        let seen: Vec<&CandidateFeature> = features
            .iter()
            .filter(|feature| self.is_visible(feature.wavelength_nm))
            .collect();
        let strongest = seen
            .iter()
            .map(|feature| feature.level_dex)
            .fold(f64::NEG_INFINITY, f64::max);
        seen.into_iter()
            .map(|feature| (feature, feature.level_dex - strongest))
            .collect()
    }

    /// Whether a wavelength (nm) lies in the range and outside blind stretches.
    pub fn is_visible(&self, wavelength_nm: f64) -> bool {
        let [low, high] = self.setup.seen_range();
        (low..=high).contains(&wavelength_nm) && !self.setup.is_blind(wavelength_nm)
    }

    /// What the readings say of a candidate.
    pub fn presence(&self, candidate: usize) -> Option<&'a Presence> {
        self.inference.presence.get(candidate)
    }

    /// Members of the leading composition; none if nothing was weighed.
    pub fn leader(&self) -> &'a [usize] {
        self.inference
            .compositions
            .first()
            .map_or(&[], |leader| &leader.members)
    }

    /// Candidates that the answer speaks of: the leader's members and whatever is likely enough
    /// to be met, in that order.
    pub fn spoken_of(&self) -> Vec<usize> {
        let leader = self.leader();
        let mut others: Vec<usize> = (0..self.weighed.len())
            .filter(|candidate| !leader.contains(candidate))
            .filter(|&candidate| self.presence_of(candidate) > NAMED_FROM_PRESENCE)
            .collect();
        others.sort_by(|&a, &b| {
            self.presence_of(b)
                .total_cmp(&self.presence_of(a))
                .then(a.cmp(&b))
        });
        leader.iter().copied().chain(others).collect()
    }

    /// Chance that a candidate caused at least one reading; zero for one that was not weighed.
    pub fn presence_of(&self, candidate: usize) -> f64 {
        self.presence(candidate)
            .map_or(0.0, |presence| presence.detected)
    }

    /// The compositions worth reporting.
    pub fn ranking(&self) -> Vec<RankedComposition> {
        let ranked = self
            .inference
            .compositions
            .iter()
            .map(|composition| RankedComposition {
                substances: self.names(&composition.members),
                described: sentence::composition(self, &composition.members),
                posterior: composition.posterior,
                log_evidence: composition.log_evidence.filter(|value| value.is_finite()),
            });
        worth_reporting(ranked)
    }

    /// The same with ubiquitous substances left out of account; empty if none was weighed.
    pub fn ranking_without_ubiquitous(&self) -> Vec<RankedComposition> {
        if !(0..self.weighed.len()).any(|candidate| self.is_ubiquitous(candidate)) {
            return Vec::new();
        }
        let ranked = self
            .inference
            .without_ubiquitous
            .iter()
            .map(|(members, posterior)| RankedComposition {
                substances: self.names(members),
                described: sentence::composition(self, members),
                posterior: *posterior,
                log_evidence: None,
            });
        worth_reporting(ranked)
    }

    /// Every candidate by falling presence.
    pub fn substance_findings(&self) -> Vec<SubstanceFinding> {
        let mut findings: Vec<SubstanceFinding> = (0..self.weighed.len())
            .filter_map(|candidate| {
                let presence = self.presence(candidate)?;
                Some(SubstanceFinding {
                    substance: self.name(candidate)?,
                    presence: presence.detected,
                    physical_presence: presence.physical,
                    testable: presence.testable,
                    rests_on_one_line: presence.rests_on_one_line,
                })
            })
            .collect();
        findings.sort_by(|a, b| {
            b.presence
                .total_cmp(&a.presence)
                .then_with(|| a.substance.id.cmp(&b.substance.id))
        });
        findings
    }
}

fn worth_reporting(ranked: impl Iterator<Item = RankedComposition>) -> Vec<RankedComposition> {
    ranked
        .take(COMPOSITIONS_KEPT_MAX)
        .enumerate()
        .take_while(|(rank, composition)| {
            *rank < COMPOSITIONS_KEPT_MIN || composition.posterior >= COMPOSITION_KEPT_FROM
        })
        .map(|(_, composition)| composition)
        .collect()
}
