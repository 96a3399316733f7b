//! Which substances are weighed, with what the model needs to know of them.

use crate::evidence::{Candidate, CandidateFeature, FeatureForm};
use crate::library::{Emitter, Form, Library, NameError, Selection, Substance};
use crate::setup::{Candidates, InstrumentKind, Setup, UNSEEN_DEX};

/// Least scatter of real strengths about stated ones, decades; quadrature with the row's own.
const LEAST_SCATTER_DEX: f64 = 0.4;

/// Strength of a line read in a neighbouring order against its own order, decades.
const OTHER_ORDER_DEX: f64 = -1.3;

/// Scatter of the strength in a neighbouring order, decades.
const OTHER_ORDER_SCATTER_DEX: f64 = 0.6;

/// The substances that a set-up asks to weigh, found in the library.
#[derive(Debug, Clone, PartialEq)]
pub struct Shortlist {
    /// Index into the substances of the library, and prior probability of being in the sample.
    chosen: Vec<(usize, f64)>,
    /// Indices of the substances that the set-up names, or a list of it, sorted.
    asked_for: Vec<usize>,
}

/// Why a set-up leaves nothing to weigh.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum ShortlistError {
    /// The library does not know a name.
    #[error(transparent)]
    Name(#[from] NameError),
    /// Nothing to weigh.
    #[error(
        "no substance of the library shows in this kind of source (check --source and --candidates)"
    )]
    NothingToWeigh,
}

/// Where a feature of a candidate comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Origin {
    /// Index into the emitters of the substance.
    pub emitter: usize,
    /// Index into the features of that emitter.
    pub feature: usize,
    /// Diffraction order the feature is seen in.
    pub order: u32,
}

/// A substance that is weighed.
#[derive(Debug, Clone, PartialEq)]
pub struct Weighed {
    /// Index into the substances of the library.
    pub substance: usize,
    /// The set-up names it, or a list of it.
    pub asked_for: bool,
    /// What the model gets to see.
    pub candidate: Candidate,
    /// Parallel to the features of the candidate.
    pub origins: Vec<Origin>,
}

/// What is weighed, and what was asked for in vain.
#[derive(Debug, Clone, PartialEq)]
pub struct Lineup {
    /// Substances with an emitter in this kind of source, in the order of the library.
    pub weighed: Vec<Weighed>,
    /// Substances asked for that have none.
    pub not_excited: Vec<usize>,
}

/// Finds the substances that the set-up asks to weigh.
///
/// A candidate list only restricts; what is expected on any sample is added to it. A single name
/// that is no list may be a substance.
///
/// # Errors
/// If the set-up names something that the library does not know, or nothing is left to weigh.
pub fn shortlist(library: &Library, setup: &Setup) -> Result<Shortlist, ShortlistError> {
    let selection = match setup.candidates() {
        Candidates::Everything => Selection::Everything,
        Candidates::Named(names) => library.select_named(names)?,
        Candidates::List(name) => library
            .select_list(name)
            .or_else(|not_a_list| library.select_named(&[name]).map_err(|_| not_a_list))?,
    };
    let always: Vec<usize> = setup
        .always()
        .iter()
        .map(|name| library.find(name))
        .collect::<Result<_, _>>()?;
    let chosen = library.candidate_priors(setup.source(), &selection, &always);
    if chosen.is_empty() {
        return Err(ShortlistError::NothingToWeigh);
    }
    let mut asked_for = always;
    if let Selection::Listed(listed) = selection {
        asked_for.extend(listed);
    }
    asked_for.sort_unstable();
    asked_for.dedup();
    Ok(Shortlist { chosen, asked_for })
}

/// Prepares the shortlist for readings taken in a diffraction order.
pub fn line_up(library: &Library, setup: &Setup, shortlist: &Shortlist, order: u32) -> Lineup {
    let mut lineup = Lineup {
        weighed: Vec::new(),
        not_excited: Vec::new(),
    };
    for &(index, prior) in &shortlist.chosen {
        let asked_for = shortlist.asked_for.binary_search(&index).is_ok();
        let Some(substance) = library.substances.get(index) else {
            continue;
        };
        let (candidate, origins) = candidate(substance, setup, prior, order);
        if candidate.features.is_empty() {
            lineup.not_excited.extend(asked_for.then_some(index));
        } else {
            lineup.weighed.push(Weighed {
                substance: index,
                asked_for,
                candidate,
                origins,
            });
        }
    }
    lineup
}

fn candidate(
    substance: &Substance,
    setup: &Setup,
    prior: f64,
    order: u32,
) -> (Candidate, Vec<Origin>) {
    let kind = setup.source().index();
    let mut candidate = Candidate {
        prior,
        shows: 0.0,
        emitter_spread_dex: Vec::new(),
        emitter_shows: Vec::new(),
        features: Vec::new(),
    };
    let mut origins = Vec::new();
    for (emitter_index, emitter) in substance.emitters.iter().enumerate() {
        let Some(excitation) = emitter.excitation.get(kind).and_then(Option::as_ref) else {
            continue;
        };
        let seen = emitter_features(emitter, setup, order, excitation.level_dex);
        if seen.is_empty() {
            continue;
        }
        candidate.shows = candidate.shows.max(excitation.shows);
        for (mut feature, feature_index, order) in seen {
            feature.emitter = candidate.emitter_spread_dex.len();
            candidate.features.push(feature);
            origins.push(Origin {
                emitter: emitter_index,
                feature: feature_index,
                order,
            });
        }
        candidate
            .emitter_spread_dex
            .push(excitation.level_spread_dex);
        candidate.emitter_shows.push(excitation.shows);
    }
    (candidate, origins)
}

/// Features of one emitter in every order that may fall in, each with its index and its order.
fn emitter_features(
    emitter: &Emitter,
    setup: &Setup,
    order: u32,
    level_dex: f64,
) -> Vec<(CandidateFeature, usize, u32)> {
    let kind = setup.source().index();
    let mut seen = Vec::new();
    for (index, feature) in emitter.features.iter().enumerate() {
        let Some(strength_dex) = feature.strength_dex.get(kind).copied().flatten() else {
            continue;
        };
        let wavelength_nm = feature.wavelength.nm();
        let response_dex = setup.response_dex(wavelength_nm);
        let own = CandidateFeature {
            emitter: 0,
            form: form(feature.form),
            wavelength_nm,
            uncertainty_nm: feature.uncertainty_nm,
            level_dex: level_dex + strength_dex + response_dex,
            scatter_dex: feature.scatter_dex.hypot(LEAST_SCATTER_DEX),
        };
        // What the eye or the filter does not pass is not seen in any order.
        let others = if response_dex > UNSEEN_DEX {
            other_orders(setup, &own, order)
        } else {
            Vec::new()
        };
        seen.push((own, index, order));
        seen.extend(
            others
                .into_iter()
                .map(|(feature, order)| (feature, index, order)),
        );
    }
    seen
}

/// The same feature where a grating shows it in the orders beside the one read in: a feature at λ
/// seen in order k reads as kλ/m in order m.
fn other_orders(setup: &Setup, own: &CandidateFeature, order: u32) -> Vec<(CandidateFeature, u32)> {
    if setup.orders_filtered() || !is_grating(setup.instrument()) {
        return Vec::new();
    }
    let [low, high] = setup.seen_range();
    [order.saturating_sub(1), order.saturating_add(1)]
        .into_iter()
        .filter(|&other| other >= 1 && order >= 1)
        .map(|other| {
            let ratio = f64::from(other) / f64::from(order);
            let feature = CandidateFeature {
                wavelength_nm: own.wavelength_nm * ratio,
                uncertainty_nm: own.uncertainty_nm * ratio,
                level_dex: own.level_dex + OTHER_ORDER_DEX,
                scatter_dex: OTHER_ORDER_SCATTER_DEX,
                ..own.clone()
            };
            (feature, other)
        })
        .filter(|(feature, _)| (low..=high).contains(&feature.wavelength_nm))
        .collect()
}

/// Whether an instrument has diffraction orders.
pub(super) fn is_grating(instrument: InstrumentKind) -> bool {
    matches!(
        instrument,
        InstrumentKind::Goniometer | InstrumentKind::Camera | InstrumentKind::Ccd
    )
}

fn form(form: Form) -> FeatureForm {
    match form {
        Form::Line => FeatureForm::Line,
        Form::BandHead => FeatureForm::BandHead,
        Form::BandMax => FeatureForm::BandMax,
    }
}
