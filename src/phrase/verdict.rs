//! The table: verdicts, their reasons, and the notes that limits put to a row.
//! Must not hold a sentence that is glued to another: a place is filled, never an end added.
//! Main items: the constants, and [`ALL`].

use super::{Saying, figure, table};

table! {
    SEMICOLON = "; ", "; ";
    COMMA = ", ", ", ";
    SPACE = " ", " ";
    OR = " or ", " oder ";
    SENTENCE = "{0}.", "{0}.";
    COLON = "{0}: {1}", "{0}: {1}";

    OPEN = "open.", "offen.";
    PASS = "pass, grade {0}.", "bestanden, Güteklasse {0}.";
    FAIL = "fail.", "nicht bestanden.";
    FAIL_CODE = "fail, {0}.", "nicht bestanden, {0}.";
    HOLD = "hold.", "zurückgestellt.";
    STOPPED = "stopped.", "abgebrochen.";

    SHARED = "shared", "geteiltes Risiko";
    GUARDED = "guarded", "mit Schutzband";

    NO_VERDICT = "No verdict on the tube is given.", "Über die Röhre wird nicht entschieden.";
    CERTIFICATE_OVERDUE = "The certificate {0} of the {1} was due {2}.", "Kalibrierschein {0} ({1}) galt bis {2}.";
    REFERENCE_IN = "reference, the bench reads it in bounds.", "Referenz, der Messplatz liegt in den Grenzen.";
    REFERENCE_OUT = "reference, the bench reads it out of bounds.", "Referenz, der Messplatz liegt außerhalb der Grenzen.";
    REFERENCE_TITLE = "Reference tube of {0}: judges the bench, not the tube",
        "Referenzröhre von {0}: beurteilt den Messplatz, nicht die Röhre";
    NEVER_CHECKED = "Reference tube {0} was never checked here: inspect it first.",
        "Referenzröhre {0} wurde hier nie gemessen: zuerst messen.";
    CHECK_DUE = "Reference tube {0} is due since {1}, the start of the shift; its last check was {2}: inspect it first.",
        "Referenzröhre {0} ist seit Schichtbeginn {1} fällig; zuletzt gemessen {2}: zuerst messen.";
    CHECK_OUT = "Reference tube {0} was out of bounds at {1}: {2}; set the bench right and inspect it again.",
        "Referenzröhre {0} lag {1} außerhalb der Grenzen: {2}; Messplatz in Ordnung bringen und erneut messen.";
    CHECK_LACKS = "{0} was not measured", "{0}: nicht gemessen";
    CHECK_DRIFTS = "{0} drifts: its cumulative sum stands at {1} standard deviations, and {2} is the alarm",
        "{0} driftet: die kumulierte Summe steht bei {1} Standardabweichungen, Alarm ist bei {2}";
    CHECK_ABOVE = "{0} {1} is {2} above {3}, and {4} is allowed", "{0} {1} liegt {2} über {3}, zulässig sind {4}";
    CHECK_BELOW = "{0} {1} is {2} below {3}, and {4} is allowed", "{0} {1} liegt {2} unter {3}, zulässig sind {4}";
    CAPTURE_UNREADABLE = "Capture {0} could not be read: {1}.", "Aufnahme {0} war nicht lesbar: {1}.";
    CAPTURE_NOT_HAD = "A capture of step {0} could not be had or read: {1}.",
        "Eine Aufnahme des Schritts {0} fehlt oder war nicht lesbar: {1}.";

    NO_LIGHT = "The tube gave no light.", "Die Röhre gab kein Licht.";
    NO_GRADE_LEFT = "No grade is left.", "Es bleibt keine Güteklasse.";
    ALSO = "Also: {0}.", "Außerdem: {0}.";
    ALSO_HELD = "Also without a verdict: {0}.", "Ebenfalls ohne Entscheidung: {0}.";
    UNFILLED = "{0} is limited, but no step filled it.", "{0}: begrenzt, aber von keinem Schritt geliefert.";
    NO_VALUE = "{0} has no value.", "{0}: kein Wert.";
    NO_VALUE_WHY = "{0} has no value: {1}.", "{0}: kein Wert, denn: {1}.";
    UNDECIDED = "{0} is known only to be {1}, the bound is {2}: undecided.",
        "{0}: bekannt ist nur {1}, die Grenze ist {2}: unentschieden.";
    NO_FINITE_VALUE = "{0} has no finite value.", "{0}: kein endlicher Wert.";
    POINTS_AT_SUPPLY = "{0} {1} points at the supply, not at the tube: repeat on another supply.",
        "{0} {1} weist auf das Netzteil, nicht auf die Röhre: an einem anderen Netzteil wiederholen.";
    WORD_FOR_NUMBER = "{0} holds a word where a number is due.", "{0}: ein Wort, wo eine Zahl stehen muss.";
    LIMIT_HOLDS = "{0}, a limit that gives hold, not fail.", "{0}; diese Grenze stellt zurück und verwirft nicht.";
    NOT_GRADE = "Not {0}: {1}.", "Nicht {0}: {1}.";
    MARKED = "Marked: {0} (minor).", "Vermerkt: {0} (Nebenfehler).";

    IS = "{0} {1} is {2}", "{0} {1} liegt {2}";
    IS_COUNTED = "{0}: {1}, {2}", "{0}: {1}, {2}";
    IS_WORD = "{0} {1}, wanted {2}", "{0}: {1}, verlangt {2}";
    IN_DOUBT_BY_U = "{0} {1} is {2}, but not by its expanded uncertainty {3} (rule: {4})",
        "{0} {1} liegt {2}, aber nicht um die erweiterte Messunsicherheit {3} (Regel: {4})";
    IN_DOUBT_BY_PROBABILITY = "{0} {1} is {2}, but with probability {3} only (rule: {4})",
        "{0} {1} liegt {2}, aber nur mit der Wahrscheinlichkeit {3} (Regel: {4})";
    ABOVE = "above {0}", "über {0}";
    BELOW = "below {0}", "unter {0}";
    INSIDE_NONE = "inside no bound", "in keiner Grenze";
    NO_BOUND = "no bound", "keine Grenze";
    NOT_BY_U = "{0}, but not by U", "{0}, aber nicht um U";
    NOT_BY_PROBABILITY = "{0}, but with less than {1}", "{0}, aber mit weniger als {1}";
    WANTED = "wanted {0}", "verlangt {0}";
    AT_LEAST = "at least {0}", "mindestens {0}";
    WITHOUT_VALUE = "no value", "kein Wert";

    NOTE_NO_VALUE = "limited, without a value: gives hold", "begrenzt, ohne Wert: zurückgestellt";
    NOTE_UNDECIDED = "is known only to be {0}, the bound is {1}: undecided, gives hold",
        "bekannt ist nur {0}, die Grenze ist {1}: unentschieden, zurückgestellt";
    NOTE_NOT_FINITE = "no finite value: gives hold", "kein endlicher Wert: zurückgestellt";
    NOTE_WORD = "a word where a number is due: gives hold", "ein Wort, wo eine Zahl stehen muss: zurückgestellt";
    NOTE_HOLD = "outside {0}: gives hold, not fail", "außerhalb {0}: zurückgestellt, nicht verworfen";
    NOTE_FAILS = "fails", "nicht bestanden";
    NOTE_MINOR = "{0}: {1}; minor, the grade stays", "{0}: {1}; Nebenfehler, die Güteklasse bleibt";
    LOST_IN_DOUBT = "{0} lost in doubt; {1} holds", "{0} im Zweifel verloren; {1} eingehalten";
    LOST_IN_DOUBT_BOUND = "{0} lost in doubt; {1}, {2}, holds", "{0} im Zweifel verloren; {1} ({2}) eingehalten";
    LOST = "{0} lost: {1}; {2} holds", "{0} verloren: {1}; {2} eingehalten";
    LOST_BOUND = "{0} lost: {1}; {2}, {3}, holds", "{0} verloren: {1}; {2} ({3}) eingehalten";
    BOUND_OF_GRADE = "{0}: {1}, the bound of grade {2}", "{0}: {1}, die Grenze der Güteklasse {2}";
    LAST_BOUND = "{0}: {1}, the last grade's bound", "{0}: {1}, die Grenze der letzten Güteklasse";
    COUNT_IN_DOUBT = "in doubt: may be {0} to {1}", "im Zweifel: {0} bis {1} möglich";
}

/// A decision rule as people read it: `guarded`, `99 %`. Its key stays what it is in CSV and limits file.
pub fn rule(key: &str) -> Saying {
    match key {
        "shared" => (&SHARED).into(),
        "guarded" => (&GUARDED).into(),
        probability => Saying::of(figure(probability)),
    }
}
