use super::*;

#[test]
fn units_and_media_are_converted_to_air() {
    // Sodium D2: 588.995 nm in air, 589.158 nm in vacuum, 16973.37 cm⁻¹; NIST ASD, from memory.
    let positions = [
        (Position::Nanometre(588.995), Medium::Air, 0.1),
        (Position::Angstrom(5889.95), Medium::Air, 1.0),
        (Position::Nanometre(589.158), Medium::Vacuum, 0.1),
        (Position::Angstrom(5891.58), Medium::Vacuum, 1.0),
        // u_ν = 10⁷ u_λ/λ² = 10⁷ · 0.1/589.158² = 2.881 cm⁻¹.
        (Position::PerCentimetre(16973.37), Medium::Air, 2.881),
        (Position::PerCentimetre(16973.37), Medium::Vacuum, 2.881),
    ];
    for (position, medium, u) in positions {
        let said = SetupOverrides {
            medium: Some(medium),
            ..ccd()
        };
        let reading = &reduced(vec![at(2, position, Some(u))], said).readings[0];
        assert!(
            (reading.wavelength_nm - 588.995).abs() < 0.001,
            "{position:?} {medium:?}"
        );
        assert!(
            (reading.uncertainty_nm - 0.1).abs() < 1e-4,
            "{position:?} {medium:?}"
        );
    }
}

#[test]
fn a_missing_uncertainty_is_the_set_ups_in_nm_and_said() {
    let readings = vec![
        at(4, Position::PerCentimetre(20000.0), None),
        nm(3, 600.0, 0.1),
        at(2, Position::Angstrom(6500.0), None),
    ];
    let sample = reduced(readings, ccd());
    let u = sample
        .readings
        .iter()
        .map(|r| r.uncertainty_nm)
        .collect::<Vec<_>>();
    assert_eq!(u, [0.3, 0.1, 0.3]);
    let remark = ReductionRemark::UncertaintyAssumed {
        rows: vec![2, 4],
        uncertainty_nm: 0.3,
    };
    assert_eq!(sample.remarks, [remark]);
}

#[test]
fn a_division_adds_in_quadrature() {
    let said = SetupOverrides {
        division_nm: Some(1.2),
        ..ccd()
    };
    let sample = reduced(vec![nm(2, 500.0, 0.3)], said);
    // √(.09 + 1.44/12) = √.21
    assert!(close(sample.readings[0].uncertainty_nm, 0.21f64.sqrt()));
}

#[test]
fn what_cannot_count_is_set_aside() {
    let said = SetupOverrides {
        blind_nm: Some(vec![[560.0, 610.0]]),
        ..ccd()
    };
    let wide = Reading {
        width_nm: Some(15.1),
        ..nm(5, 500.0, 0.2)
    };
    let narrow = Reading {
        width_nm: Some(15.0),
        ..nm(6, 520.0, 0.2)
    };
    let readings = vec![
        nm(2, 800.1, 0.2),
        nm(3, 800.0, 0.2),
        nm(4, 560.0, 0.2),
        wide,
        narrow,
    ];
    let sample = reduced(readings, said);
    let aside: Vec<_> = sample
        .set_aside
        .iter()
        .map(|aside| (aside.row, aside.reason))
        .collect();
    let expected = [
        (2, AsideReason::OutOfRange),
        (4, AsideReason::BlindStretch),
        (5, AsideReason::ContinuumMaximum),
    ];
    assert_eq!(aside, expected);
    assert_eq!(
        sample
            .readings
            .iter()
            .map(|r| r.rows[0])
            .collect::<Vec<_>>(),
        [6, 3]
    );
}

#[test]
fn what_the_eye_cannot_see_is_out_of_range() {
    let said = SetupOverrides {
        instrument: Some(InstrumentKind::Goniometer),
        range_nm: Some([350.0, 900.0]),
        ..SetupOverrides::default()
    };
    let sample = reduced(vec![nm(2, 365.0, 0.2), nm(3, 404.7, 0.2)], said);
    assert_eq!(sample.set_aside[0].reason, AsideReason::OutOfRange);
    assert_eq!(sample.readings.len(), 1);
}

#[test]
fn labels_must_agree() {
    let labelled = |row, label: Option<&str>| Reading {
        label: label.map(str::to_owned),
        ..nm(row, 400.0 + 10.0 * row as f64, 0.2)
    };
    let label = |labels: &[Option<&str>]| {
        reduced(
            labels
                .iter()
                .enumerate()
                .map(|(i, l)| labelled(i, *l))
                .collect(),
            ccd(),
        )
        .label
    };
    assert_eq!(
        label(&[Some("He"), None, Some("He")]).as_deref(),
        Some("He")
    );
    assert_eq!(label(&[Some("He"), Some("Ne")]), None);
    assert_eq!(label(&[None]), None);
}

#[test]
fn impossible_numbers_are_refused_with_their_row() {
    let bad = [
        nm(9, f64::NAN, 0.1),
        nm(9, 500.0, 0.0),
        nm(9, 500.0, f64::INFINITY),
        at(9, Position::PerCentimetre(0.0), None),
        at(9, Position::PerCentimetre(20000.0), Some(1e308)),
        strong(0.0, nm(9, 500.0, 0.1)),
        Reading {
            strength_uncertainty_dex: Some(-1.0),
            ..nm(9, 500.0, 0.1)
        },
    ];
    for reading in bad {
        let refused = reduce(
            &sample(vec![nm(2, 450.0, 0.1), reading.clone()]),
            &setup(ccd()),
        );
        let located = matches!(refused, Err(ReductionError::Unusable { row: 9, .. }));
        assert!(located, "{reading:?} gave {refused:?}");
    }
}

#[test]
fn an_empty_sample_reduces_to_nothing() {
    let sample = reduced(Vec::new(), ccd());
    assert!(sample.readings.is_empty() && sample.remarks.is_empty() && !sample.cut_by_count);
}
