//! Random small scenes, the same for the same seed.

use super::{Attribution, Constants};
use linstock::evidence::{
    Candidate, CandidateFeature, Conditions, FeatureForm, MixtureRule, Observation, Quadrature,
    Settings,
};

/// Steele, Lea & Flood 2014 (SplitMix64).
#[derive(Debug, Clone)]
pub struct Dice(u64);

impl Dice {
    pub fn new(seed: u64) -> Self {
        Self(seed.wrapping_mul(0xD134_2543_DE82_EF95).wrapping_add(17))
    }

    fn bits(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    /// Uniform on [low, high).
    pub fn within(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * ((self.bits() >> 11) as f64 / (1u64 << 53) as f64)
    }

    /// 0 .. count - 1
    pub fn below(&mut self, count: usize) -> usize {
        (self.bits() % count as u64) as usize
    }

    pub fn chance(&mut self, p: f64) -> bool {
        self.within(0.0, 1.0) < p
    }

    /// Near enough normal: a sum of twelve uniforms.
    pub fn normal(&mut self) -> f64 {
        (0..12).map(|_| self.within(0.0, 1.0)).sum::<f64>() - 6.0
    }
}

/// A scene with its constants in both vocabularies.
#[derive(Debug, Clone)]
pub struct Case {
    pub observations: Vec<Observation>,
    pub conditions: Conditions,
    pub candidates: Vec<Candidate>,
    pub constants: Constants,
}

/// What to draw.
#[derive(Debug, Clone, Copy)]
pub struct Recipe {
    pub substances: usize,
    pub most_features: usize,
    pub most_readings: usize,
    /// Chance that a sample carries strengths.
    pub strengths: f64,
    /// Chance that a line is put close to one of another substance.
    pub crowding: f64,
    /// Chances of small Z, small v, further emitters, blind stretch.
    pub oddities: f64,
    pub amounts: usize,
    pub offsets: usize,
}

impl Case {
    pub fn draw(seed: u64, recipe: &Recipe) -> Self {
        let mut dice = Dice::new(seed);
        let w = [0.3, 1.0, 3.0][dice.below(3)];
        let u = [0.1, 0.3, 0.8][dice.below(3)];
        let u_cal = if recipe.offsets > 1 {
            u * [0.3, 1.0, 2.5][dice.below(3)]
        } else {
            0.0
        };
        let range_nm = [500.0, 540.0];
        let blind = dice.chance(0.5 * recipe.oddities);
        let blind_nm = if blind {
            vec![[512.0, dice.within(513.0, 519.0)]]
        } else {
            Vec::new()
        };
        let mut taken: Vec<f64> = Vec::new();
        let candidates: Vec<Candidate> = (0..recipe.substances)
            .map(|_| candidate(&mut dice, recipe, w, u, &mut taken))
            .collect();
        let hidden = |x: f64| {
            !(range_nm[0]..=range_nm[1]).contains(&x)
                || blind_nm.iter().any(|b| (b[0]..=b[1]).contains(&x))
        };
        let with_strengths = dice.chance(recipe.strengths);
        let common = u_cal * dice.normal();
        let count = 1 + dice.below(recipe.most_readings);
        let mut observations: Vec<Observation> = Vec::new();
        while observations.len() < count {
            let x = if dice.chance(0.8) {
                taken[dice.below(taken.len())] + u * dice.normal() + common
            } else {
                dice.within(500.0, 540.0)
            };
            let scale = dice.within(0.7, 1.4);
            let y = dice.within(0.0, 2.5);
            let strength = with_strengths && dice.chance(0.9);
            let saturated = strength && dice.chance(0.2);
            let band = [None, Some(true), Some(false)][dice.below(3)];
            if hidden(x) {
                continue;
            }
            observations.push(Observation {
                wavelength_nm: x,
                uncertainty_nm: u * scale,
                strength_dex: strength.then_some((y, 0.2 * scale)),
                saturated,
                band,
            });
        }
        let conditions = Conditions {
            range_nm,
            blind_nm,
            resolution_nm: w,
            dynamic_range_dex: dice.within(1.5, 3.0),
            offset_nm: u_cal,
            scale_relative: 0.0,
            splits_nm: Vec::new(),
        };
        let offsets = match recipe.offsets {
            0 | 1 => vec![(0.0, 1.0)],
            n => offset_nodes(u_cal, n),
        };
        let constants = Constants {
            overlook: 0.05,
            tail_weight: 0.1,
            tail_factor: 3.0,
            clutter_mean: 0.4,
            clutter: vec![(0.3, 0.7), (1.0, 0.15), (3.0, 0.1), (9.0, 0.05)],
            clutter_reference: 0.3,
            amounts: recipe.amounts,
            offsets,
            attribution: Attribution::First,
        };
        Self {
            observations,
            conditions,
            candidates,
            constants,
        }
    }

    /// The engine's constants that say the same as the oracle's.
    pub fn settings(&self, mixture: MixtureRule, gate: f64) -> Settings {
        let k = &self.constants;
        let (deltas, weights) = k.offsets.iter().copied().unzip();
        let (rates, rate_weights) = k.clutter.iter().copied().unzip();
        Settings {
            overlook: k.overlook,
            tail_weight: k.tail_weight,
            tail_factor: k.tail_factor,
            clutter_strength_dex: k.clutter_mean,
            clutter: Quadrature::weighted(rates, rate_weights),
            clutter_reference: k.clutter_reference,
            amount_nodes: [k.amounts, k.amounts],
            offset: Some(Quadrature::weighted(deltas, weights)),
            gate,
            mixture,
            ..Settings::default()
        }
    }
}

/// Nodes from −3.2 to 3.2 standard deviations, weights normal with a wide part.
pub fn offset_nodes(sd: f64, count: usize) -> Vec<(f64, f64)> {
    let z: Vec<f64> = (0..count)
        .map(|k| -3.2 + 6.4 * k as f64 / (count - 1) as f64)
        .collect();
    let raw: Vec<f64> = z
        .iter()
        .map(|z| 0.95 * (-z * z / 2.0).exp() + 0.01 * (-z * z / 50.0).exp())
        .collect();
    let sum: f64 = raw.iter().sum();
    z.iter().zip(raw).map(|(z, r)| (z * sd, r / sum)).collect()
}

fn candidate(dice: &mut Dice, recipe: &Recipe, w: f64, u: f64, taken: &mut Vec<f64>) -> Candidate {
    let emitters = if dice.chance(0.5 * recipe.oddities) {
        2
    } else {
        1
    };
    let faint = dice.chance(0.3 * recipe.oddities);
    let features: Vec<CandidateFeature> = (0..1 + dice.below(recipe.most_features))
        .map(|i| {
            let at = if faint {
                // Only the tail of the position density reaches into the range.
                500.0 - u * dice.within(1.6, 2.4)
            } else if !taken.is_empty() && dice.chance(recipe.crowding) {
                taken[dice.below(taken.len())] + w * dice.within(-1.2, 1.2)
            } else if dice.chance(0.1) {
                540.0 + u * dice.within(-2.0, 1.0)
            } else {
                dice.within(501.0, 539.0)
            };
            if !faint {
                taken.push(at);
            }
            CandidateFeature {
                emitter: dice.below(emitters),
                form: [
                    FeatureForm::Line,
                    FeatureForm::BandHead,
                    FeatureForm::BandMax,
                ][dice.below(3)],
                wavelength_nm: at,
                uncertainty_nm: [0.005, 0.4][dice.below(2)],
                level_dex: if i == 0 { 0.0 } else { dice.within(-2.5, 0.0) },
                scatter_dex: dice.within(0.3, 0.7),
            }
        })
        .collect();
    if taken.is_empty() {
        taken.push(520.0);
    }
    let shows = if dice.chance(0.3 * recipe.oddities) {
        0.01
    } else {
        dice.within(0.5, 1.0)
    };
    Candidate {
        prior: [0.5, 0.3, 0.05, 0.01][dice.below(4)],
        shows,
        emitter_spread_dex: (0..emitters)
            .map(|_| [0.3, 0.5, 1.0][dice.below(3)])
            .collect(),
        emitter_shows: (0..emitters)
            .map(|e| match e {
                0 => shows,
                _ => shows * [1.0, 0.6, 0.1][dice.below(3)],
            })
            .collect(),
        features,
    }
}
