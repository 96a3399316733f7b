//! From verdicts to views: names, numbers with a fixed number of digits, and null for the unknown.

use super::view::{
    CauseView, CompositionView, IdentifyView, InputView, LaneView, LibraryView, MarkView,
    MissingLineView, NextReadingView, PosteriorView, ReadingView, RefusalView, SampleView,
    SetAsideView, SubstanceView, WarningView,
};
use crate::library::Library;
use crate::reading::{Refusal, Table, TableRemark};
use crate::reduction::{AsideReason, SetAside};
use crate::setup::Setup;
use crate::verdict::{
    CauseFinding, Lane, Mark, MissingLine, NextReading, RankedComposition, ReadingFinding,
    SubstanceFinding, SubstanceName, Verdict, Warning,
};

/// Everything a report of `identify` is made of.
#[derive(Debug, Clone, Copy)]
pub struct IdentifyRun<'a> {
    /// The library used.
    pub library: &'a Library,
    /// The set-up used.
    pub setup: &'a Setup,
    /// Tables that could be read.
    pub tables: &'a [Table],
    /// Verdicts, each with the name of its input.
    pub verdicts: &'a [(String, Verdict)],
    /// Everything refused.
    pub refused: &'a [Refusal],
}

/// The view of a run.
pub fn identify_view(run: &IdentifyRun) -> IdentifyView {
    IdentifyView {
        schema: "linstock.identify/1",
        version: env!("CARGO_PKG_VERSION").to_owned(),
        inputs: run.tables.iter().map(input).collect(),
        library: LibraryView {
            sha256: run.library.sha256.clone(),
            substances: run.library.substances.len(),
        },
        setup: run.setup.view(),
        setup_described: run.setup.describe(),
        samples: run
            .verdicts
            .iter()
            .map(|(input, verdict)| sample(input, verdict))
            .collect(),
        refused: run.refused.iter().map(refusal).collect(),
    }
}

fn input(table: &Table) -> InputView {
    let remarks = table.remarks.iter().map(|remark| match remark {
        TableRemark::UnknownColumn { column } => Warning::UnknownColumn {
            column: column.clone(),
        },
        TableRemark::UnusedColumn { column } => Warning::UnusedColumn {
            column: column.clone(),
        },
    });
    InputView {
        path: table.input.clone(),
        sha256: table.sha256.clone(),
        encoding: table.dialect.encoding.to_owned(),
        separator: table.dialect.separator,
        decimal_sign: table.dialect.decimal_sign,
        comments: table.comments.clone(),
        warnings: remarks.map(|remark| warning(&remark)).collect(),
    }
}

fn sample(input: &str, verdict: &Verdict) -> SampleView {
    SampleView {
        sample: verdict.sample.clone(),
        input: input.to_owned(),
        label: verdict.label.clone(),
        decision: verdict.decision.word(),
        sentence: verdict.sentence.clone(),
        leading_probability: probability(verdict.leading_probability),
        composed_name: verdict.composed.clone(),
        compositions: ranked(&verdict.compositions),
        compositions_without_ubiquitous: ranked(&verdict.without_ubiquitous),
        either_or: verdict
            .either_or
            .iter()
            .map(|group| ids(&group.substances))
            .collect(),
        untested_mass_bound: probability(verdict.untested_mass_bound),
        substances: verdict.substances.iter().map(substance).collect(),
        readings: verdict.readings.iter().map(reading).collect(),
        missing_lines: verdict.missing.iter().map(missing).collect(),
        picture: verdict.lanes.iter().map(lane).collect(),
        set_aside: verdict.set_aside.iter().map(set_aside).collect(),
        offset_nm: PosteriorView {
            mean: decimals(verdict.offset_nm.mean, 4),
            standard_deviation: decimals(verdict.offset_nm.sd, 4),
        },
        residual_rms_sigma: verdict.residual_rms_sigma.and_then(|rms| decimals(rms, 3)),
        warnings: verdict.warnings.iter().map(warning).collect(),
        next_readings: verdict.next_readings.iter().map(next_reading).collect(),
        cautions: verdict.cautions.clone(),
    }
}

fn ids(substances: &[SubstanceName]) -> Vec<String> {
    substances
        .iter()
        .map(|substance| substance.id.clone())
        .collect()
}

fn ranked(compositions: &[RankedComposition]) -> Vec<CompositionView> {
    let view = |(index, composition): (usize, &RankedComposition)| CompositionView {
        rank: index + 1,
        substances: ids(&composition.substances),
        described: composition.described.clone(),
        posterior: probability(composition.posterior),
        log_evidence: composition
            .log_evidence
            .and_then(|value| decimals(value, 4)),
    };
    compositions.iter().enumerate().map(view).collect()
}

fn substance(finding: &SubstanceFinding) -> SubstanceView {
    SubstanceView {
        substance: finding.substance.id.clone(),
        name: finding.substance.name.clone(),
        symbol: finding.substance.symbol.clone(),
        presence_probability: probability(finding.presence),
        physical_presence_probability: probability(finding.physical_presence),
        testable: probability(finding.testable),
        rests_on_one_line: finding.rests_on_one_line,
    }
}

fn reading(finding: &ReadingFinding) -> ReadingView {
    ReadingView {
        row: finding.rows.first().copied(),
        rows: finding.rows.clone(),
        wavelength_nm: decimals(finding.wavelength_nm, 4),
        uncertainty_nm: decimals(finding.uncertainty_nm, 5),
        order: finding.order,
        standing: finding.standing.word(),
        cause: finding.cause.as_ref().map(cause),
        other_causes: finding.other_causes.iter().map(cause).collect(),
        notes: finding.notes.clone(),
    }
}

fn cause(finding: &CauseFinding) -> CauseView {
    CauseView {
        substance: finding.substance.id.clone(),
        name: finding.substance.name.clone(),
        emitter: finding.emitter.clone(),
        feature_nm: decimals(finding.feature_nm, 4),
        feature_uncertainty_nm: decimals(finding.feature_uncertainty_nm, 5),
        order: finding.order,
        probability: probability(finding.probability),
        residual_nm: decimals(finding.residual_nm, 4),
        residual_sigma: decimals(finding.residual_sigma, 3),
    }
}

fn missing(line: &MissingLine) -> MissingLineView {
    MissingLineView {
        substance: line.substance.id.clone(),
        name: line.substance.name.clone(),
        emitter: line.emitter.clone(),
        wavelength_nm: decimals(line.wavelength_nm, 4),
        uncertainty_nm: decimals(line.uncertainty_nm, 5),
        detection_probability: probability(line.detection_probability),
    }
}

fn lane(lane: &Lane) -> LaneView {
    let marks = lane.marks.iter().filter_map(|mark| {
        Some(MarkView {
            wavelength_nm: decimals(mark.wavelength_nm, 4)?,
            mark: match mark.mark {
                Mark::Matched => "matched",
                Mark::Missing => "missing",
                Mark::Listed => "listed",
            },
        })
    });
    LaneView {
        substance: lane.substance.id.clone(),
        name: lane.substance.name.clone(),
        marks: marks.collect(),
    }
}

fn set_aside(aside: &SetAside) -> SetAsideView {
    SetAsideView {
        row: aside.row,
        wavelength_nm: decimals(aside.wavelength_nm, 4),
        reason: match aside.reason {
            AsideReason::OutOfRange => "out-of-range",
            AsideReason::BlindStretch => "blind-stretch",
            AsideReason::ContinuumMaximum => "continuum-maximum",
        },
    }
}

fn warning(warning: &Warning) -> WarningView {
    WarningView {
        code: warning.code(),
        message: warning.message(),
        next_step: warning.next_step(),
    }
}

fn next_reading(next: &NextReading) -> NextReadingView {
    NextReadingView {
        wavelength_nm: decimals(next.wavelength_nm, 4),
        information_bits: decimals(next.information_bits, 3),
        separates: next.separates.clone(),
    }
}

fn refusal(refusal: &Refusal) -> RefusalView {
    RefusalView {
        input: refusal.input.clone(),
        sample: refusal.sample.clone(),
        row: refusal.row,
        column: refusal.column.clone(),
        text: refusal.text.clone(),
        message: refusal.message.clone(),
    }
}

/// A value with a fixed number of decimals; absent if it is not a number. Digits beyond those
/// carry nothing and could differ between machines.
fn decimals(value: f64, decimals: i32) -> Option<f64> {
    let scale = 10f64.powi(decimals);
    let rounded = (value * scale).round() / scale;
    // Zero has no sign for a reader.
    rounded.is_finite().then_some(rounded + 0.0)
}

/// A probability with four significant digits of itself or of its complement, whichever is the
/// smaller, and no more than twelve decimals: near certainty the complement is what counts.
fn probability(p: f64) -> Option<f64> {
    let smaller = p.min(1.0 - p);
    let digits = if smaller > 0.0 {
        3.0 - smaller.log10().floor()
    } else {
        12.0
    };
    decimals(p, digits.clamp(4.0, 12.0) as i32)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn digits_are_fixed_and_the_unknown_is_absent() {
        assert_eq!(decimals(587.562_14, 4), Some(587.5621));
        assert_eq!(decimals(f64::NAN, 4), None);
        assert_eq!(decimals(f64::NEG_INFINITY, 4), None);
        assert!(decimals(-0.000_01, 2).is_some_and(|zero| zero.is_sign_positive()));
    }

    #[test]
    fn probabilities_keep_their_doubt() {
        assert_eq!(probability(0.123_456), Some(0.1235));
        assert_eq!(probability(0.999_999_923_44), Some(0.999_999_923_44));
        assert_eq!(probability(0.000_012_345), Some(0.000_012_35));
        assert_eq!(probability(1.0), Some(1.0));
        assert_eq!(probability(0.0), Some(0.0));
        assert_eq!(probability(f64::NAN), None);
    }
}
