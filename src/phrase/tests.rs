//! How sayings are put into words; the table itself is looked at in `tests/language.rs`.
//! Must not know what is said where.

#![allow(clippy::unwrap_used)]

use super::*;

#[test]
fn figures_days_and_labels_follow_the_language() {
    static ABOUT: Phrase = Phrase::new("{0} {1} on {2}", "am {2} {0} {1}");
    static LABEL: Phrase = Phrase::new("Power", "Leistung");
    let label = Saying::from(&LABEL);
    let due = chrono::NaiveDate::from_ymd_opt(2026, 1, 12).unwrap();
    let saying = ABOUT.with([within(label), figure("-0.505 mW"), day(due)]);
    assert_eq!(saying.english(), "power -0.505 mW on 2026-01-12");
    assert_eq!(saying.text(Language::German), "am 12.01.2026 Leistung -0,505 mW");
    assert_eq!(Language::German.figure("v0.1.2 at 3. and .5"), "v0,1,2 at 3. and .5", "only figures go through here");
    assert_eq!(Language::German.day_text("2026-03-02"), "02.03.2026");
    assert_eq!(Language::German.day_text("last week"), "last week");
}

#[test]
fn what_is_empty_is_left_out() {
    let said =
        Saying::list([Saying::none(), Saying::outside("a"), Saying::none(), Saying::outside("b")], &verdict::COMMA);
    assert_eq!(said.english(), "a, b");
    assert!(Saying::list([Saying::none()], &verdict::COMMA).is_empty() && Saying::outside("").is_empty());
    assert_eq!(Saying::of(clause(Saying::outside(" too far apart. "))).english(), "too far apart");
    // A place without a piece is empty, and what a piece says is never taken for a place.
    assert_eq!(verdict::COLON.with([name("{1}")]).english(), "{1}: ");
}

#[test]
fn abbreviations_stay_large_inside_a_sentence() {
    let within = |text: &str| Saying::of(within(Saying::outside(text))).english();
    assert_eq!([within("Power"), within("DC level"), within("Ärger"), within("")], ["power", "DC level", "ärger", ""]);
}

#[test]
fn sentences_of_stored_events_are_known_again() {
    for text in [
        "no high-voltage probe on this bench",
        "the longest ramp has 12 samples; at least 100 are needed: record more samples a ramp",
        "spacings of 300.1 MHz and 150.0 MHz fit equally well; give the nominal spacing, or use an interferometer of another \
         free spectral range",
    ] {
        let saying = Saying::outside(text);
        assert_eq!(saying.english(), text);
        assert_ne!(saying.text(Language::German), text);
    }
    assert_eq!(
        Saying::outside("the meter gave NaN, no finite number").text(Language::German),
        "das Messgerät gab NaN, keine endliche Zahl"
    );
    for text in
        ["arc at the anode", "no light", "the meter gave ", "x no reason given", "spacings of {0} MHz", "ä", "…"]
    {
        assert_eq!(Saying::outside(text).text(Language::German), text, "a person's words stay");
    }
}

#[test]
fn languages_are_known_by_their_codes() {
    for (code, language) in Language::CODES {
        assert_eq!((Language::of_code(code), language.code()), (Some(language), code));
        assert_eq!(Language::of_record(&language.stored()), language);
    }
    assert_eq!(Language::of_code("fr"), None);
    assert_eq!([Language::of_record(""), Language::of_record("xx")], [Language::English; 2]);
}
