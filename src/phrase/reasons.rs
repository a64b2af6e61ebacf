//! The table: why a row has no value, notes to rows, remarks on a run, the cautions, what stands for an instrument.
//! Must not hold a sentence that is glued to another: a place is filled, never an end added.
//! Main items: the constants, and [`ALL`].

use super::table;

table! {
    // The run.
    TUBE_DARK = "the tube gives no light", "die Röhre gibt kein Licht";
    STOPPED_BEFORE = "stopped before it was measured", "vor der Messung abgebrochen";
    STEP_GAVE_NONE = "the step gave no value", "der Schritt lieferte keinen Wert";
    NOT_YET = "not measured yet", "noch nicht gemessen";
    NO_TIMES = "the captures carry no time (`# captured_at = …`)", "die Aufnahmen tragen keine Zeit (`# captured_at = …`)";
    NOT_FINITE = "the arithmetic gave no finite number", "die Rechnung ergab keine endliche Zahl";
    NO_ANSWER = "the answer gave no value", "die Antwort gab keinen Wert";
    MEASURED = "measured", "gemessen";
    SIMULATED = "Simulated bench: not a measurement of a tube.", "Simulierter Messplatz: keine Messung an einer Röhre.";
    FROM_CAPTURES = "Measured from a folder of captures, not at a bench.",
        "Aus einem Ordner mit Aufnahmen gemessen, nicht am Messplatz.";
    REFERENCE_TUBE = "Reference tube of {0}: judges the bench, not the tube.",
        "Referenzröhre von {0}: beurteilt den Messplatz, nicht die Röhre.";
    UNTIMED = "The captures carry no time: they were taken in their order.",
        "Die Aufnahmen tragen keine Zeit: sie gelten in ihrer Reihenfolge.";
    DARK_TUBE = "Dark tube: {0}.", "Dunkle Röhre: {0}.";
    NOT_MADE_SAFE = "Nobody stood at the switch when this run ended: whether the high voltage is off is not known.",
        "Beim Ende dieses Laufs stand niemand am Schalter: ob die Hochspannung aus ist, ist nicht bekannt.";
    STOPPED = "Stopped: {0}", "Abgebrochen: {0}";
    REPEATS = "Repeats run {0} because: {1}.", "Wiederholt Lauf {0}, Grund: {1}.";
    CLOCK_BACK = "The clock on the wall was set back by {0} s: times on this sheet go on from before.",
        "Die Wanduhr wurde um {0} s zurückgestellt: die Zeiten auf diesem Blatt laufen wie vorher weiter.";
    CLOCK_AHEAD = "The clock on the wall ran ahead by {0} s (set forward, or the machine slept): not counted here.",
        "Die Wanduhr sprang um {0} s vor (verstellt, oder der Rechner ruhte): hier nicht mitgezählt.";

    // Cautions.
    CAUTION = "{0} Laser radiation; start pulses of up to 10 kV; charge stays in tube and ballast after switch-off; \
        glass under vacuum. This record gives no clearance.",
        "{0} Laserstrahlung; Zündimpulse bis 10 kV; in Röhre und Vorwiderstand bleibt nach dem Abschalten Ladung; \
        Glas unter Vakuum. Dieses Protokoll ist keine Freigabe.";
    CLASS = "Power in the range of class {0} (IEC 60825-1): treat as at least class {0}.",
        "Leistung im Bereich der Klasse {0} (IEC 60825-1): mindestens wie Klasse {0} behandeln.";
    CLASS_UNKNOWN = "Power not measured: treat as at least class 3B (IEC 60825-1).",
        "Leistung nicht gemessen: mindestens wie Klasse 3B behandeln (IEC 60825-1).";

    // Instruments.
    INTERFEROMETER = "interferometer", "Interferometer";
    POWER_METER = "power meter", "Leistungsmesser";
    SUPPLY = "supply", "Netzteil";
    POLARIZER = "polarizer", "Polarisator";
    RANGE = "{0} ± {1}", "{0} ± {1}";
    READING_TIMES = "reading × {0} ± {1}", "Anzeige × {0} ± {1}";
    BALLAST = "ballast {0}, readings ± {1}", "Ballast {0}, Anzeigen ± {1}";
    EXTINCTION_ANGLE = "{0}:1, angle ± {1}", "{0}:1, Winkel ± {1}";
    NO_SUPPLY = "the station file names no supply", "die Stationsdatei nennt kein Netzteil";
    NO_POWER_METER = "the station file names no power meter", "die Stationsdatei nennt keinen Leistungsmesser";
    NO_POLARIZER = "the station file names no polarizer", "die Stationsdatei nennt keinen Polarisator";

    // Strike.
    NO_LIGHT_AFTER = "no light after {0} tries", "kein Licht nach {0} Versuchen";
    NOT_LIT = "the tube did not light", "die Röhre zündete nicht";

    // From the rack.
    FROM_RACK = "taken from the rack, burning since {0}", "aus dem Einbrenngestell genommen, brennt seit {0}";
    FROM_RACK_REMARK = "Taken from the rack, burning since {0}: its strike and its warm-up were not seen here.",
        "Aus dem Einbrenngestell genommen, brennt seit {0}: Zündung und Einlaufen wurden hier nicht gesehen.";
    RACK_NO_CYCLE = "taken from the rack at rest: no whole walk cycle was seen; take it sooner, or strike it cold here",
        "in Ruhe aus dem Einbrenngestell genommen: keine ganze Wanderungsperiode gesehen; früher entnehmen oder hier kalt zünden";
    RACK_NO_CYCLE_HOLD = "The tube came from the rack at rest and no whole walk cycle was seen: take it sooner, or strike it cold here.",
        "Die Röhre kam in Ruhe aus dem Einbrenngestell, keine ganze Wanderungsperiode wurde gesehen: früher entnehmen oder hier kalt zünden.";
    RACK_NOT_JUDGED = "not judged: from the rack", "nicht bewertet: aus dem Einbrenngestell";

    // Dwell.
    NO_LIGHT_FOR = "no light in the captures for 30 s", "seit 30 s kein Licht in den Aufnahmen";
    NO_LIGHT_IN_DWELL = "no light in any capture of the dwell", "in keiner Aufnahme des Einlaufens Licht";
    NOT_SETTLED_REMARK = "The walk had not settled when the dwell ended at its longest, {0} min: what needs whole cycles is empty.",
        "Die Modenwanderung war am Ende der längsten Einlaufzeit von {0} min nicht abgeklungen: Was ganze Perioden braucht, ist leer.";
    UNREADABLE_FIRST = "{0} captures of step {1} could not be read; the first: {2}.",
        "{0} Aufnahmen des Schritts {1} waren nicht lesbar; die erste: {2}.";
    UNREADABLE = "{0} captures of step {1} could not be read.", "{0} Aufnahmen des Schritts {1} waren nicht lesbar.";
    OUT_OF_ORDER = "out of the order of time", "nicht in zeitlicher Folge";
    EARLY_UNKNOWN = "early cycles unknown: counted from the first that could be followed",
        "frühe Perioden unbekannt: gezählt ab der ersten, die zu verfolgen war";
    NO_RATE = "the rate of the walk could not be found", "die Geschwindigkeit der Wanderung war nicht zu bestimmen";
    NOT_SETTLED = "not settled within {0} min", "nach {0} min nicht abgeklungen";
    NOT_SETTLED_PREDICTED = "not settled within {0} min; predicted walk up to {1} spacings",
        "nach {0} min nicht abgeklungen; vorhergesagte Wanderung bis {1} Abstände";
    ENDED_EARLY = "the captures ended before the walk settled", "die Aufnahmen endeten, bevor die Wanderung abklang";
    ENDED_EARLY_PREDICTED = "the captures ended before the walk settled; predicted walk up to {0} spacings",
        "die Aufnahmen endeten, bevor die Wanderung abklang; vorhergesagte Wanderung bis {0} Abstände";
    NO_FIT = "the warm-up could not be fitted", "das Einlaufen ließ sich nicht anpassen";

    // Sweep and spacing.
    CAPTURE = "capture {0}: {1}", "Aufnahme {0}: {1}";
    NO_LIGHT = "no light", "kein Licht";
    NO_LIGHT_IN_ANY = "no light in any of {0} captures", "in keiner von {0} Aufnahmen Licht";
    NOT_TWO_MODES = "no capture shows two modes", "keine Aufnahme zeigt zwei Moden";
    STEP = "Step {0}: {1}.", "Schritt {0}: {1}.";
    AND_MORE = "and {0} more", "und {0} weitere";
    NO_FINESSE = "no capture gave a finesse", "keine Aufnahme ergab eine Finesse";
    FROM_ONE = "from {0} capture {1}", "aus {0} Aufnahme {1}";
    FROM_MANY = "from {0} captures {1}", "aus {0} Aufnahmen {1}";
    AT_REST = "at rest", "in Ruhe";
    OF_DWELL_ONE_MODE = "of the dwell: one mode alone at rest", "des Einlaufens: in Ruhe nur eine Mode";
    OF_DWELL_SURER = "of the dwell: those at rest say less", "des Einlaufens: die in Ruhe sagen weniger";
    OF_DWELL_NONE = "of the dwell: none at rest", "des Einlaufens: keine in Ruhe";
    OF_STEP = "of {0}", "von {0}";
    LEFT_OUT = "{0}, {1} that stood apart left out", "{0}, {1} abseits liegende weggelassen";
    BIRGE = "{0}; Birge ratio {1}", "{0}; Birge-Verhältnis {1}";
    SPACING_NOT_POSITIVE = "the mode spacing is not above zero", "der Modenabstand ist nicht größer als null";

    // Comb.
    DID_NOT_SETTLE = "{0} did not settle within {1} min", "{0}: nach {1} min nicht abgeklungen";
    NO_WHOLE_CYCLES = "{0} shows no {1} whole walk cycles", "{0} zeigt keine {1} ganzen Wanderperioden";
    STEP_AT_REST = "{0} is at rest: no walk cycle was seen", "{0} ist in Ruhe: keine Wanderperiode gesehen";
    TOO_FEW_PHASES = "under one walk cycle or 20 phases of it could be counted",
        "weniger als eine Wanderperiode oder 20 Phasen davon waren zählbar";
    NEAREST_TO_FLOOR = "the mode nearest to the floor: {0} that it is on the side found",
        "Mode nächst der Schwelle: mit Wahrscheinlichkeit {0} auf der gefundenen Seite";
    NO_PEAK_OFF = "no peak off the comb", "keine Linie außerhalb des Kamms";
    NOT_MEASURABLE = "no capture could be measured", "keine Aufnahme war auswertbar";

    // Envelope.
    MODES_IN_PLACES = "{0} modes, {1} of {2} places", "{0} Moden, {1} von {2} Stellen";
    GAS_AT = "gas at 400 K", "Gas bei 400 K";
    SPAN_NOT_POSITIVE = "the lasing span is not above zero", "der Laserbereich ist nicht größer als null";
    NO_DIP = "no significant dip", "keine signifikante Einsenkung";

    // Beam.
    FROM_MIRROR = "{0} from the output mirror", "{0} vom Auskoppelspiegel";
    NO_KNIFE_READINGS = "no knife-edge readings", "keine Ablesungen mit der Messerschneide";
    FULL_ANGLE = "full angle", "voller Winkel";
    TWO_DISTANCES = "it takes readings at two distances", "dazu braucht es Ablesungen in zwei Entfernungen";

    // Watch.
    NOT_WATCHED = "no capture was watched", "keine Aufnahme wurde beobachtet";
    UNATTRIBUTED = "unattributed jump of {0} MHz at {1} s: tube or interferometer, repeat the watch",
        "nicht zuzuordnender Sprung um {0} MHz bei {1} s: Röhre oder Interferometer, Beobachtung wiederholen";
    AXES_ALIKE = "the axes of the modes could not be told apart", "die Achsen der Moden waren nicht zu unterscheiden";
    NO_CROSSED = "the captures have no crossed photodiode", "die Aufnahmen haben keine gekreuzte Photodiode";
    NONE_IN = "none in {0} min: fewer than {1} an hour (95 %)", "keine in {0} min: weniger als {1} je Stunde (95 %)";
    AT = "at {0} s", "bei {0} s";
    AT_BY = "at {0} s ({1})", "bei {0} s ({1})";
    LIST_AND_MORE = "{0} and {1} more", "{0} und {1} weitere";
    A_CYCLE = "{0} a walk cycle; {1}", "{0} je Wanderperiode; {1}";
    A_CYCLE_AT = "{0} a walk cycle, {1} from the middle of the line; {2}",
        "{0} je Wanderperiode, {1} von der Linienmitte; {2}";

    // Power.
    NO_POWER_READING = "the captures of {0} carry no power reading", "die Aufnahmen von {0} tragen keinen Leistungswert";
    NOT_OVER_CYCLE = "at rest, not over a walk cycle", "in Ruhe, nicht über eine Wanderperiode";
    FEW_READINGS_CYCLES = "too few power readings over the whole cycles", "zu wenige Leistungswerte über die ganzen Perioden";
    FEW_READINGS_LAST = "too few power readings in the last whole cycle",
        "zu wenige Leistungswerte in der letzten ganzen Periode";
    FEW_CYCLES = "too few whole cycles near the end of the dwell show a slope",
        "zu wenige ganze Perioden am Ende des Einlaufens zeigen eine Steigung";

    // Noise.
    NO_LIGHT_DETECTOR = "the station file names no light detector", "die Stationsdatei nennt keinen Lichtempfänger";
    NO_DARK_TRACE = "no trace in the dark, so the level without light is unknown: {0}",
        "keine Aufnahme im Dunkeln, daher ist der Pegel ohne Licht unbekannt: {0}";
    NO_LIGHT_TRACES = "light traces are missing", "Lichtaufnahmen fehlen";
    DETECTOR_REACHES = "the light detector reaches {0}, the band {1}", "der Lichtempfänger reicht bis {0}, das Band bis {1}";
    NOISE_BAND = "{0}: {1} s, then {2} ms; dark noise {3} % taken off",
        "{0}: {1} s, dann {2} ms; Dunkelrauschen {3} % abgezogen";
    BAND = "{0} to {1}", "{0} bis {1}";
    FOLDED = "the slow trace folds noise down from above its band: average the light over each sample",
        "die langsame Aufnahme faltet Rauschen von oberhalb ein: das Licht über jeden Abtastschritt mitteln";
    NO_MAINS = "No mains line stands clear of the noise: {0} Hz was taken.",
        "Keine Netzlinie hebt sich vom Rauschen ab: {0} Hz angenommen.";
    HARMONICS = "{0} harmonics of {1} Hz, {2} s; {3} % could hide in the noise",
        "{0} Harmonische von {1} Hz, {2} s; {3} % könnten im Rauschen verborgen sein";
    NO_TONE = "none above the noise, {0}; that of the discharge may lie higher",
        "keiner über dem Rauschen, {0}; der der Entladung kann höher liegen";
    TONE_OF_MODES = "moved between two traces, as a beat of modes does: no fault",
        "zwischen zwei Aufnahmen gewandert, wie eine Modenschwebung: kein Fehler";
    TONE_MOVING = "moved between two traces, too high for a beat of modes: points at the discharge",
        "zwischen zwei Aufnahmen gewandert, zu hoch für eine Modenschwebung: weist auf die Entladung";
    TONE_FIXED = "stayed between two traces: supply or discharge; try another current",
        "zwischen zwei Aufnahmen unverändert: Netzteil oder Entladung; anderen Strom versuchen";
    TONE_ONCE = "seen in one trace only: whether it moves is not known",
        "nur in einer Aufnahme gesehen: ob er wandert, ist unbekannt";
    TONE_UNSEEN = "Whether a tone moves was not seen: {0}.", "Ob ein Störton wandert, war nicht zu sehen: {0}.";

    // Supply.
    LESS_DROP = "less the drop in {0}, {1} from the anode", "abzüglich des Abfalls an {0}, {1} vor der Anode";
    DROP_UNKNOWN = "the drop in the ballast is unknown without run_current",
        "der Abfall am Vorwiderstand ist ohne Betriebsstrom unbekannt";
    WITH_BALLAST = "with {0} of ballast", "mit {0} Vorwiderstand";
    NO_DROPOUT = "no dropout current", "kein Löschstrom";
    NO_RUN_CURRENT = "no run current above zero", "kein Betriebsstrom über null";

    // Polarizer.
    FEW_ANGLE_READINGS = "{0} readings with the polarizer, expected {1} or more",
        "{0} Ablesungen mit dem Polarisator, erwartet {1} oder mehr";
    FEW_ANGLE_CAPTURES = "{0} captures with the polarizer, expected {1} or more",
        "{0} Aufnahmen mit dem Polarisator, erwartet {1} oder mehr";
    NO_DARK_READING = "no reading with the beam blocked", "keine Ablesung bei abgedecktem Strahl";
    NO_NULL = "the fine scan shows no null", "die Feinabtastung zeigt kein Minimum";
    NO_LIGHT_THROUGH = "no light through the polarizer", "kein Licht durch den Polarisator";
    NULL_UNDER_NOISE = "the null is under the noise of the meter", "das Minimum liegt unter dem Rauschen des Leistungsmessers";
    FOLDER_HAS_NO_TURN = "captures from a folder carry no turn of a polarizer",
        "Aufnahmen aus einem Ordner tragen keine Polarisatordrehung";
    NO_MODE_THROUGH = "no mode through the polarizer", "keine Mode durch den Polarisator";
    NO_AXIS_KEPT = "no mode kept its axis over the angles", "keine Mode behielt ihre Achse über alle Winkel";
    NO_NEIGHBOURS = "no neighbours were seen together", "keine Nachbarmoden wurden zugleich gesehen";
    BOTH_AT_ONCE = "from captures that show both at once", "aus Aufnahmen, die beide zugleich zeigen";
    OF_ONE_FAMILY = "of one family of modes; the other's is given by the angle between neighbours",
        "einer Modenfamilie; die andere folgt aus dem Winkel der Nachbarmoden";
    AXES_KNOWN_TO = "the axes of neighbours are known to {0}° only", "die Achsen der Nachbarmoden sind nur auf {0}° bekannt";
}
