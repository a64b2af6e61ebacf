//! The table: what the page, its charts and the terminal's rows say around the values.
//! Must not hold a sentence that is glued to another: a place is filled, never an end added.
//! Main items: the constants, and [`ALL`].

use super::table;

table! {
    // Headings of the rows.
    OPTICS = "Optics", "Optik";
    POLARIZATION = "Polarization", "Polarisation";
    POWER = "Power", "Leistung";
    OVER_TIME = "Over time", "Zeitverhalten";
    SUPPLY = "Supply", "Versorgung";
    BEAM = "Beam", "Strahl";
    BY_EYE = "By eye", "Sichtprüfung";

    // Values.
    NOT_FINITE = "not a finite number", "keine endliche Zahl";
    IN_DOUBT = "({0} to {1})", "({0} bis {1})";
    NO_VALUE_IN_LINE = "no value ({0})", "kein Wert ({0})";
    OUTSIDE = "outside", "außerhalb";

    // Head.
    RECORD_OF = "Record of tube {0}", "Prüfprotokoll der Röhre {0}";
    RECORD = "RECORD OF ONE TUBE", "PRÜFPROTOKOLL EINER RÖHRE";
    SIMULATED = "Simulated bench: not a measurement of a tube", "Simulierter Messplatz: keine Messung an einer Röhre";
    FROM_FILES = "From files of captured sweeps", "Aus Dateien aufgenommener Durchläufe";
    CONTINUED = "{0}, continued", "{0}, Fortsetzung";
    THIS_TUBE = "This tube:", "Diese Röhre:";
    TUBE = "Tube", "Röhre";
    BENCH = "Bench", "Messplatz";
    RUN = "Run", "Lauf";
    SUPPLIER = "supplier", "Lieferant";
    LOT = "lot", "Los";
    CONDITION = "condition", "Zustand";
    RECEIVED = "received", "Eingang";
    STATION = "station", "Station";
    STARTED = "started", "Beginn";
    TOOK = "took", "Dauer";
    MINUTES = "{0} min", "{0} min";
    DWELL = "dwell {0}", "Einlaufen {0}";
    RECIPE_LIMITS = "recipe, limits", "Rezept, Grenzen";
    REVISIONS = "revision {0}, revision {1}", "Revision {0}, Revision {1}";
    RULE = "rule", "Regel";
    TECHNICIAN = "technician", "Prüfer";
    REPEATS_RUN = "repeats run", "wiederholt";
    DUE = "due\u{a0}{0}", "gültig\u{a0}bis\u{a0}{0}";
    OVERDUE_SINCE = "overdue\u{a0}since\u{a0}{0}", "abgelaufen\u{a0}am\u{a0}{0}";
    OVERDUE = "overdue", "abgelaufen";
    NO_CERTIFICATE = "no\u{a0}certificate", "kein\u{a0}Kalibrierschein";
    ONE_LIMIT_HOLDS = "The one limit holds.", "Die eine Grenze ist eingehalten.";
    LIMITS_HOLD = "All {0} limits hold.", "Alle {0} Grenzen sind eingehalten.";
    ONE_LIMIT_NEAREST_MOST = "The one limit holds; the nearest is {0}, {1} of at\u{a0}most\u{a0}{2}.",
        "Die eine Grenze ist eingehalten: {0}, {1} von höchstens\u{a0}{2}.";
    ONE_LIMIT_NEAREST_LEAST = "The one limit holds; the nearest is {0}, {1} of at\u{a0}least\u{a0}{2}.",
        "Die eine Grenze ist eingehalten: {0}, {1} von mindestens\u{a0}{2}.";
    LIMITS_NEAREST_MOST = "All {3} limits hold; the nearest is {0}, {1} of at\u{a0}most\u{a0}{2}.",
        "Alle {3} Grenzen sind eingehalten; am knappsten: {0}, {1} von höchstens\u{a0}{2}.";
    LIMITS_NEAREST_LEAST = "All {3} limits hold; the nearest is {0}, {1} of at\u{a0}least\u{a0}{2}.",
        "Alle {3} Grenzen sind eingehalten; am knappsten: {0}, {1} von mindestens\u{a0}{2}.";

    // Table.
    TABLE = "Measured", "Gemessen";
    VALUE_U = "value ± U", "Wert ± U";
    LIMITS_VALUE = "limits, value, uncertainty", "Grenzen, Wert, Unsicherheit";
    CONFORMS = "conforms", "konform";
    NO_VALUE = "no value: {0}", "kein Wert: {0}";
    WANTED = "wanted: {0}", "verlangt: {0}";
    EXACT = "exact", "exakt";
    SEEN = "by eye", "visuell";
    ALSO = "Also measured, for information", "Außerdem gemessen, zur Information";
    MODES = "Modes over a walk cycle", "Moden je Wanderperiode";
    TO = "{0} to {1}", "{0} bis {1}";
    WITHOUT_VALUE = "No value:", "Kein Wert:";

    // Charts.
    SWEEP = "Sweep", "Durchlauf";
    SWEEP_AT = "Sweep, {0}", "Durchlauf, {0}";
    SWEEP_SIGNAL = "signal, of the strongest mode; thin line: fitted modes",
        "Signal, bezogen auf die stärkste Mode; dünn: angepasste Moden";
    SWEEP_AXIS = "detuning of the scan, GHz", "Verstimmung des Durchlaufs, GHz";
    NO_SWEEP = "no sweep was kept", "kein Durchlauf aufbewahrt";
    EMPTY_SWEEP = "the sweep that was kept is empty", "der aufbewahrte Durchlauf ist leer";
    GAIN = "Gain line", "Verstärkungslinie";
    GAIN_CYCLES = "Gain line, {0} walk cycles", "Verstärkungslinie, {0} Wanderperioden";
    GAIN_HEIGHT = "peak height, of the greatest; bars: U", "Linienhöhe, bezogen auf die größte; Balken: U";
    GAIN_AXIS = "detuning from the line's middle, MHz", "Verstimmung von der Linienmitte, MHz";
    NO_HEIGHTS = "no heights were followed over a walk", "keine Höhen über eine Wanderung verfolgt";
    EMPTY_HEIGHTS = "the walk showed no peak heights", "die Wanderung zeigte keine Linienhöhen";
    WALK = "Walk", "Modenwanderung";
    WALK_SPACINGS = "mode spacings walked; dashed: fitted and predicted",
        "gewanderte Modenabstände; gestrichelt: Vorhersage";
    WALK_AXIS = "minutes since first light", "Minuten seit dem ersten Licht";
    NO_WALK = "no walk was followed", "keine Wanderung verfolgt";
    EMPTY_WALK = "the walk showed no modes", "die Wanderung zeigte keine Moden";
    TAU = "τ {0}", "τ {0}";
    READY = "ready {0}", "bereit {0}";
    DWELL_ENDED = "dwell ended at {0} min", "Einlaufen endete bei {0} min";
    ONE_HOP = "{0} hop (cross)", "{0} Modensprung (Kreuz)";
    HOPS = "{0} hops (cross)", "{0} Modensprünge (Kreuz)";
    ONE_SWAP = "{0} swap (diamond)", "{0} Achsenwechsel (Raute)";
    SWAPS = "{0} swaps (diamond)", "{0} Achsenwechsel (Raute)";

    // Chart of a bench.
    BENCH_TITLE = "Reference tubes of {0}", "Referenzröhren von {0}";
    BENCH_AS_OF = "As of {0}.", "Stand {0}.";
    BENCH_HOLDS = "Gives no verdicts: {0}", "Keine Beurteilung: {0}";
    BENCH_STORED = "{0} of {1} checks came stored with the scenario.",
        "{0} von {1} Prüfungen waren mit dem Szenario gespeichert.";
    BENCH_OF_TUBE = "{0}, {1}", "{0}, {1}";
    BENCH_BAND = "{0} ± {1} {2}: band; last check {3} {2}; a cross is out of bounds",
        "{0} ± {1} {2}: Band; letzte Prüfung {3} {2}; ein Kreuz liegt außerhalb der Grenzen";
    BENCH_AXIS = "days since {0}; upright: off by, % of what is allowed",
        "Tage seit {0}; senkrecht: Abweichung in % der erlaubten";
    BENCH_NO_CHECK = "{0}, {1}: no check yet", "{0}, {1}: noch keine Prüfung";
    BENCH_SUMS = "cumulative sums, standard deviations: up solid, down dashed; alarm above {0}",
        "kumulative Summen, Standardabweichungen: aufwärts durchgezogen, abwärts gestrichelt; Alarm über {0}";
    BENCH_NO_SUMS = "cumulative sums: none while the standard deviation of a check is unknown",
        "kumulative Summen: keine, solange die Standardabweichung einer Prüfung unbekannt ist";
    BENCH_DRIFT = "drift: above the alarm", "Drift: über dem Alarm";

    // Foot.
    EXPLAINED = "U: expanded uncertainty for 95.45 %. \"conforms\": probability of being inside, no prior \
        knowledge assumed. Brackets: bounds, best grade first. Valid for this tube only.",
        "U: erweiterte Messunsicherheit für 95,45 %. „konform“: Wahrscheinlichkeit, innerhalb zu liegen, ohne \
        Vorwissen. Klammern: Grenzen, beste Güteklasse zuerst. Gilt nur für diese Röhre.";
    REMARKS = "Remarks", "Hinweise";
    MORE_REMARKS = "… and more: see the note in the first line of record.csv.",
        "… und mehr: siehe `note` in der ersten Zeile von record.csv.";
    PAGE_OF = "{0} · page {1} of {2}", "{0} · Seite {1} von {2}";
    LAST_PAGE_OF = "{0} · page {1} of {2} · end", "{0} · Seite {1} von {2} · Ende";
    RUN_ID = "run {0}", "Lauf {0}";
    HASH = "record.csv sha256 {0}", "record.csv sha256 {0}";
    MEASURED_BY = "Measured by", "Gemessen von";
    REVIEWED_BY = "Reviewed by", "Geprüft von";
    NOT_SEALED = "not sealed", "nicht gesiegelt";
}
