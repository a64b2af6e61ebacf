//! The table: what the terminal says around rows and questions while a run goes on.
//! Must not hold what is asked or measured.
//! Main items: the constants, and [`ALL`].

use super::table;

table! {
    // Below a question.
    WAYS_OUT = "At any question: `?` explains it, `skip: why` leaves it open on the sheet with the reason, `stop: why` \
        ends the run; what was measured is kept.",
        "Bei jeder Frage: `?` erklärt sie, `skip: warum` lässt sie mit dem Grund auf dem Blatt offen, `stop: warum` \
        beendet den Lauf; Gemessenes bleibt erhalten.";
    ENTER_WHEN_DONE = "Enter once it is done", "Eingabetaste, wenn es getan ist";
    CHOOSE = "number or word, then Enter", "Ziffer oder Wort, dann Eingabetaste";
    A_COUNT = "a count", "Anzahl";
    FROM_TO = "from {0} to {1}", "von {0} bis {1}";
    HOW_NUMBER = "A number alone is in the unit shown; another unit of its kind may follow it. A comma may stand for the \
        point. `-` alone: no instrument for it here.",
        "Eine Zahl allein gilt in der gezeigten Einheit; eine andere Einheit ihrer Art darf folgen. Komma und Punkt \
        gelten gleich. `-` allein: hier gibt es kein Messgerät dafür.";
    HOW_COUNT = "A count, in digits.", "Eine Anzahl, in Ziffern.";
    HOW_CHOICE = "The digit before a word, or the word, then Enter.", "Die Ziffer vor einem Wort oder das Wort, dann Eingabetaste.";
    HOW_DONE = "Enter, once the hands have done it. An Enter that comes with the question is not taken.",
        "Eingabetaste, wenn die Hände es getan haben. Eine, die mit der Frage kommt, gilt nicht.";
    IN_A_FILE = "In a file of answers: `{0}` below [steps.{1}].", "In einer Antwortdatei: `{0}` unter [steps.{1}].";
    TOO_SOON = "That Enter came with the question: once more, when it is done.",
        "Diese Eingabetaste kam mit der Frage: noch einmal, wenn es getan ist.";
    NOTHING_TYPED = "Nothing was typed; `?` explains.", "Nichts eingegeben; `?` erklärt.";
    NOT_TAKEN = "Not taken: {0}.", "Nicht angenommen: {0}.";
    AND_WHY = "{0}, and why", "{0}, und warum";
    THEN_ENTER = "{0}, then Enter", "{0}, dann Eingabetaste";

    // A person says that it is safe.
    TAKE_OFF = "Switch the supply off now, if it is on. Charge stays in tube and ballast after switch-off: discharge both \
        with an insulated tool before a hand comes near. Local rules and licensed practice decide who may do this.",
        "Jetzt das Netzteil ausschalten, falls es noch an ist. Nach dem Ausschalten bleibt Ladung in Röhre und \
        Vorwiderstand: beide mit isoliertem Werkzeug entladen, bevor eine Hand in die Nähe kommt. Wer das darf, bestimmen die örtlichen Regeln und die Zulassung.";
    IS_OFF = "Supply off, tube dark, charge taken off", "Netzteil aus, Röhre dunkel, entladen";
    LOOK_FIRST = "Look first whether the supply is on and the tube lit: high voltage may still be there.",
        "Zuerst nachsehen, ob das Netzteil an ist und die Röhre leuchtet: Hochspannung kann noch anliegen.";
    LOOKED = "Supply and tube looked at, hands clear", "Netzteil und Röhre angesehen, Hände weg";

    // Verdicts of a row.
    PASS = "pass", "bestanden";
    PASS_NOT = "pass, not {0}", "bestanden, nicht {0}";
    FAIL = "fail", "nicht bestanden";
    FAIL_CODE = "fail, {0}", "nicht best., {0}";
    HOLD = "hold", "zurückgestellt";

    // The block at the foot.
    STEP_OF = "{0}, step {1} of {2}", "{0}, Schritt {1} von {2}";
    CAPTURES = "captures {0}, {1}; {2}", "Aufnahmen {0}, {1}; {2}";
    LEFT_UNKNOWN = "time left not known yet", "Restzeit noch unbekannt";
    LEFT = "about {0} left", "noch etwa {0}";
    LEFT_PACED = "about {0} left ({1} at this pace)", "noch etwa {0} ({1} bei diesem Tempo)";
    A_MOMENT = "a moment", "einen Augenblick";
    NO_SWEEP = "no sweep yet", "noch kein Durchlauf";
    SWEEP = "sweep {0}", "Durchlauf {0}";
    MODES = "modes {0}", "Moden {0}";
    SPACING = "spacing {0} MHz", "Abstand {0} MHz";
    OFF_COMB = "{0} off the comb", "{0} neben dem Kamm";
    DARK = "no light", "kein Licht";
    NOT_MEASURED = "could not be measured: {0}", "nicht messbar: {0}";
    NO_WALK = "no walk yet", "noch keine Modenwanderung";
    WALK = "walk {0} spacings since first light", "Wanderung {0} Abstände seit dem ersten Licht";
    WALK_ENDED = "dwell ended at {0} min", "Einlaufen endete bei {0} min";
    WALK_ENDS = "expected to end at {0} min", "Ende erwartet bei {0} min";
    WALK_OPEN = "its end cannot be foretold yet", "Ende noch nicht absehbar";
    NOTED = "noted: {0}, {1}: {2}", "notiert: {0}, {1}: {2}";
}
