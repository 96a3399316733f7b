use super::*;
use proptest::prelude::*;

fn parse(text: &str) -> Result<SetupFile, SetupError> {
    parse_setup(text, "s.toml", Path::new(""))
}

fn from_toml(text: &str) -> Setup {
    resolve(Some(parse(text).unwrap()), SetupOverrides::default()).unwrap()
}

fn of_kind(kind: InstrumentKind) -> Setup {
    let flags = SetupOverrides {
        instrument: Some(kind),
        ..SetupOverrides::default()
    };
    resolve(None, flags).unwrap()
}

fn message(text: &str) -> String {
    match parse(text) {
        Ok(_) => panic!("accepted {text:?}"),
        Err(error) => error.to_string(),
    }
}

#[test]
fn every_preset_resolves_and_lies_in_the_promised_span() {
    // The spans are those promised in the design of the set-up file (nm): common practice, no source.
    let promised = |kind| match kind {
        InstrumentKind::ScaleSpectroscope => 3.0..=5.0,
        InstrumentKind::Goniometer => 0.3..=1.0,
        InstrumentKind::Prism | InstrumentKind::Camera => 1.0..=3.0,
        InstrumentKind::Ccd => 0.1..=0.5,
    };
    for kind in InstrumentKind::ALL {
        let setup = of_kind(kind);
        assert!(promised(kind).contains(&setup.uncertainty_nm()), "{kind:?}");
        assert_eq!(setup.response_name(), presets::preset(kind).response);
        assert_eq!(setup.common_shift_nm(), 1.5 * setup.offset_nm());
        assert_eq!(setup.candidates(), &Candidates::Everything);
        assert!(setup.blind_stretches().is_empty());
    }
}

#[test]
fn the_example_of_the_manual_reads_as_written() {
    let setup = from_toml(
        "[instrument]\nkind = \"scale-spectroscope\"\nrange_nm = [400.0, 780.0]\nresolution_nm = 4.0\n\
         uncertainty_nm = 3.0\noffset_nm = 1.5\ndynamic_range = 1.5\nmedium = \"air\"\n\
         [source]\nkind = \"flame\"\nalways = [\"sodium\"]\ncandidates = \"teaching-salts\"\n",
    );
    assert_eq!(setup.instrument(), InstrumentKind::ScaleSpectroscope);
    assert_eq!(setup.range_nm(), [400.0, 780.0]);
    assert_eq!(setup.dynamic_range_dex(), 1.5);
    assert_eq!(setup.always(), ["sodium"]);
    assert_eq!(
        setup.candidates(),
        &Candidates::List("teaching-salts".to_owned())
    );
}

#[test]
fn flags_win_over_the_file_and_the_file_over_the_preset() {
    let file =
        parse("[instrument]\nkind = \"ccd\"\noffset_nm = 1\nfilter = \"cobalt-glass\"\n").unwrap();
    let flags = SetupOverrides {
        instrument: Some(InstrumentKind::Prism),
        filter: Some("none".to_owned()),
        ..SetupOverrides::default()
    };
    let setup = resolve(Some(file), flags).unwrap();
    assert_eq!(setup.instrument(), InstrumentKind::Prism);
    assert_eq!(setup.offset_nm(), 1.0);
    assert_eq!(
        setup.uncertainty_nm(),
        presets::preset(InstrumentKind::Prism).uncertainty_nm
    );
    assert_eq!(setup.filter(), None);
}

#[test]
fn faults_are_located_and_suggest_a_remedy() {
    for (text, expected) in [
        (
            "[instrument]\n\nresolution = 2\n",
            "s.toml: line 3, key instrument.resolution: no such key in [instrument] (did you mean resolution_nm?)",
        ),
        (
            "[source]\nfilter = \"x\"\n",
            "s.toml: line 2, key source.filter: this key belongs in [instrument]",
        ),
        (
            "offset_nm = 1\n",
            "s.toml: line 1, key offset_nm: this key belongs in a table (write [instrument] above it)",
        ),
        (
            "[instrumnet]\n",
            "line 1, key instrumnet: no such table (did you mean [instrument]?)",
        ),
        (
            "source = 1\n",
            "expected a table (write [source] on a line of its own)",
        ),
        (
            "[instrument]\nkind = \"goniometre\"\n",
            "\"goniometre\" is not a kind of instrument (did you mean \"goniometer\"?)",
        ),
        (
            "[instrument]\nmedium = \"water\"\n",
            "\"water\" is not a medium (known: air, vacuum)",
        ),
        (
            "[instrument]\nfilter = \"cobalt glas\"\n",
            "\"cobalt glas\" is not a filter (did you mean \"cobalt-glass\"?)",
        ),
        (
            "[instrument]\noffset_nm = \"1.5\"\n",
            "line 2, key instrument.offset_nm: expected a number, found the text \"1.5\" (take the quotes away)",
        ),
        (
            "[instrument]\noffset_nm = nan\n",
            "expected a number, found the number nan",
        ),
        (
            "[instrument]\nrange_nm = [400]\n",
            "expected a list of 2 numbers, found a list of 1",
        ),
        (
            "[instrument]\nrange_nm = [700, 400]\n",
            "line 2, key instrument.range_nm: [700, 400] does not ascend",
        ),
        (
            "[instrument]\nrange_nm = [4000, 7000]\n",
            "4000 is not a wavelength between 100 and 2000 nm",
        ),
        ("[instrument]\nuncertainty_nm = 0\n", "0 is not above zero"),
        (
            "[instrument]\ndynamic_range = 100\n",
            "(a ratio of 100 is 2 decades)",
        ),
        (
            "[instrument]\ndim_nm = [[580, 600, -1]]\n",
            "-1 is not a number of decades lost",
        ),
        (
            "[instrument]\nlisted_at_most = 0\n",
            "0 is not a number of readings",
        ),
        (
            "[instrument]\nlisted_at_most = 2.5\n",
            "expected a whole number, found the number 2.5",
        ),
        (
            "[instrument]\norders_filtered = 1\n",
            "expected true or false, found the number 1",
        ),
        ("[source]\ncandidates = []\n", "no substance is named"),
        (
            "[source]\nalways = \"sodium\"\n",
            "expected a list in brackets, found the text \"sodium\"",
        ),
        ("[instrument\n", "line 1: not TOML"),
    ] {
        let found = message(text);
        assert!(found.contains(expected), "{text:?}\n gave {found:?}");
    }
}

#[test]
fn all_faults_come_in_one_run_in_order_of_lines() {
    let text = "[source]\nkind = 3\n[instrument]\nwidth = 1\noffset_nm = -1\nmedium = \"ai\"\n";
    let faults = parse(text).unwrap_err().faults;
    let lines: Vec<_> = faults.iter().map(|fault| fault.line).collect();
    assert_eq!(lines, [Some(2), Some(4), Some(5), Some(6)]);
}

#[test]
fn flags_and_combinations_are_checked_too() {
    let bad = SetupOverrides {
        resolution_nm: Some(f64::NAN),
        ..SetupOverrides::default()
    };
    let error = resolve(None, bad).unwrap_err();
    assert_eq!(
        error.faults[0].key.as_deref(),
        Some("instrument.resolution_nm")
    );
    for (text, expected) in [
        (
            "[instrument]\nrange_nm = [800, 900]\n",
            "the eye sees nothing between 800 and 900 nm",
        ),
        (
            "[instrument]\nblind_nm = [[390, 500], [450, 800]]\n",
            "blind stretches leave nothing",
        ),
        (
            "[instrument]\nrange_nm = [500, 501]\nresolution_nm = 2\n",
            "tells nothing apart",
        ),
    ] {
        let error = resolve(Some(parse(text).unwrap()), SetupOverrides::default()).unwrap_err();
        assert!(error.to_string().contains(expected), "{error}");
    }
}

#[test]
fn blind_stretches_are_merged_clipped_and_ascending() {
    let setup = from_toml(
        "[instrument]\nrange_nm = [380, 700]\nfilter = \"cobalt-glass\"\n\
         blind_nm = [[690, 750], [300, 395], [560, 580], [200, 210], [450, 480], [460, 470]]\n",
    );
    assert_eq!(setup.seen_range(), [390.0, 700.0]);
    assert_eq!(
        setup.blind_stretches(),
        [
            [390.0, 395.0],
            [450.0, 480.0],
            [560.0, 610.0],
            [690.0, 700.0]
        ]
    );
    assert!(setup.is_blind(610.0) && !setup.is_blind(610.1));
}

#[test]
fn response_joins_eye_filter_and_dimmed_stretches() {
    let plain = from_toml(
        "[instrument]\nresponse = \"flat\"\ndim_nm = [[580, 600, 1.0], [590, 600, 0.5]]\n",
    );
    assert_eq!(
        [579.0, 585.0, 595.0].map(|nm| plain.response_dex(nm)),
        [0.0, -1.0, -1.5]
    );
    let glass = from_toml("[instrument]\nfilter = \"cobalt-glass\"\n");
    let parts = Response::Eye.decades(500.0) + glass.filter().unwrap().decades(500.0);
    assert_eq!(glass.response_dex(500.0), parts);
    assert_eq!(glass.response_dex(300.0), UNSEEN_DEX);
}

#[test]
fn a_response_file_is_found_beside_the_set_up() {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(
        folder.path().join("mine.csv"),
        "nm,decades\n400,-1\n500,0\n",
    )
    .unwrap();
    let path = folder.path().join("s.toml");
    std::fs::write(
        &path,
        "[instrument]\nkind = \"ccd\"\nresponse = \"mine.csv\"\n",
    )
    .unwrap();
    let setup = resolve(Some(read_setup(&path).unwrap()), SetupOverrides::default()).unwrap();
    assert_eq!(setup.response_name(), "mine.csv");
    assert_eq!(setup.response_dex(450.0), -0.5);
    let missing = read_setup(&folder.path().join("none.toml")).unwrap_err();
    assert!(missing.to_string().contains("none.toml: cannot be read"));
}

#[test]
fn candidates_are_read_from_text() {
    assert_eq!(
        Candidates::from_text(" Everything "),
        Candidates::Everything
    );
    assert_eq!(
        Candidates::from_text("lamps"),
        Candidates::List("lamps".to_owned())
    );
    assert_eq!(
        Candidates::from_text("Li, Na,,K"),
        Candidates::Named(["Li", "Na", "K"].map(str::to_owned).to_vec())
    );
}

#[test]
fn the_views_name_units_and_leave_out_what_is_unknown() {
    let setup = of_kind(InstrumentKind::Goniometer);
    let json = serde_json::to_value(setup.view()).unwrap();
    assert_eq!(json["offset_nm"], 0.3);
    assert_eq!(json["common_shift_nm"], 0.45);
    assert_eq!(json["candidates"], "everything");
    assert!(json["faintest"].is_null());
    let described = setup.describe();
    assert!(described.contains(&("offset".to_owned(), "0.3 nm (taken as 0.45 nm)".to_owned())));
    assert!(described.iter().all(|(key, _)| key != "faintest"));
}

fn some_stretch() -> impl Strategy<Value = [f64; 2]> {
    (100.0..1900.0f64, 1.0..100.0f64).prop_map(|(from, width)| [from, from + width])
}

proptest! {
    #[test]
    fn a_set_up_reads_back_from_its_own_file(
        kind in prop::sample::select(InstrumentKind::ALL.to_vec()),
        blind in prop::collection::vec(some_stretch(), 0..3),
        dim in prop::collection::vec((some_stretch(), 0.0..3.0f64), 0..3),
        uncertainty in 0.001..9.0f64,
        faintest in prop::option::of(1e-6..1e6f64),
        listed in prop::option::of(1usize..40),
        always in prop::collection::vec("[a-z\"\\\\ ]{0,5}x", 0..3),
        filter in prop::sample::select(vec!["none", "cobalt-glass", "didymium-glass"]),
    ) {
        let flags = SetupOverrides {
            instrument: Some(kind),
            blind_nm: Some(blind),
            dim_nm: Some(dim.into_iter().map(|([from, to], lost)| (from, to, lost)).collect()),
            uncertainty_nm: Some(uncertainty),
            faintest,
            listed_at_most: listed,
            candidates: Some(if always.is_empty() { Candidates::Everything } else { Candidates::Named(always.clone()) }),
            always: Some(always),
            filter: Some(filter.to_owned()),
            division_nm: faintest.map(|_| 0.5),
            ..SetupOverrides::default()
        };
        let setup = resolve(None, flags).unwrap();
        prop_assert_eq!(from_toml(&setup.to_toml()), setup);
    }

    #[test]
    fn no_text_makes_the_reader_panic(text in "(\\[instrument\\]\n)?[a-z_=\\[\\]\"0-9., \n]{0,60}") {
        let _ = parse(&text);
    }

    #[test]
    fn blind_stretches_are_disjoint_and_inside(blind in prop::collection::vec(some_stretch(), 0..6)) {
        let flags = SetupOverrides { blind_nm: Some(blind), range_nm: Some([150.0, 1999.0]), ..SetupOverrides::default() };
        if let Ok(setup) = resolve(None, flags) {
            let [low, high] = setup.seen_range();
            let found = setup.blind_stretches();
            prop_assert!(found.iter().all(|[from, to]| low <= *from && from < to && *to <= high));
            prop_assert!(found.windows(2).all(|pair| pair[0][1] < pair[1][0]));
        }
    }

    #[test]
    fn the_response_never_exceeds_zero(nm in 100.0..2000.0f64, kind in prop::sample::select(InstrumentKind::ALL.to_vec())) {
        prop_assert!((UNSEEN_DEX..=0.0).contains(&of_kind(kind).response_dex(nm)));
    }
}
