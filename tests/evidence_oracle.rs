//! The evidence engine against a brute force that shares no code with it, and against what must
//! hold of any evidence.

mod oracle;

use linstock::evidence::{
    Candidate, CandidateFeature, Conditions, Exhaustive, FeatureForm, MixtureRule, Observation,
    Quadrature, Settings, exhaustive, infer_with,
};
use oracle::cases::{Case, Dice, Recipe, offset_nodes};
use oracle::{Attribution, Oracle};

fn weigh(case: &Case, settings: &Settings) -> Exhaustive {
    exhaustive(
        &case.observations,
        &case.conditions,
        &case.candidates,
        settings,
    )
    .expect("few candidates")
}

/// Logarithms agree to `tolerance` relative where finite; a difference that is nothing beside
/// `scale` (also a logarithm) is none.
fn close(a: f64, b: f64, scale: f64, tolerance: f64) -> bool {
    if a == b {
        return true;
    }
    (a - b).abs() <= tolerance * b.abs().max(1.0)
        || ((a - scale).exp() - (b - scale).exp()).abs() <= tolerance
}

#[derive(Default)]
struct Met {
    cases: usize,
    blends: usize,
    triples: usize,
    small_z: usize,
    worst: f64,
    failures: Vec<String>,
}

fn agree(met: &mut Met, seed: u64, recipe: &Recipe) {
    let case = Case::draw(seed, recipe);
    let brute = Oracle::new(
        &case.observations,
        &case.conditions,
        &case.candidates,
        &case.constants,
    );
    let theirs = brute.all();
    let ours = weigh(&case, &case.settings(MixtureRule::Joint, 0.0));
    met.cases += 1;
    for (c, z) in ours.detectability.iter().enumerate() {
        let expected = brute.detectability(c);
        met.small_z += usize::from(expected > 0.0 && expected < 0.05);
        if (z - expected).abs() > 1e-12 {
            met.failures.push(format!(
                "seed {seed}: Z of {c} is {z}, the oracle says {expected}"
            ));
        }
    }
    for (a, b) in ours.entries.iter().zip(&theirs) {
        met.triples += usize::from(b.members.len() == 3);
        let blended = brute.blends(&b.members);
        met.blends += usize::from(blended > 1);
        if !b.ln_any.is_nan() && !close(a.ln_evidence_any, b.ln_any, b.ln_any, 1e-9) {
            met.failures.push(format!(
                "seed {seed} {:?} (largest blend {blended}): ln E' {} against {}",
                b.members, a.ln_evidence_any, b.ln_any
            ));
        }
        if !close(a.ln_evidence, b.ln_star, b.ln_any, 1e-9) {
            met.failures.push(format!(
                "seed {seed} {:?} (largest blend {blended}): ln E* {} against {} (E' {})",
                b.members, a.ln_evidence, b.ln_star, b.ln_any
            ));
        }
        met.worst = met.worst.max((a.posterior - b.posterior).abs());
        if (a.posterior - b.posterior).abs() > 1e-9 {
            met.failures.push(format!(
                "seed {seed} {:?}: posterior {} against {}",
                b.members, a.posterior, b.posterior
            ));
        }
    }
}

fn settle(met: Met, name: &str) {
    eprintln!(
        "{name}: {} cases, {} compositions with blends, {} triples, {} substances with Z < .05, largest posterior difference {:.1e}",
        met.cases, met.blends, met.triples, met.small_z, met.worst
    );
    let shown: Vec<&str> = met.failures.iter().take(12).map(String::as_str).collect();
    assert!(
        met.failures.is_empty(),
        "{} disagreements:\n{}",
        met.failures.len(),
        shown.join("\n")
    );
    assert!(met.blends > met.cases / 10, "the cases do not blend");
    assert!(met.small_z > 0, "no case with a small Z");
}

const ONE_OR_TWO: Recipe = Recipe {
    substances: 2,
    most_features: 4,
    most_readings: 4,
    strengths: 0.5,
    crowding: 0.5,
    oddities: 0.6,
    amounts: 4,
    offsets: 3,
};

const THREE: Recipe = Recipe {
    substances: 3,
    most_features: 2,
    most_readings: 3,
    strengths: 0.5,
    crowding: 0.7,
    oddities: 0.35,
    amounts: 4,
    offsets: 2,
};

#[test]
fn pairs_agree_with_the_brute_force() {
    let mut met = Met::default();
    for seed in 0..96 {
        agree(&mut met, seed, &ONE_OR_TWO);
    }
    settle(met, "pairs");
}

#[test]
fn triples_agree_with_the_brute_force() {
    let mut met = Met::default();
    for seed in 1000..1064 {
        agree(&mut met, seed, &THREE);
    }
    settle(met, "triples");
}

/// |ln E* by product − ln E* by joint grid| in nats, for the largest composition where it carries at
/// least a twentieth of the posterior: [without, with] lines of different members that blend.
fn product_errors(seeds: std::ops::Range<u64>, recipe: &Recipe) -> [Vec<f64>; 2] {
    let mut errors = [Vec::new(), Vec::new()];
    let all: Vec<usize> = (0..recipe.substances).collect();
    for seed in seeds {
        let case = Case::draw(seed, recipe);
        let brute = Oracle::new(
            &case.observations,
            &case.conditions,
            &case.candidates,
            &case.constants,
        );
        let exact = weigh(&case, &case.settings(MixtureRule::Joint, 1e-3));
        let quick = weigh(&case, &case.settings(MixtureRule::Product, 1e-3));
        if let (Some(e), Some(q)) = (exact.entries.last(), quick.entries.last())
            && e.posterior > 0.05
        {
            errors[usize::from(brute.blends(&all) > 1)].push((q.ln_evidence - e.ln_evidence).abs());
        }
    }
    errors.iter_mut().for_each(|e| e.sort_by(f64::total_cmp));
    errors
}

/// The 95th percentile; prints the distribution.
fn p95_of(name: &str, errors: &[f64]) -> f64 {
    assert!(
        errors.len() >= 10,
        "{name}: {} compositions tell nothing",
        errors.len()
    );
    let at = |share: f64| errors[((errors.len() - 1) as f64 * share) as usize];
    let (median, p95, most) = (at(0.5), at(0.95), at(1.0));
    eprintln!(
        "product, {name}: {} compositions, median {median:.4}, p95 {p95:.4}, most {most:.3} nats",
        errors.len()
    );
    p95
}

const PLAIN_PAIR: Recipe = Recipe {
    substances: 2,
    most_features: 4,
    most_readings: 4,
    strengths: 0.0,
    crowding: 0.3,
    oddities: 0.2,
    amounts: 16,
    offsets: 5,
};

/// What may be lost at the 95th percentile, nats, with and without lines that blend.
const PAIR_P95: f64 = 0.10;
/// See above, where no lines blend.
const TRIPLE_P95: f64 = 0.18;
/// See above, where lines of three members blend and the amounts that count are too many to be
/// integrated jointly now and then.
const BLENDED_TRIPLE_P95: f64 = 0.18;

#[test]
fn product_of_profiles_is_near_the_joint_grid_for_pairs() {
    let strong = Recipe {
        strengths: 1.0,
        amounts: 24,
        ..PLAIN_PAIR
    };
    for (name, recipe) in [("pairs", PLAIN_PAIR), ("pairs with strengths", strong)] {
        let [apart, blended] = product_errors(2000..2500, &recipe);
        assert!(p95_of(name, &apart) <= PAIR_P95, "{name}");
        assert!(
            p95_of(&format!("{name}, blended"), &blended) <= PAIR_P95,
            "{name}, blended"
        );
    }
}

#[test]
fn product_of_profiles_is_near_the_joint_grid_for_triples() {
    let three = Recipe {
        substances: 3,
        most_features: 3,
        most_readings: 6,
        // More states than are integrated jointly.
        amounts: 11,
        offsets: 2,
        oddities: 0.0,
        crowding: 0.1,
        ..PLAIN_PAIR
    };
    let [apart, blended] = product_errors(4000..4650, &three);
    assert!(p95_of("triples", &apart) <= TRIPLE_P95);
    assert!(p95_of("triples, blended", &blended) <= BLENDED_TRIPLE_P95);
}

#[test]
fn the_gate_costs_next_to_nothing() {
    let mut worst = [0.0f64; 2];
    for seed in 5000..5300 {
        let case = Case::draw(
            seed,
            &Recipe {
                amounts: 8,
                ..ONE_OR_TWO
            },
        );
        let open = weigh(&case, &case.settings(MixtureRule::Joint, 0.0));
        let gated = weigh(
            &case,
            &case.settings(MixtureRule::Joint, Settings::default().gate),
        );
        for (a, b) in open.entries.iter().zip(&gated.entries) {
            worst[0] = worst[0].max((a.posterior - b.posterior).abs());
            if a.posterior > 1e-3 {
                worst[1] = worst[1].max((a.ln_evidence - b.ln_evidence).abs());
            }
        }
    }
    eprintln!("gate: posterior {:.1e}, ln E* {:.1e}", worst[0], worst[1]);
    assert!(
        worst[0] < 2e-3 && worst[1] < 1e-2,
        "posterior {}, ln E* {}",
        worst[0],
        worst[1]
    );
}

#[test]
fn search_finds_what_enumeration_finds() {
    let (mut over, mut compared, mut worst) = (0, 0, 0.0f64);
    for seed in 6000..6080 {
        let recipe = Recipe {
            substances: 3 + (seed % 4) as usize,
            most_features: 3,
            amounts: 8,
            offsets: 3,
            strengths: 0.3,
            ..PLAIN_PAIR
        };
        let case = Case::draw(seed, &recipe);
        let settings = case.settings(MixtureRule::Product, 1e-3);
        let full = weigh(&case, &settings);
        let found = infer_with(
            &case.observations,
            &case.conditions,
            &case.candidates,
            &settings,
        );
        let mut apart = 0.0f64;
        for entry in &full.entries {
            let other = found
                .compositions
                .iter()
                .find(|c| c.members == entry.members);
            apart = apart.max((other.map_or(0.0, |c| c.posterior) - entry.posterior).abs());
        }
        compared += 1;
        if apart > found.untested_mass_bound + 1e-3 {
            over += 1;
            worst = worst.max(apart - found.untested_mass_bound);
            eprintln!(
                "search, seed {seed}: {apart:.4} apart, bound {:.1e}",
                found.untested_mass_bound
            );
        }
    }
    eprintln!("search: {over} of {compared} beyond the bound, most by {worst:.4}");
    assert!(
        over * 20 <= compared && worst < 0.05,
        "{over} of {compared}, most by {worst}"
    );
}

fn seen(x: f64, u: f64, strength_dex: Option<(f64, f64)>, saturated: bool) -> Observation {
    Observation {
        wavelength_nm: x,
        uncertainty_nm: u,
        strength_dex,
        saturated,
        band: None,
    }
}

fn substance(prior: f64, shows: f64, lines: &[(f64, f64)]) -> Candidate {
    Candidate {
        prior,
        shows,
        emitter_spread_dex: vec![0.0],
        emitter_shows: vec![shows],
        features: lines
            .iter()
            .map(|(wavelength_nm, level_dex)| CandidateFeature {
                emitter: 0,
                form: FeatureForm::Line,
                wavelength_nm: *wavelength_nm,
                uncertainty_nm: 0.005,
                level_dex: *level_dex,
                scatter_dex: 0.4,
            })
            .collect(),
    }
}

fn window(range_nm: [f64; 2], blind_nm: Vec<[f64; 2]>, offset_nm: f64) -> Conditions {
    Conditions {
        range_nm,
        blind_nm,
        resolution_nm: 0.3,
        dynamic_range_dex: 2.0,
        offset_nm,
        scale_relative: 0.0,
        splits_nm: Vec::new(),
    }
}

const RARE_CLUTTER: f64 = 1e-3;

/// One shift, one rate of clutter: what is left is a density of sets of readings.
fn bare() -> Settings {
    Settings {
        clutter: Quadrature::fixed(RARE_CLUTTER),
        clutter_reference: RARE_CLUTTER,
        amount_nodes: [4, 4],
        offset: Some(Quadrature::fixed(0.0)),
        gate: 0.0,
        mixture: MixtureRule::Joint,
        ..Settings::default()
    }
}

/// (Z, Σ w L): E' times Z.
fn one(readings: &[Observation], conditions: &Conditions, candidate: &Candidate) -> (f64, f64) {
    let all = exhaustive(
        readings,
        conditions,
        std::slice::from_ref(candidate),
        &bare(),
    )
    .expect("one candidate");
    (
        all.detectability[0],
        all.entries[1].ln_evidence_any.exp() * all.detectability[0],
    )
}

/// P(0) + ∫ one + ½ ∫∫ two readings, no strengths.
fn mass(conditions: &Conditions, candidate: &Candidate, u: f64) -> f64 {
    const STEP: f64 = 0.1;
    let [low, high] = conditions.range_nm;
    let blind: f64 = conditions.blind_nm.iter().map(|b| b[1] - b[0]).sum();
    let density = RARE_CLUTTER / (high - low - blind);
    let count = ((high - low) / STEP).round() as usize;
    let at: Vec<f64> = (0..count)
        .map(|k| low + (k as f64 + 0.5) * STEP)
        .filter(|x| !conditions.blind_nm.iter().any(|b| (b[0]..b[1]).contains(x)))
        .collect();
    let reading = |x: f64| seen(x, u, None, false);
    let z = one(&[reading(at[0])], conditions, candidate).0;
    let single: f64 = at
        .iter()
        .map(|x| one(&[reading(*x)], conditions, candidate).1)
        .sum();
    let mut pair = 0.0;
    for (i, x) in at.iter().enumerate() {
        for x2 in &at[i..] {
            let half = if x == x2 { 0.5 } else { 1.0 };
            pair += half * one(&[reading(*x), reading(*x2)], conditions, candidate).1;
        }
    }
    (-RARE_CLUTTER).exp() * (1.0 - z + density * STEP * single + (density * STEP).powi(2) * pair)
}

#[test]
fn readings_of_one_substance_integrate_to_one() {
    let cases = [
        (
            "inside",
            window([500.0, 508.0], vec![], 0.0),
            [(502.0, 0.0), (505.5, -0.6)],
        ),
        (
            "edge",
            window([500.0, 508.0], vec![], 0.0),
            [(500.1, 0.0), (505.0, -0.3)],
        ),
        (
            "just outside",
            window([500.0, 508.0], vec![], 0.0),
            [(508.2, 0.0), (505.0, -0.3)],
        ),
        (
            "blind",
            window([500.0, 508.0], vec![[503.0, 505.0]], 0.0),
            [(502.8, 0.0), (505.4, -0.3)],
        ),
    ];
    for (name, conditions, lines) in cases {
        let total = mass(&conditions, &substance(0.1, 1.0, &lines), 0.3);
        eprintln!("mass, {name}: {total:.6}");
        // Three readings and more: two lines and at least one of clutter.
        assert!((total - 1.0).abs() < 1.1 * RARE_CLUTTER, "{name}: {total}");
    }
}

#[test]
fn strengths_integrate_to_one() {
    let conditions = window([500.0, 504.0], vec![], 0.0);
    let candidate = substance(0.1, 1.0, &[(500.2, 0.0)]);
    let (dx, dy) = (0.1, 0.05);
    let density = RARE_CLUTTER / 4.0;
    let (mut z, mut single) = (0.0, 0.0);
    for i in 0..40 {
        for k in 0..90 {
            let (x, y) = (500.0 + (f64::from(i) + 0.5) * dx, (f64::from(k) + 0.5) * dy);
            let (own, l) = one(
                &[seen(x, 0.3, Some((y, 0.3)), false)],
                &conditions,
                &candidate,
            );
            z = own;
            single += l * density * (-y / 0.4).exp() / 0.4 * dx * dy;
        }
    }
    let total = (-RARE_CLUTTER).exp() * (1.0 - z + single);
    eprintln!("mass with strength: {total:.6}");
    assert!((total - 1.0).abs() < 1.1 * RARE_CLUTTER, "{total}");
}

/// A saturated reading is all strengths above it: L·e^{−y/0.4} = ∫ L·g.
#[test]
fn a_saturated_reading_is_the_sum_of_all_stronger() {
    let conditions = window([500.0, 504.0], vec![], 0.0);
    let candidate = substance(0.1, 1.0, &[(501.2, 0.0)]);
    for y in [0.3, 1.0, 1.8] {
        let (_, l) = one(
            &[seen(501.0, 0.3, Some((y, 0.3)), true)],
            &conditions,
            &candidate,
        );
        let dy = 0.01;
        let sum: f64 = (0..500)
            .map(|k| {
                let y = y + (f64::from(k) + 0.5) * dy;
                let (_, l) = one(
                    &[seen(501.0, 0.3, Some((y, 0.3)), false)],
                    &conditions,
                    &candidate,
                );
                l * (-y / 0.4).exp() / 0.4 * dy
            })
            .sum();
        let ratio = l * (-y / 0.4).exp() / sum;
        assert!((ratio - 1.0).abs() < 1e-3, "y {y}: {ratio}");
    }
}

#[test]
fn order_of_readings_and_candidates_changes_nothing() {
    let mut worst = [0.0f64; 2];
    for seed in 7000..7100 {
        let case = Case::draw(seed, &THREE);
        let mut turned = case.clone();
        turned.observations.reverse();
        turned.candidates.rotate_left(1);
        for (slot, rule) in [MixtureRule::Joint, MixtureRule::Product]
            .into_iter()
            .enumerate()
        {
            let a = weigh(&case, &case.settings(rule, 1e-3));
            let b = weigh(&turned, &case.settings(rule, 1e-3));
            for e in &a.entries {
                let mut members: Vec<usize> = e.members.iter().map(|m| (m + 2) % 3).collect();
                members.sort_unstable();
                let other = b
                    .entries
                    .iter()
                    .find(|o| o.members == members)
                    .expect("the same composition");
                worst[slot] = worst[slot].max((e.posterior - other.posterior).abs());
            }
        }
    }
    eprintln!("order: joint {:.1e}, product {:.1e}", worst[0], worst[1]);
    assert!(worst[0] < 1e-9, "joint {}", worst[0]);
    assert!(worst[1] < 0.05, "product {}", worst[1]);
}

#[test]
fn an_irrelevant_candidate_moves_nothing_beyond_its_own_presence() {
    for seed in 8000..8060 {
        let case = Case::draw(seed, &ONE_OR_TWO);
        let settings = case.settings(MixtureRule::Joint, 1e-3);
        let before = weigh(&case, &settings);
        let mut wider = case.clone();
        let mut free = 502.0;
        let near = |x: f64, y: f64| (x - y).abs() < 4.0;
        while case
            .observations
            .iter()
            .any(|o| near(o.wavelength_nm, free))
            || case
                .candidates
                .iter()
                .flat_map(|c| &c.features)
                .any(|f| near(f.wavelength_nm, free))
            || case
                .conditions
                .blind_nm
                .iter()
                .any(|b| b[0] - 1.0 < free && free < b[1] + 1.0)
        {
            free += 0.5;
        }
        if free > 538.0 {
            continue;
        }
        wider.candidates.push(substance(0.02, 1.0, &[(free, 0.0)]));
        let after = weigh(&wider, &settings);
        let own: f64 = after
            .entries
            .iter()
            .filter(|e| e.members.contains(&2))
            .map(|e| e.posterior)
            .sum();
        for (a, b) in before.entries.iter().zip(&after.entries) {
            assert_eq!(a.members, b.members);
            let moved = (a.posterior - b.posterior).abs();
            assert!(
                moved <= own + 1e-9,
                "seed {seed}: moved {moved}, own presence {own}"
            );
        }
    }
}

#[test]
fn a_shift_of_everything_changes_nothing() {
    for seed in 9000..9060 {
        let case = Case::draw(seed, &ONE_OR_TWO);
        let mut moved = case.clone();
        let by = 64.0;
        moved
            .observations
            .iter_mut()
            .for_each(|o| o.wavelength_nm += by);
        moved
            .candidates
            .iter_mut()
            .flat_map(|c| &mut c.features)
            .for_each(|f| f.wavelength_nm += by);
        moved.conditions.range_nm = moved.conditions.range_nm.map(|x| x + by);
        moved
            .conditions
            .blind_nm
            .iter_mut()
            .flatten()
            .for_each(|x| *x += by);
        let settings = case.settings(MixtureRule::Joint, 1e-3);
        for (a, b) in weigh(&case, &settings)
            .entries
            .iter()
            .zip(&weigh(&moved, &settings).entries)
        {
            assert!((a.posterior - b.posterior).abs() < 1e-9, "seed {seed}");
        }
    }
}

/// Zinc in a flame: never excited, so its absence from the readings says nothing.
#[test]
fn what_the_source_hardly_excites_stays_near_its_prior() {
    let conditions = window([400.0, 700.0], vec![], 0.3);
    let readings = [seen(589.4, 0.5, None, false)];
    for shows in [0.01, 1.0] {
        let list = [
            substance(0.5, 1.0, &[(589.3, 0.0)]),
            substance(0.1, shows, &[(481.05, 0.0), (636.2, -0.2)]),
        ];
        let physical =
            infer_with(&readings, &conditions, &list, &Settings::default()).presence[1].physical;
        if shows < 0.5 {
            assert!((physical - 0.1).abs() < 0.002, "{physical}");
        } else {
            assert!(physical < 0.02, "{physical}");
        }
    }
}

/// A line is swept across the edge of the range: nothing jumps.
#[test]
fn a_line_crosses_the_edge_without_a_jump() {
    let conditions = window([500.0, 540.0], vec![], 0.2);
    let mut dice = Dice::new(1);
    let (deltas, weights) = offset_nodes(0.2, 13).into_iter().unzip();
    let settings = Settings {
        offset: Some(Quadrature::weighted(deltas, weights)),
        gate: 0.0,
        ..Settings::default()
    };
    for _ in 0..3 {
        let first = dice.within(505.0, 530.0);
        let readings = [
            seen(first + 0.1, 0.3, None, false),
            seen(539.7, 0.3, None, false),
        ];
        let posterior = |x: f64| {
            let list = [substance(0.1, 1.0, &[(first, 0.0), (x, -0.2)])];
            let all = exhaustive(&readings, &conditions, &list, &settings).expect("one candidate");
            all.entries[1].posterior.ln() - all.entries[0].posterior.ln()
        };
        let path: Vec<f64> = (0..150)
            .map(|k| posterior(538.5 + 0.02 * f64::from(k)))
            .collect();
        for pair in path.windows(2) {
            assert!(
                (pair[0] - pair[1]).abs() < 0.25,
                "{} then {}",
                pair[0],
                pair[1]
            );
        }
    }
}

/// How much it matters who is named the cause when two members hold a blend equally: of equal
/// leaders the engine names the one of shorter wavelength, here they share it.
#[test]
fn equal_shares_of_a_blend_matter_little() {
    let mut moved: Vec<f64> = Vec::new();
    for seed in 10_000..10_040 {
        let mut case = Case::draw(
            seed,
            &Recipe {
                amounts: 16,
                crowding: 0.8,
                most_features: 2,
                offsets: 2,
                ..PLAIN_PAIR
            },
        );
        let named = Oracle::new(
            &case.observations,
            &case.conditions,
            &case.candidates,
            &case.constants,
        )
        .all();
        case.constants.attribution = Attribution::Leader;
        let shared = Oracle::new(
            &case.observations,
            &case.conditions,
            &case.candidates,
            &case.constants,
        )
        .all();
        moved.extend(
            named
                .iter()
                .zip(&shared)
                .map(|(a, b)| (a.posterior - b.posterior).abs()),
        );
    }
    moved.sort_by(f64::total_cmp);
    let most = moved.last().copied().unwrap_or(0.0);
    eprintln!("equal shares: posterior moves at most {most:.4}");
    assert!(most < 0.05, "{most}");
}
