//! The words of the warnings.

use super::{MemoryRow, Warning};
use crate::reduction::AsideReason;
use crate::verdict::thresholds::UNTESTED_BOUNDLESS;
use crate::verdict::wording::{
    alternatives, at_most, list, probability, rows, sentence_case, wavelength_with_uncertainty,
};

impl Warning {
    /// What is the matter, in plain words.
    pub fn message(&self) -> String {
        match self {
            Self::UnlistedSubstanceLikely {
                readings,
                restricted,
            } => {
                let weighed = if *restricted {
                    "on the candidate list"
                } else {
                    "in the library"
                };
                format!(
                    "{} readings are not explained by anything {weighed} ({} nm): a substance that is not \
                     listed is likely, whatever the probabilities above say.",
                    readings.len(),
                    list(readings)
                )
            }
            Self::ListCutShort {
                count,
                stated: true,
            } => format!(
                "The list was cut at {count} readings, so a line that is not on it may still be there; \
                 the answer is held back."
            ),
            Self::ListCutShort {
                count,
                stated: false,
            } => format!(
                "Exactly {count} readings with strengths and no faintest strength look like a list cut by \
                 count; a line that is not on it may still be there, so the answer is held back."
            ),
            Self::UntestedCompositions { bound } if *bound > UNTESTED_BOUNDLESS => {
                "The search was stopped before everything was weighed that may count, which may \
                 change the answer."
                    .to_owned()
            }
            Self::UntestedCompositions { bound } => format!(
                "Compositions that were not weighed hold {} of the probability, which may change the answer.",
                at_most(*bound)
            ),
            Self::RestsOnOneLine {
                substance, reading, ..
            } => match reading {
                Some(reading) => format!(
                    "{} rests on one reading, {reading} nm.",
                    sentence_case(substance)
                ),
                None => format!("{} rests on one reading.", sentence_case(substance)),
            },
            Self::CannotSeparate { substances, .. } => {
                format!("These readings cannot tell {} apart.", list(substances))
            }
            Self::WithAndWithoutUbiquitous { with, without } => format!(
                "The answer depends on what is on nearly every sample: with it {} ({}), without it {} ({}).",
                with.0,
                probability(with.1),
                without.0,
                probability(without.1)
            ),
            Self::PriorSensitivity { halved, doubled } => format!(
                "The answer depends on how common the substances are held to be: {halved} if half as \
                 common, {doubled} if twice as common."
            ),
            Self::CommonShift {
                shift_nm: (mean, sd),
                stated_nm,
            } => format!(
                "All readings lie {} nm {} the reference lines; the set-up allows {stated_nm} nm.",
                wavelength_with_uncertainty(mean.abs(), *sd),
                if *mean > 0.0 { "above" } else { "below" },
            ),
            Self::UncertaintiesTooSmall { rms_sigma } => format!(
                "The readings miss the reference lines by {rms_sigma:.1} standard uncertainties on \
                 average: the stated uncertainties are too small, or the calibration is bent."
            ),
            Self::UncertaintiesTooLarge { rms_sigma } => format!(
                "The readings meet the reference lines within {rms_sigma:.2} standard uncertainties on \
                 average: the stated uncertainties are larger than need be."
            ),
            Self::PossibleOrderMixUp {
                reading,
                substance,
                line_nm,
                doubled,
                ..
            } => format!(
                "The unexplained reading {reading} nm is {} the {substance} line at {line_nm:.1} nm: it \
                 may belong to another order.",
                if *doubled { "half of" } else { "twice" },
            ),
            Self::UnexplainedReading { reading, .. } => {
                format!("The reading {reading} nm is not explained by anything weighed.")
            }
            Self::CannotBeTested { substances } => format!(
                "Cannot be tested here, not excluded (chance of showing at all in brackets): {}.",
                untestable(substances)
            ),
            Self::RestsOnMemory { rows } => {
                let rows: Vec<String> = rows.iter().map(memory_row).collect();
                format!(
                    "The answer uses library values that were recalled, not looked up: {}.",
                    rows.join("; ")
                )
            }
            Self::LibraryNotDeepEnough { emitters } => format!(
                "The set-up reaches fainter features than the library lists for {}; a faint unexplained \
                 reading may still be theirs.",
                list(emitters)
            ),
            _ => self.message_on_table(),
        }
    }

    /// Messages about the readings as typed.
    fn message_on_table(&self) -> String {
        match self {
            Self::UncertaintyAssumed {
                rows: which,
                uncertainty_nm,
            } => format!(
                "{} without an uncertainty: {uncertainty_nm} nm was taken from the set-up.",
                sentence_case(&rows(which))
            ),
            Self::ThresholdFromWeakest => {
                "The weakest strength was taken as the faintest that would have \
                                           been recorded."
                    .to_owned()
            }
            Self::ThresholdLowered { row } => {
                format!(
                    "Row {row} is weaker than the stated faintest strength, which was lowered to it."
                )
            }
            Self::ReadingsSetAside {
                reason,
                rows: which,
            } => {
                let why = match reason {
                    AsideReason::OutOfRange => "outside the range of the set-up",
                    AsideReason::BlindStretch => "in a blind stretch",
                    AsideReason::ContinuumMaximum => "wider than a line: a hump of the continuum",
                };
                format!("Set aside, {why}: {}.", rows(which))
            }
            Self::RepeatsPooled { rows: which } => {
                format!("Pooled as repeats of one feature: {}.", rows(which))
            }
            Self::UnknownColumn { column } => {
                format!("The column {column:?} is not known and was not used.")
            }
            Self::UnusedColumn { column } => {
                format!("The column {column:?} has no use in this command.")
            }
            _ => String::new(),
        }
    }

    /// What to do next.
    pub fn next_step(&self) -> String {
        match self {
            Self::UnlistedSubstanceLikely { restricted: true, .. } => {
                "Run again without --candidates, and check the calibration on a known source.".to_owned()
            }
            Self::UnlistedSubstanceLikely { restricted: false, .. } => {
                "Check the calibration on a known source and stray light with the sample away; then look \
                 for the readings in a larger table of lines."
                    .to_owned()
            }
            Self::ListCutShort { stated: true, .. } => {
                "Read on to the faintest line that can be seen, and leave out --listed-at-most.".to_owned()
            }
            Self::ListCutShort { stated: false, .. } => {
                "If the list is complete, say so with --faintest and the smallest strength that would \
                 have been recorded; otherwise read on."
                    .to_owned()
            }
            Self::UntestedCompositions { .. } => "Restrict the candidates with --candidates.".to_owned(),
            Self::RestsOnOneLine { look_at_nm, substance, .. } => match look_at_nm {
                Some(nm) => format!("Look for {substance} at {nm:.1} nm, with the slit wider or longer."),
                None => "Read the line again, and compare it with a known sample side by side.".to_owned(),
            },
            Self::CannotSeparate { look_at_nm: Some(nm), .. } => {
                format!("A reading at {nm:.1} nm would tell most.")
            }
            Self::CannotSeparate { look_at_nm: None, .. } => {
                "Read with a finer instrument or another source, or use a chemical test.".to_owned()
            }
            Self::WithAndWithoutUbiquitous { .. } => {
                "Compare with a blank: the same source without the sample.".to_owned()
            }
            Self::PriorSensitivity { .. } => {
                "Read more lines, or say with --candidates what it can be.".to_owned()
            }
            Self::CommonShift { shift_nm: (mean, _), .. } => format!(
                "Read a known source, subtract the shift from all readings, or allow for it with \
                 --offset {:.1}.",
                mean.abs()
            ),
            Self::UncertaintiesTooSmall { .. } => {
                "Calibrate on a known source with lines at both ends of the range, or state larger \
                 uncertainties."
                    .to_owned()
            }
            Self::UncertaintiesTooLarge { .. } => {
                "State smaller uncertainties if repeats bear them out: the answer becomes sharper.".to_owned()
            }
            Self::PossibleOrderMixUp { rows: which, .. } => format!(
                "Read {} again with a filter that passes one order, or write its order into the column \
                 order.",
                rows(which)
            ),
            Self::UnexplainedReading { rows: which, .. } => format!(
                "Read {} again; look whether it is there with the sample away.",
                rows(which)
            ),
            Self::CannotBeTested { .. } => {
                "Use another source or another test for these; say nothing of their absence.".to_owned()
            }
            Self::RestsOnMemory { .. } => {
                "Compare with a known sample before relying on it, or look these rows up.".to_owned()
            }
            Self::LibraryNotDeepEnough { emitters } => format!(
                "Compare the unexplained readings with a known source of {}.",
                alternatives(emitters)
            ),
            _ => self.next_step_on_table(),
        }
    }

    /// Next steps about the readings as typed.
    fn next_step_on_table(&self) -> String {
        let step = match self {
            Self::UncertaintyAssumed { .. } => {
                "Add a column uncertainty_nm with the standard uncertainty of each reading."
            }
            Self::ThresholdFromWeakest => {
                "Give --faintest, the smallest strength that would have been recorded."
            }
            Self::ThresholdLowered { .. } => "Give a --faintest that no reading falls below.",
            Self::ReadingsSetAside {
                reason: AsideReason::OutOfRange,
                ..
            } => "If the instrument reaches there, widen --range.",
            Self::ReadingsSetAside {
                reason: AsideReason::BlindStretch,
                ..
            } => "If something can be seen there, correct --blind or --filter.",
            Self::ReadingsSetAside {
                reason: AsideReason::ContinuumMaximum,
                ..
            } => "Nothing, if it is a hump; if it is a band, give the position of its edge.",
            Self::RepeatsPooled { .. } => {
                "Nothing, if they are repeats; otherwise state smaller uncertainties or --division."
            }
            Self::UnknownColumn { .. } => {
                "Rename it if it was meant to be used; see the list of columns in the help."
            }
            Self::UnusedColumn { .. } => "Nothing.",
            _ => "",
        };
        step.to_owned()
    }
}

fn untestable(substances: &[(String, f64)]) -> String {
    let named = substances
        .iter()
        .map(|(name, chance)| format!("{name} ({})", probability(*chance)));
    list(&named.collect::<Vec<_>>())
}

fn memory_row(row: &MemoryRow) -> String {
    format!(
        "{} row {} ({}, {}, source {})",
        row.table, row.row, row.emitter, row.what, row.source
    )
}
