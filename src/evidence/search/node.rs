//! One evaluated composition and what is known of those that contain it.

use super::super::composition::Weighed;

/// A composition of the search.
#[derive(Debug)]
pub struct Node {
    /// Positions in `Search::order`, ascending.
    pub places: Vec<usize>,
    pub weighed: Weighed,
    pub ln_weight: f64,
    /// What the weight may turn out to be; the weight itself unless it was only estimated.
    pub ln_hope: f64,
    /// Bound on ln of the factor that adding each candidate can bring.
    pub gain: Vec<f64>,
    /// Whether the child by each candidate has been evaluated.
    pub done: Vec<bool>,
}

impl Node {
    /// An estimate that found nothing, although blends may hide something.
    pub fn is_hidden(&self) -> bool {
        self.ln_weight == f64::NEG_INFINITY && self.ln_hope > self.ln_weight
    }

    /// ln weight to count on.
    pub fn expected(&self) -> f64 {
        if self.is_hidden() {
            self.ln_hope
        } else {
            self.ln_weight
        }
    }
}

/// How much more than its estimate a composition may weigh.
#[derive(Debug, Clone, Copy)]
pub enum Hope {
    /// So many nats above the estimate.
    Above(f64),
    /// So much in all.
    AtMost(f64),
}
