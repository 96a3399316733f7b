//! How likely a substance is before anything is read.

use super::{Library, NameError, PriorClass, SourceKind, Substance};

/// Prior of a substance that is on nearly every sample, or that the set-up always expects.
const UBIQUITOUS: f64 = 0.5;
/// Prior of what comes with the source or the room.
const BACKGROUND: f64 = 0.3;
/// No usual or rare substance is likelier than this.
const CAP: f64 = 0.3;
/// How much likelier a usual substance is than a rare one.
const USUAL_TO_RARE: f64 = 5.0;

/// Number of usual and rare substances expected in one sample: the sum of their priors over the
/// whole library. Flames and discharges are from the model; for absorption nothing was measured,
/// and a daylight spectrum or a salt flame before a lamp is taken to be as simple as a flame.
fn expected_number(source: SourceKind) -> f64 {
    match source {
        SourceKind::Flame => 1.5,
        // Daylight shows its half dozen usual substances at once.
        SourceKind::Absorption => 3.5,
        SourceKind::Discharge => 2.5,
    }
}

/// The substances to be weighed, before a set-up's `always` is added.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Selection {
    /// Every substance that has an emitter in the kind of source and is not `never` met there.
    Everything,
    /// These substances, by index into [`Library::substances`], whatever their class. One that has
    /// no emitter in the kind of source stays: it cannot be tested there, which the report must say.
    Listed(Vec<usize>),
}

impl Library {
    /// The selection made by a named list.
    ///
    /// # Errors
    /// [`NameError::Unknown`] with close names.
    pub fn select_list(&self, name: &str) -> Result<Selection, NameError> {
        self.select_named(self.list(name)?)
    }

    /// The selection of substances by anything [`Library::find`] understands.
    ///
    /// # Errors
    /// The first name that cannot be followed.
    pub fn select_named(&self, names: &[impl AsRef<str>]) -> Result<Selection, NameError> {
        let found: Result<_, _> = names.iter().map(|name| self.find(name.as_ref())).collect();
        found.map(Selection::Listed)
    }

    /// The prior probability π that the substance at `index` is in a sample read in `source`.
    ///
    /// Ubiquitous .5, background .3. Usual and rare stand 5 : 1 and are scaled so that they sum
    /// to the number of substances expected in one sample (flame 1.5, discharge 2.5, absorption
    /// 3.5), counting the substances of the whole library that have an emitter in this kind of
    /// source; each is then capped at .3. What the cap takes off is not given to the others: in a
    /// small library that would lift rare substances to the rank of usual ones. `never` counts as
    /// rare, for such a substance is only weighed where somebody listed it by name. An index
    /// outside the library has 0.
    pub fn prior(&self, source: SourceKind, index: usize) -> f64 {
        (self.substances.get(index)).map_or(0.0, |s| prior_of(s, source, self.rare_prior(source)))
    }

    /// The substances to be weighed with their priors, ascending by index.
    ///
    /// A list only restricts: priors are those of the whole library. Substances in `always` are
    /// added, and have at least .5.
    pub fn candidate_priors(
        &self,
        source: SourceKind,
        selection: &Selection,
        always: &[usize],
    ) -> Vec<(usize, f64)> {
        let rare = self.rare_prior(source);
        let weighed = |index: usize, substance: &Substance| {
            let class = substance.prior[source.index()];
            let chosen = match selection {
                Selection::Everything => class != PriorClass::Never && is_met(substance, source),
                Selection::Listed(listed) => listed.contains(&index),
            };
            let prior = prior_of(substance, source, rare);
            match (always.contains(&index), chosen) {
                (true, _) => Some((index, prior.max(UBIQUITOUS))),
                (false, true) => Some((index, prior)),
                (false, false) => None,
            }
        };
        let numbered = self.substances.iter().enumerate();
        numbered
            .filter_map(|(index, s)| weighed(index, s))
            .collect()
    }

    /// The prior of a rare substance before the cap.
    fn rare_prior(&self, source: SourceKind) -> f64 {
        let shares = self.substances.iter().filter(|s| is_met(s, source));
        let shares: f64 = (shares.map(|s| match s.prior[source.index()] {
            PriorClass::Usual => USUAL_TO_RARE,
            PriorClass::Rare => 1.0,
            PriorClass::Ubiquitous | PriorClass::Background | PriorClass::Never => 0.0,
        }))
        .sum();
        // Without usual and rare substances the value serves only `never` ones listed by name.
        expected_number(source) / shares.max(1.0)
    }
}

fn is_met(substance: &Substance, source: SourceKind) -> bool {
    let at = source.index();
    substance
        .emitters
        .iter()
        .any(|e| e.excitation[at].is_some())
}

fn prior_of(substance: &Substance, source: SourceKind, rare: f64) -> f64 {
    match substance.prior[source.index()] {
        PriorClass::Ubiquitous => UBIQUITOUS,
        PriorClass::Background => BACKGROUND,
        PriorClass::Usual => (USUAL_TO_RARE * rare).min(CAP),
        PriorClass::Rare | PriorClass::Never => rare.min(CAP),
    }
}

#[cfg(test)]
mod tests {
    use super::super::load::tiny;
    use super::*;

    fn named(library: &Library, source: SourceKind, id: &str) -> f64 {
        library.prior(source, library.find(id).unwrap_or(usize::MAX))
    }

    /// The tiny library with every element `copies` times over.
    fn larger(copies: usize) -> Library {
        let mut library = tiny();
        let own = library.substances.clone();
        for k in 1..copies {
            library.substances.extend(own.iter().cloned().map(|mut s| {
                s.id = format!("{}-{k}", s.id);
                s
            }));
        }
        library.substances.sort_by(|a, b| a.id.cmp(&b.id));
        library
    }

    #[test]
    fn classes_have_the_priors_of_the_model() {
        let library = tiny();
        assert_eq!(named(&library, SourceKind::Flame, "sodium"), 0.5);
        assert_eq!(named(&library, SourceKind::Flame, "room-light"), 0.3);
        // One usual and one rare substance: 1.5 · 5/6 is capped, 1.5/6 is not, nor is it raised.
        assert_eq!(named(&library, SourceKind::Flame, "strontium"), 0.3);
        assert_eq!(named(&library, SourceKind::Flame, "cobalt"), 0.25);
        assert_eq!(library.prior(SourceKind::Flame, 99), 0.0);
    }

    #[test]
    fn usual_and_rare_sum_to_the_expected_number_where_nothing_is_capped() {
        let library = larger(8);
        for (source, expected) in [(SourceKind::Flame, 1.5), (SourceKind::Discharge, 2.5)] {
            let scaled = library.substances.iter().enumerate().filter(|(_, s)| {
                let class = s.prior[source.index()];
                is_met(s, source) && matches!(class, PriorClass::Usual | PriorClass::Rare)
            });
            let sum: f64 = scaled.map(|(index, _)| library.prior(source, index)).sum();
            assert!((sum - expected).abs() < 1e-12, "{source:?}: {sum}");
        }
        let usual = named(&library, SourceKind::Flame, "strontium-3");
        let rare = named(&library, SourceKind::Flame, "cobalt-5");
        assert!((usual / rare - 5.0).abs() < 1e-12, "{usual} {rare}");
    }

    #[test]
    fn a_substance_without_emitters_here_takes_no_share() {
        let mut library = larger(8);
        let before = named(&library, SourceKind::Flame, "cobalt");
        let mut ghost = library.substances[0].clone();
        ghost.id = "zz-ghost".into();
        ghost.prior = [PriorClass::Usual; 3];
        ghost.emitters.clear();
        library.substances.push(ghost);
        assert_eq!(named(&library, SourceKind::Flame, "cobalt"), before);
    }

    #[test]
    fn everything_leaves_out_what_is_never_met_and_a_list_only_restricts() {
        let library = larger(8);
        let source = SourceKind::Flame;
        let index = |id: &str| library.find(id).expect("known");
        let all = library.candidate_priors(source, &Selection::Everything, &[]);
        assert!(all.is_sorted_by(|a, b| a.0 < b.0));
        assert!(all.iter().all(|(i, p)| *p == library.prior(source, *i)));
        assert!(!all.iter().any(|(i, _)| *i == index("carbon-monoxide")));

        let listed = library
            .select_named(&["carbon-monoxide", "strontium"])
            .expect("known");
        let few = library.candidate_priors(source, &listed, &[]);
        let rare = named(&library, source, "cobalt");
        assert_eq!(
            few,
            [
                (index("carbon-monoxide"), rare),
                (index("strontium"), 5.0 * rare)
            ]
        );
    }

    #[test]
    fn always_adds_one_half() {
        let library = larger(8);
        let cobalt = library.find("cobalt").expect("known");
        let listed = library.select_list("lamps").expect("known");
        let few = library.candidate_priors(SourceKind::Flame, &listed, &[cobalt]);
        assert_eq!(
            few,
            [(cobalt, 0.5), (library.find("sodium").expect("known"), 0.5)]
        );
    }
}
