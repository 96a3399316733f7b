use super::*;

#[test]
fn the_sodium_doublet_is_not_pooled_but_splits() {
    // D lines 588.995 and 589.592 nm, NIST ASD, from memory: 0.597 nm apart, 2·hypot(.1, .1) = .283.
    let sample = reduced(vec![nm(2, 589.592, 0.1), nm(3, 588.995, 0.1)], ccd());
    assert_eq!(sample.readings.len(), 2);
    assert_eq!(sample.splits, [(588.995, 589.592)]);
    // With a coarser reading it is still not pooled: the rule stops at w/2 = .4.
    assert_eq!(
        reduced(vec![nm(2, 589.592, 0.5), nm(3, 588.995, 0.5)], ccd())
            .readings
            .len(),
        2
    );
    // Neighbours w or further apart split nothing.
    assert!(
        reduced(vec![nm(2, 589.8, 0.1), nm(3, 588.995, 0.1)], ccd())
            .splits
            .is_empty()
    );
}

#[test]
fn duplicates_pool_and_average() {
    let sample = reduced(vec![nm(2, 500.0, 0.2), nm(3, 500.0, 0.2)], ccd());
    assert_eq!(sample.readings.len(), 1);
    let reading = &sample.readings[0];
    assert_eq!(reading.rows, [2, 3]);
    assert_eq!(reading.wavelength_nm, 500.0);
    assert!(close(reading.uncertainty_nm, 0.2 / 2f64.sqrt()));
    assert_eq!(
        sample.remarks,
        [ReductionRemark::Pooled { rows: vec![2, 3] }]
    );
}

#[test]
fn the_mean_is_weighted_and_the_scatter_counts() {
    // u .1 and .2: weights 4 : 1, mean 500.04; (Σu⁻²)^−½ = 1/√125.
    let unequal = reduced(vec![nm(2, 500.0, 0.1), nm(3, 500.2, 0.2)], ccd());
    assert!(close(unequal.readings[0].wavelength_nm, 500.04));
    assert!(close(
        unequal.readings[0].uncertainty_nm,
        125f64.sqrt().recip()
    ));
    // Marked repeats .6 apart with u = .1: SD = .6/√2, SD/√2 = .3 beats .1/√2.
    let far = reduced(
        vec![
            marked("a", nm(2, 500.0, 0.1)),
            marked("a", nm(3, 500.6, 0.1)),
        ],
        ccd(),
    );
    assert!(close(far.readings[0].wavelength_nm, 500.3));
    assert!(close(far.readings[0].uncertainty_nm, 0.3));
}

#[test]
fn two_observers_pool_where_one_would_not() {
    // .7 apart, 2·hypot(.3, .3) = .849, w/2 = .4.
    let pair = || (nm(2, 500.0, 0.3), nm(3, 500.7, 0.3));
    let counted = |a: Reading, b: Reading| reduced(vec![a, b], ccd()).readings.len();
    let (a, b) = pair();
    assert_eq!(counted(by("Ada", a), by("Ben", b)), 1);
    let (a, b) = pair();
    assert_eq!(counted(by("Ada", a), by("Ada", b)), 2);
    let (a, b) = pair();
    assert_eq!(counted(by("Ada", a), b), 2);
}

#[test]
fn the_rules_end_where_they_say() {
    // 2·hypot(.3, .3) = .8485 for two observers, w/2 = .4 and 2·hypot(.1, .1) = .2828 for one.
    for (u, apart, same_observer, readings) in [
        (0.3, 0.848, false, 1),
        (0.3, 0.849, false, 2),
        (0.3, 0.399, true, 1),
        (0.3, 0.401, true, 2),
        (0.1, 0.282, true, 1),
        (0.1, 0.283, true, 2),
    ] {
        let other = if same_observer { "Ada" } else { "Ben" };
        let rows = vec![
            by("Ada", nm(2, 500.0, u)),
            by(other, nm(3, 500.0 + apart, u)),
        ];
        assert_eq!(
            reduced(rows, ccd()).readings.len(),
            readings,
            "u {u}, {apart} nm apart"
        );
    }
}

#[test]
fn two_observers_of_a_doublet_give_two_readings() {
    let readings = vec![
        by("Ada", nm(2, 589.00, 0.15)),
        by("Ada", nm(3, 589.60, 0.15)),
        by("Ben", nm(4, 589.05, 0.15)),
        by("Ben", nm(5, 589.65, 0.15)),
    ];
    let sample = reduced(readings, ccd());
    let rows: Vec<_> = sample.readings.iter().map(|r| r.rows.clone()).collect();
    assert_eq!(rows, [vec![2, 4], vec![3, 5]]);
    assert_eq!(sample.splits.len(), 1);
}

#[test]
fn a_division_pools_what_it_cannot_tell_apart() {
    let pair = || vec![nm(2, 500.0, 0.01), nm(3, 500.9, 0.01)];
    assert_eq!(reduced(pair(), ccd()).readings.len(), 2);
    let said = SetupOverrides {
        division_nm: Some(1.0),
        ..ccd()
    };
    assert_eq!(reduced(pair(), said).readings.len(), 1);
}

#[test]
fn linkage_is_complete() {
    // Steps of .25 < .283 pool, but the ends are .5 apart: the third starts a new reading.
    let readings = vec![nm(2, 500.0, 0.1), nm(3, 500.25, 0.1), nm(4, 500.5, 0.1)];
    let rows: Vec<_> = reduced(readings, ccd())
        .readings
        .into_iter()
        .map(|r| r.rows)
        .collect();
    assert_eq!(rows, [vec![2, 3], vec![4]]);
}

#[test]
fn rows_at_one_position_are_taken_in_an_order_of_their_own() {
    // The coarse row may pool with the first (.25 < .4), the fine one may not (.25 > .2236): were the
    // order that of the table, the coarse row would go to one or the other.
    for (fine, coarse) in [(3, 4), (4, 3)] {
        let readings = vec![
            nm(2, 499.75, 0.1),
            nm(fine, 500.0, 0.05),
            nm(coarse, 500.0, 0.2),
        ];
        let rows: Vec<_> = reduced(readings, ccd())
            .readings
            .into_iter()
            .map(|r| r.rows)
            .collect();
        assert_eq!(rows, [vec![2], vec![3, 4]]);
    }
    // Likewise Ben's row may pool with Ada's first (.45 < .566) and Ada's second may not (.45 > .4).
    for (ada, ben) in [(3, 4), (4, 3)] {
        let readings = vec![
            by("Ada", nm(2, 499.55, 0.2)),
            by("Ada", nm(ada, 500.0, 0.2)),
            by("Ben", nm(ben, 500.0, 0.2)),
        ];
        let rows: Vec<_> = reduced(readings, ccd())
            .readings
            .into_iter()
            .map(|r| r.rows)
            .collect();
        assert_eq!(rows, [vec![2], vec![3, 4]]);
    }
}

#[test]
fn different_marks_keep_close_rows_apart() {
    let readings = vec![
        marked("a", nm(2, 500.0, 0.1)),
        marked("b", nm(3, 500.0, 0.1)),
        nm(4, 500.1, 0.1),
    ];
    let rows: Vec<_> = reduced(readings, ccd())
        .readings
        .into_iter()
        .map(|r| r.rows)
        .collect();
    assert_eq!(rows, [vec![2], vec![3, 4]]);
}

#[test]
fn what_pooled_rows_say_is_joined() {
    let first = Reading {
        form: Some(ObservedForm::Line),
        width_nm: Some(1.0),
        note: Some("one".to_owned()),
        order: 2,
        ..strong(100.0, nm(2, 500.0, 0.2))
    };
    let second = Reading {
        saturated: true,
        ..strong(1.0, nm(3, 500.0, 0.2))
    };
    let third = Reading {
        form: Some(ObservedForm::Band),
        width_nm: Some(3.0),
        ..nm(4, 500.0, 0.2)
    };
    let said = SetupOverrides {
        faintest: Some(1.0),
        ..ccd()
    };
    let two = reduced(vec![second.clone(), first.clone()], said.clone());
    let reading = &two.readings[0];
    assert_eq!(reading.form, Some(ObservedForm::Line));
    assert!(reading.saturated);
    assert_eq!((reading.order, reading.width_nm), (1, Some(1.0)));
    assert_eq!(reading.notes, ["one"]);
    // y = 2 and 0: mean 1, SD = √2, SD/√2 = 1.
    let strength = reading.strength.unwrap();
    assert!(close(strength.above_faintest_dex, 1.0) && close(strength.uncertainty_dex, 1.0));
    let three = reduced(vec![first, second, third], said);
    assert_eq!(
        (three.readings[0].form, three.readings[0].width_nm),
        (None, Some(2.0))
    );
}
