//! The evidence of one composition: amounts, emitter shifts, common shift and clutter rate
//! integrated out, counting only what was seen.

mod bars;
mod climb;
mod integrate;
mod profile;
mod slice;
mod unexplained;

use super::assembly::{Assembly, Latent, Stock};
use super::density::ln_sum_exp;
use super::matching::{LANES, Lanes};
use super::settings::MixtureRule;
pub use profile::Profile;
use slice::Slice;

/// A composition with its evidence.
#[derive(Debug, Clone)]
pub struct Weighed {
    /// Candidate indices, ascending.
    pub members: Vec<usize>,
    /// ln E*(S).
    pub ln_evidence: f64,
    /// ln of the integrand by shift node and clutter lane, without their weights.
    pub nodes: Vec<Lanes>,
    /// The latent state with the largest weighted integrand.
    pub mode: Vec<Latent>,
    /// ln L at the mode by shift node and lane, nothing barred; −∞ where left out.
    pub mode_ln: Vec<Lanes>,
    /// Lines of different members that blend.
    pub chains: usize,
    /// How closely the amounts were integrated.
    pub care: Care,
    /// What it took: pairs of line and reading, times shift nodes, times sets of barred members.
    pub work: f64,
}

impl Weighed {
    /// A composition with the same ln E* at every node, without integration.
    fn settled(stock: &Stock, members: &[usize], mode: &[Latent], ln: f64) -> Self {
        let nodes = vec![[ln; LANES]; stock.scene.offset.len()];
        Self {
            members: members.to_vec(),
            ln_evidence: ln_total(stock, &nodes),
            mode_ln: nodes.clone(),
            nodes,
            mode: mode.to_vec(),
            chains: 0,
            care: Care::Joint,
            work: 0.0,
        }
    }

    /// A composition integrated about the state of `profile`.
    fn at_mode(profile: &Profile, members: &[usize], nodes: Slice, care: Care) -> Self {
        Self {
            members: members.to_vec(),
            ln_evidence: ln_total(profile.stock, &nodes),
            nodes,
            mode_ln: profile.ln_unbarred(),
            mode: profile.latents.clone(),
            chains: profile.assembly.chains,
            care,
            work: profile.work_done,
        }
    }

    /// Shift nodes that were not left out.
    pub fn shifts_in_use(&self) -> Vec<usize> {
        (0..self.mode_ln.len())
            .filter(|d| self.mode_ln[*d].iter().any(|ln| ln.is_finite()))
            .collect()
    }
}

/// How closely the amounts of a composition were integrated.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Care {
    /// The newest member was added without moving the others.
    Added,
    /// Product of profiles about the mode.
    Profiles,
    /// Amounts integrated jointly, where they are few enough.
    Joint,
}

/// Shift and amount nodes this far below the best, in ln, are left out.
const NEGLIGIBLE_LN: f64 = -9.0;

/// ln Σ w over shift nodes and lanes.
pub fn ln_total(stock: &Stock, nodes: &[Lanes]) -> f64 {
    let mut terms = Vec::with_capacity(nodes.len() * LANES);
    for (node, weight) in nodes.iter().zip(stock.scene.offset.weights()) {
        let lanes = node.iter().zip(&stock.lane_ln_weight);
        terms.extend(lanes.map(|(ln, lane)| ln + weight.ln() + lane));
    }
    ln_sum_exp(&terms)
}

/// The shift node and lane that carry most of a composition's evidence.
pub fn best_place(stock: &Stock, weighed: &Weighed) -> (usize, usize) {
    let mut best = (f64::NEG_INFINITY, 0, 0);
    for (d, (node, w)) in weighed
        .nodes
        .iter()
        .zip(stock.scene.offset.weights())
        .enumerate()
    {
        for (l, (ln, lane)) in node.iter().zip(&stock.lane_ln_weight).enumerate() {
            let value = ln + w.ln() + lane;
            if value > best.0 {
                best = (value, d, l);
            }
        }
    }
    (best.1, best.2)
}

/// Weighs a composition. `start` gives an amount node for each member to begin from.
pub fn weigh(
    stock: &Stock,
    members: &[usize],
    start: &[Latent],
    barring: bool,
    joint: bool,
) -> Weighed {
    if barring && members.iter().any(|m| stock.prepared[*m].pairs.is_empty()) {
        return Weighed::settled(stock, members, start, f64::NEG_INFINITY);
    }
    if members.is_empty() {
        return Weighed::settled(stock, members, start, 0.0);
    }
    let assembly = Assembly::new(stock, members);
    let all = (0..stock.scene.offset.len()).collect();
    let mut profile = Profile::new(stock, &assembly, start.to_vec(), all, Vec::new());
    let nodes = match stock.scene.settings.mixture {
        MixtureRule::Product => {
            profile.drop_hopeless();
            if barring {
                profile.bar_more();
            }
            profile.climb();
            // Away from the start other members may be in doubt.
            if barring && profile.bar_more() {
                profile.climb();
            }
            profile.product_at_best(joint)
        }
        MixtureRule::Joint => profile.joint(barring),
    };
    let care = match joint || members.len() == 1 {
        true => Care::Joint,
        false => Care::Profiles,
    };
    Weighed::at_mode(&profile, members, nodes, care)
}

/// Adds one member to a composition without moving the others from their mode: a first, cheap
/// estimate of E*(S ∪ x) = E*(S) · Σ_α w/Z (L(S ∪ x) − L(S ∪ x; x barred))/L(S) at the mode of S.
///
/// `members` and `start` are of the whole composition, `newest` the place of the added one.
pub fn weigh_added(
    stock: &Stock,
    base: &Weighed,
    members: &[usize],
    start: &[Latent],
    newest: usize,
) -> Weighed {
    let assembly = Assembly::new(stock, members);
    let mut profile = Profile::new(
        stock,
        &assembly,
        start.to_vec(),
        base.shifts_in_use(),
        vec![newest],
    );
    profile.jump(newest);
    let mode: Slice = profile.shifts.iter().map(|d| base.mode_ln[*d]).collect();
    let mut added = profile.member_profile(newest, &mode);
    for (lanes, d) in added.iter_mut().zip(&profile.shifts) {
        for (ln, of_base) in lanes.iter_mut().zip(&base.nodes[*d]) {
            *ln += of_base;
        }
    }
    let nodes = profile.spread(added);
    Weighed::at_mode(&profile, members, nodes, Care::Added)
}

/// A middling state to begin from.
pub fn middle(stock: &Stock, candidate: usize) -> Latent {
    Latent {
        amount: stock.scene.amount.len() / 2,
        shifts: stock.prepared[candidate]
            .shifts
            .iter()
            .map(|q| q.len() / 2)
            .collect(),
    }
}
