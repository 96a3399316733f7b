use super::*;

#[test]
fn words_sit_on_the_dynamic_range() {
    use StrengthWord::{Dominant, Faint, Medium, Strong};
    let words = [Faint, Medium, Strong, Dominant].into_iter().enumerate();
    let readings = words
        .map(|(i, w)| word(w, nm(i + 2, 400.0 + 10.0 * i as f64, 0.2)))
        .collect();
    let sample = reduced(readings, ccd());
    assert_eq!(sample.dynamic_range_dex, 3.0);
    for (found, share) in heights(&sample).into_iter().zip([0.15, 0.4, 0.7, 0.95]) {
        assert!(close(found, 3.0 * share));
    }
    assert!(
        sample
            .readings
            .iter()
            .all(|r| r.strength.unwrap().uncertainty_dex == 0.35)
    );
    assert!(sample.remarks.is_empty());
}

#[test]
fn words_and_numbers_together_are_refused() {
    let readings = vec![
        word(StrengthWord::Faint, nm(7, 400.0, 0.2)),
        strong(2.0, nm(3, 500.0, 0.2)),
        word(StrengthWord::Strong, nm(5, 600.0, 0.2)),
    ];
    let refused = reduce(&sample(readings), &setup(ccd()));
    assert_eq!(refused, Err(ReductionError::MixedStrengths { row: 5 }));
}

#[test]
fn numbers_stand_above_the_faintest() {
    let said = SetupOverrides {
        faintest: Some(1.0),
        ..ccd()
    };
    let readings = vec![
        strong(10.0, nm(2, 400.0, 0.2)),
        strong(5000.0, nm(3, 500.0, 0.2)),
        nm(4, 600.0, 0.2),
    ];
    let sample = reduced(readings, said);
    assert!(close(heights(&sample)[0], 1.0));
    // D = max(3, log10 5000 + .3) = 3.99897.
    assert!(close(sample.dynamic_range_dex, 5000f64.log10() + 0.3));
    assert_eq!(sample.readings[2].strength, None);
    assert!(sample.remarks.is_empty());
}

#[test]
fn the_weakest_is_the_threshold_if_nothing_better_is_known() {
    let readings = || {
        vec![
            strong(20.0, nm(2, 400.0, 0.2)),
            strong(2.0, nm(3, 500.0, 0.2)),
        ]
    };
    let unknown = reduced(readings(), ccd());
    assert!(close(heights(&unknown)[0], 1.0) && close(heights(&unknown)[1], 0.0));
    assert_eq!(unknown.remarks, [ReductionRemark::ThresholdFromWeakest]);
    let lowered = reduced(
        readings(),
        SetupOverrides {
            faintest: Some(3.0),
            ..ccd()
        },
    );
    assert_eq!(heights(&lowered), heights(&unknown));
    assert_eq!(
        lowered.remarks,
        [ReductionRemark::ThresholdLowered { row: 3 }]
    );
}

#[test]
fn the_strength_uncertainty_comes_from_the_row_or_the_set_up() {
    let own = Reading {
        strength_uncertainty_dex: Some(0.1),
        ..strong(1.0, nm(2, 400.0, 0.2))
    };
    let sample = reduced(vec![own, strong(1.0, nm(3, 500.0, 0.2))], ccd());
    let u: Vec<_> = sample
        .readings
        .iter()
        .map(|r| r.strength.unwrap().uncertainty_dex)
        .collect();
    assert_eq!(u, [0.1, 0.2]);
}

#[test]
fn round_counts_of_numeric_strengths_are_cut() {
    for count in 1..=30 {
        let cut = reduced(ladder(count), ccd()).cut_by_count;
        assert_eq!(
            cut,
            [10, 12, 15, 20, 25].contains(&count),
            "{count} readings"
        );
    }
    let inferred = reduced(ladder(10), ccd());
    assert_eq!(
        inferred.remarks,
        [ReductionRemark::CutByCount {
            count: 10,
            stated: false
        }]
    );
    let mut one_without = ladder(10);
    one_without[4].strength = None;
    assert!(!reduced(one_without, ccd()).cut_by_count);
    assert!(
        !reduced(
            ladder(10),
            SetupOverrides {
                faintest: Some(0.5),
                ..ccd()
            }
        )
        .cut_by_count
    );
    assert!(
        !reduced(
            ladder(10),
            SetupOverrides {
                listed_at_most: Some(30),
                ..ccd()
            }
        )
        .cut_by_count
    );
}

#[test]
fn a_stated_cut_moves_the_threshold_or_halves_the_range() {
    let said = || SetupOverrides {
        listed_at_most: Some(4),
        faintest: Some(0.01),
        ..ccd()
    };
    let cut = reduced(ladder(4), said());
    assert_eq!(
        cut.remarks,
        [ReductionRemark::CutByCount {
            count: 4,
            stated: true
        }]
    );
    assert_eq!(heights(&cut)[0], 0.0);
    let plain: Vec<Reading> = ladder(4)
        .into_iter()
        .map(|r| Reading {
            strength: None,
            ..r
        })
        .collect();
    let halved = reduced(plain, said());
    assert!(halved.cut_by_count);
    assert_eq!(halved.dynamic_range_dex, 1.5);
    let short = reduced(ladder(3), said());
    assert!(!short.cut_by_count && close(heights(&short)[0], 2.0));
}

#[test]
fn the_count_is_as_typed_but_the_threshold_only_from_rows_that_count() {
    let mut readings = ladder(9);
    readings.push(strong(1e-6, nm(40, 900.0, 0.2)));
    let sample = reduced(readings, ccd());
    assert!(sample.cut_by_count);
    assert_eq!(heights(&sample)[0], 0.0);
    assert_eq!(sample.dynamic_range_dex, 3.0);
}
