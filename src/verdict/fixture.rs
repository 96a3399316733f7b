//! Verdicts for tests: a real table and a small invented library, and evidence made by hand.

use super::{Lineup, Verdict, judge, line_up, shortlist};
use crate::evidence::{
    Cause, Inference, MissingFeature, Posterior, Presence, ReadingEvidence, WeighedComposition,
};
use crate::library::{Library, load_folder};
use crate::reading::read_table;
use crate::reduction::{ReducedSample, reduce};
use crate::setup::{InstrumentKind, Setup, SetupOverrides, resolve};
use std::path::Path;

/// A sample with evidence that tests write by hand.
pub(crate) struct Fixture {
    pub library: Library,
    pub setup: Setup,
    pub sample: ReducedSample,
    pub lineup: Lineup,
    pub inference: Inference,
}

/// The library of `tests/cases/verdict/library`.
pub(crate) fn small_library() -> Library {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/cases/verdict/library");
    load_folder(&folder).unwrap_or_else(|error| panic!("{error}"))
}

impl Fixture {
    /// A flame read with a goniometer: rows of `wavelength,uncertainty`.
    pub fn new(rows: &str) -> Self {
        Self::with(rows, SetupOverrides::default())
    }

    /// The same with another set-up.
    pub fn with(rows: &str, overrides: SetupOverrides) -> Self {
        let library = small_library();
        let overrides = SetupOverrides {
            instrument: overrides.instrument.or(Some(InstrumentKind::Goniometer)),
            ..overrides
        };
        let setup = resolve(None, overrides).unwrap_or_else(|error| panic!("{error}"));
        let table = read_table(
            "bench.csv",
            format!("wavelength_nm,uncertainty_nm,note\n{rows}").as_bytes(),
        );
        let sample = table
            .samples
            .first()
            .unwrap_or_else(|| panic!("{:?}", table.refused));
        let sample = reduce(sample, &setup).unwrap_or_else(|error| panic!("{error}"));
        let shortlist = shortlist(&library, &setup).unwrap_or_else(|error| panic!("{error}"));
        let lineup = line_up(&library, &setup, &shortlist, 1);
        let inference = nothing_known(sample.readings.len(), lineup.weighed.len());
        Self {
            library,
            setup,
            sample,
            lineup,
            inference,
        }
    }

    /// Index of a candidate by id.
    pub fn candidate(&self, id: &str) -> usize {
        let is = |index: usize| {
            self.library
                .substances
                .get(index)
                .is_some_and(|s| s.id == id)
        };
        let place = self
            .lineup
            .weighed
            .iter()
            .position(|weighed| is(weighed.substance));
        place.unwrap_or_else(|| panic!("{id} is not weighed"))
    }

    fn members(&self, ids: &[&str]) -> Vec<usize> {
        let mut members: Vec<usize> = ids.iter().map(|id| self.candidate(id)).collect();
        members.sort_unstable();
        members
    }

    /// Adds compositions; the first leads, and leads whatever the priors.
    pub fn compositions(mut self, ranked: &[(&[&str], f64)]) -> Self {
        for (ids, posterior) in ranked {
            let members = self.members(ids);
            self.inference.compositions.push(WeighedComposition {
                members,
                posterior: *posterior,
                log_evidence: Some(10.0 * posterior),
            });
        }
        let leader = self
            .inference
            .compositions
            .first()
            .map(|leader| leader.members.clone());
        let leader = leader.unwrap_or_default();
        self.inference.leader_with_priors_halved.clone_from(&leader);
        self.inference.leader_with_priors_doubled = leader;
        self
    }

    /// States the ranking without the ubiquitous.
    pub fn without_ubiquitous(mut self, ranked: &[(&[&str], f64)]) -> Self {
        self.inference.without_ubiquitous = ranked
            .iter()
            .map(|(ids, posterior)| (self.members(ids), *posterior))
            .collect();
        self
    }

    /// States the presence of a candidate.
    pub fn present(mut self, id: &str, detected: f64) -> Self {
        let candidate = self.candidate(id);
        self.inference.presence[candidate].detected = detected;
        self.inference.presence[candidate].physical = detected;
        self
    }

    /// Makes the nearest feature of a candidate the cause of a reading.
    pub fn caused(mut self, reading: usize, id: &str, probability: f64) -> Self {
        let candidate = self.candidate(id);
        let (x, u) = (
            self.sample.readings[reading].wavelength_nm,
            self.sample.readings[reading].uncertainty_nm,
        );
        let features = &self.lineup.weighed[candidate].candidate.features;
        let distance = |index: &usize| (features[*index].wavelength_nm - x).abs();
        let nearest = (0..features.len()).min_by(|a, b| distance(a).total_cmp(&distance(b)));
        let feature = nearest.unwrap_or_else(|| panic!("{id} has no features"));
        let cause = Cause {
            candidate,
            emitter: features[feature].emitter,
            feature_nm: features[feature].wavelength_nm,
            feature,
            probability,
            residual_nm: x - features[feature].wavelength_nm,
            residual_sigma: (x - features[feature].wavelength_nm) / u,
        };
        let evidence = &mut self.inference.readings[reading];
        evidence.unexplained = (evidence.unexplained - probability).max(0.0);
        evidence.causes.push(cause);
        evidence
            .causes
            .sort_by(|a, b| b.probability.total_cmp(&a.probability));
        self
    }

    /// Makes a feature of a candidate an expected one that was not seen.
    pub fn missed(mut self, id: &str, wavelength_nm: f64, detection_probability: f64) -> Self {
        let candidate = self.candidate(id);
        let features = &self.lineup.weighed[candidate].candidate.features;
        let feature = features
            .iter()
            .position(|feature| feature.wavelength_nm == wavelength_nm);
        let feature = feature.unwrap_or_else(|| panic!("{id} has no feature at {wavelength_nm}"));
        let emitter = features[feature].emitter;
        self.inference.missing.push(MissingFeature {
            candidate,
            emitter,
            wavelength_nm,
            feature,
            detection_probability,
        });
        self
    }

    /// Changes the evidence by hand.
    pub fn but(mut self, change: impl FnOnce(&mut Inference)) -> Self {
        change(&mut self.inference);
        self
    }

    pub fn verdict(&self) -> Verdict {
        judge(
            &self.library,
            &self.setup,
            &self.sample,
            &self.lineup,
            &self.inference,
        )
    }

    /// The codes of the warnings, in order.
    pub fn codes(&self) -> Vec<&'static str> {
        self.verdict()
            .warnings
            .iter()
            .map(super::Warning::code)
            .collect()
    }
}

fn nothing_known(readings: usize, candidates: usize) -> Inference {
    let absent = Presence {
        detectability: 0.9,
        testable: 0.9,
        detected: 0.0,
        physical: 0.0,
        rests_on_one_line: false,
    };
    Inference {
        compositions: Vec::new(),
        untested_mass_bound: 0.0002,
        presence: vec![absent; candidates],
        readings: vec![
            ReadingEvidence {
                unexplained: 1.0,
                causes: Vec::new()
            };
            readings
        ],
        missing: Vec::new(),
        offset_nm: Posterior {
            mean: 0.05,
            sd: 0.1,
        },
        residual_rms_sigma: Some(1.0),
        leader_with_priors_halved: Vec::new(),
        leader_with_priors_doubled: Vec::new(),
        without_ubiquitous: Vec::new(),
    }
}

/// Strontium with sodium, plainly seen.
pub(crate) fn strontium_with_sodium() -> Fixture {
    Fixture::new("460.9,0.3,\n589.2,0.3,bright\n606.1,0.5,\n")
        .compositions(&[
            (&["strontium", "sodium"], 0.971),
            (&["strontium"], 0.02),
            (&["sodium"], 0.009),
        ])
        .without_ubiquitous(&[(&["strontium"], 0.991), (&[], 0.009)])
        .present("strontium", 0.991)
        .present("sodium", 0.98)
        .caused(0, "strontium", 0.99)
        .caused(1, "sodium", 0.98)
        .caused(2, "strontium", 0.97)
        .missed("strontium", 659.4, 0.62)
}
