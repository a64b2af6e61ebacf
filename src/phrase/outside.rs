//! The table: words that come back out of stored events (engine, instruments, the simulated technician), which keep English.
//! Must not hold a phrase that is all place: everything would read like it.
//! Main items: the constants, and [`ALL`].

use super::table;

table! {
    // Instruments and people.
    NO_PROBE = "no high-voltage probe on this bench", "kein Hochspannungstastkopf an diesem Messplatz";
    PRESS_IN_THE_DARK = "there is no light to watch while the mount is pressed",
        "beim Drücken der Fassung ist kein Licht zu beobachten";
    SEEN_IS_NONE_OF = "what is seen, `{0}`, is none of {1}", "was zu sehen ist, `{0}`, ist keines von {1}";
    NO_INSTRUMENT = "no instrument for it at this bench", "kein Messgerät dafür an diesem Messplatz";
    NOT_HERE = "not on this bench", "nicht an diesem Messplatz";
    CAPTURES_ONLY = "captures only: nobody at a bench", "nur Aufnahmen: niemand am Messplatz";
    NO_REASON = "no reason given", "kein Grund angegeben";
    FOLDER_AT_END = "captures only: the folder holds no further capture", "nur Aufnahmen: der Ordner hat keine weitere";
    NO_DATA = "the digitizer gave no data for this capture", "der Digitalisierer gab für diese Aufnahme keine Daten";
    NO_INTERFEROMETER = "the station has no interferometer", "die Station hat kein Interferometer";
    METER_NOT_FINITE = "the meter gave no finite number", "das Messgerät gab keine endliche Zahl";
    METER_NONE = "the meter gave no value", "das Messgerät gab keinen Wert";
    METER_GAVE = "the meter gave {0}, no finite number", "das Messgerät gab {0}, keine endliche Zahl";

    // Traces of the light.
    LIGHT_TOO_SHORT = "{0} samples in {1} s are too few for noise from {2} Hz; expected {3} s or more",
        "{0} Abtastwerte in {1} s sind zu wenige für Rauschen ab {2} Hz; nötig sind {3} s oder mehr";
    LIGHT_TOO_SLOW = "{0} samples a second are too slow for noise to {1} Hz; expected {2} or more",
        "{0} Abtastwerte je Sekunde sind zu langsam für Rauschen bis {1} Hz; nötig sind {2} oder mehr";
    LIGHT_NOT_FINITE = "the samples hold no finite noise", "die Abtastwerte ergeben kein endliches Rauschen";
    LIGHT_STANDS = "the light does not move by one step: the light detector is saturated or not connected",
        "das Licht ändert sich um keinen Schritt: der Lichtempfänger ist übersteuert oder nicht angeschlossen";
    LIGHT_CLIPPED = "{0} % of the samples stand at {1} V, the top: the light detector is saturated; weaken the light",
        "{0} % der Abtastwerte stehen bei {1} V, dem Anschlag: der Lichtempfänger ist übersteuert; Licht abschwächen";
    LIGHT_NO_MAINS = "the slow traces are too short to show the mains",
        "die langsamen Aufnahmen sind zu kurz, um das Netz zu zeigen";
    LIGHT_NOT_BLOCKED = "the light detector reads {0} V with the beam open and {1} V with it blocked: no light in it, or the \
        beam was not blocked",
        "der Lichtempfänger zeigt {0} V bei offenem und {1} V bei abgedecktem Strahl: kein Licht, oder der Strahl war nicht \
        abgedeckt";

    // Envelope and beam.
    ENVELOPE_FEW = "{0} points along the gain line are too few", "{0} Punkte entlang der Verstärkungslinie sind zu wenige";
    ENVELOPE_THIN = "phase coverage is thin: {0} of {1} places under the gain line hold {2} modes or more",
        "zu wenige Phasen: nur {0} von {1} Stellen unter der Verstärkungslinie tragen {2} Moden oder mehr";
    ENVELOPE_LOW = "the low flank of the envelope could not be extrapolated",
        "die untere Flanke der Einhüllenden war nicht zu extrapolieren";
    ENVELOPE_HIGH = "the high flank of the envelope could not be extrapolated",
        "die obere Flanke der Einhüllenden war nicht zu extrapolieren";
    ENVELOPE_NO_HALF = "the envelope does not cross half its height", "die Einhüllende schneidet ihre halbe Höhe nicht";
    ENVELOPE_HALF = "the envelope's half height could not be found", "die halbe Höhe der Einhüllenden war nicht zu finden";
    KNIFE_SAME = "both positions of the knife edge are the same", "beide Stellungen der Messerschneide sind gleich";
    BEAM_NARROWS = "the beam does not widen from the nearer distance to the farther",
        "der Strahl weitet sich von der näheren zur ferneren Entfernung nicht auf";
    BEAM_NEAR = "the nearer distance, {0} m, is not beyond three Rayleigh lengths, {1} m: measure farther away",
        "die nähere Entfernung, {0} m, liegt nicht jenseits von drei Rayleighlängen, {1} m: weiter entfernt messen";

    // Refusals of the engine.
    TOO_SHORT = "the longest ramp has {0} samples; at least 100 are needed: record more samples a ramp",
        "die längste Rampe hat {0} Abtastwerte; mindestens 100 sind nötig: mehr Abtastwerte je Rampe aufnehmen";
    NOT_FINITE = "sample {0} is not a finite number; record the capture again",
        "Abtastwert {0} ist keine endliche Zahl; erneut aufnehmen";
    DARK = "no peak stands above the noise: is the tube lit and the beam on the interferometer?",
        "keine Linie ragt aus dem Rauschen: Leuchtet die Röhre, trifft der Strahl das Interferometer?";
    CLUTTER = "clutter: {0} peaks on one ramp, more than any comb has; realign the interferometer, or reduce the ramp",
        "Wirrwarr: {0} Linien auf einer Rampe, mehr als ein Kamm hat; Interferometer neu justieren oder Rampe verkleinern";
    FRINGES = "broad fringes, no peaks: the bumps are {0} % as wide as their distance; a finesse of 6 or more is needed",
        "breite Streifen, keine Linien: die Buckel sind {0} % so breit wie ihr Abstand; nötig ist eine Finesse von 6 oder mehr";
    ONE_ORDER = "one order only: nothing repeats, so there is no frequency scale; raise the ramp until every mode shows twice",
        "nur eine Ordnung: nichts wiederholt sich, daher keine Frequenzskala; Rampe erhöhen, bis jede Mode zweimal erscheint";
    NO_REPEAT = "the peaks do not repeat: only {0} % of their height is found again one order on; raise the ramp until every \
        mode shows twice, or realign the interferometer",
        "die Linien wiederholen sich nicht: nur {0} % ihrer Höhe kehrt eine Ordnung weiter wieder; Rampe erhöhen, bis jede \
        Mode zweimal erscheint, oder Interferometer neu justieren";
    NO_COMB = "the peaks form no comb: only {0} % of their height fits evenly spaced modes; realign and repeat",
        "die Linien bilden keinen Kamm: nur {0} % ihrer Höhe passt zu gleichen Abständen; neu justieren und wiederholen";
    AMBIGUOUS_NEAR = "spacings of {0} MHz and {1} MHz fit equally well, and neither is near the nominal {2} MHz, or use an \
        interferometer of another free spectral range",
        "Abstände von {0} MHz und {1} MHz passen gleich gut, und keiner liegt beim Nennwert {2} MHz; oder ein Interferometer \
        mit anderem freien Spektralbereich verwenden";
    AMBIGUOUS = "spacings of {0} MHz and {1} MHz fit equally well; give the nominal spacing, or use an interferometer of \
        another free spectral range",
        "Abstände von {0} MHz und {1} MHz passen gleich gut; Nennabstand angeben oder ein Interferometer mit anderem freien \
        Spektralbereich verwenden";
    ONE_MODE = "one mode an order: a spacing needs two; take more captures while the tube walks, or remove the polarizer",
        "eine Mode je Ordnung: ein Abstand braucht zwei; weiter aufnehmen, während die Moden wandern, oder den Polarisator \
        entfernen";
    NO_FIT = "the fit of the peaks did not come to rest; realign and repeat",
        "die Anpassung der Linien kam nicht zur Ruhe; neu justieren und wiederholen";
    WEAK_SCALE = "the peaks seen do not fix the frequency scale; raise the ramp until every mode shows at least twice",
        "die Linien legen die Frequenzskala nicht fest; Rampe erhöhen, bis jede Mode mindestens zweimal erscheint";
    FAR_TOO_SLOW = "the detector is far too slow for this ramp: its time constant is {0} times what the ramp takes for one \
        line; slow the ramp tenfold, or take the low-pass filter out",
        "der Empfänger ist viel zu langsam für diese Rampe: seine Zeitkonstante ist das {0}-Fache der Zeit für eine Linie; Rampe \
        zehnmal langsamer fahren oder das Tiefpassfilter entfernen";
    FEW_LEVELS = "the highest peak is only {0} steps of the digitizer high; raise the gain until it fills half of the range",
        "die höchste Linie ist nur {0} Stufen des Digitalisierers hoch; Verstärkung erhöhen, bis sie den halben Bereich füllt";
    UNSTEADY = "one mode changes in height by {0} % against the others from order to order: the tube hopped or swapped in \
        mid-sweep, or two captures were spliced; take another capture",
        "eine Mode ändert ihre Höhe von Ordnung zu Ordnung um {0} % gegen die anderen: Modensprung oder Tausch während der \
        Rampe, oder zwei Aufnahmen wurden zusammengefügt; erneut aufnehmen";
    FALSE_COMB_PART = "the spacing reads {0} MHz, a whole part of the nominal {1} MHz: light between the modes looks like a comb \
        of its own; realign, set the gain so that no peak is lost, and repeat",
        "der Abstand zeigt {0} MHz, einen ganzen Teil des Nennwerts {1} MHz: Licht zwischen den Moden sieht aus wie ein eigener \
        Kamm; neu justieren, Verstärkung so wählen, dass keine Linie fehlt, und wiederholen";
    FALSE_COMB_MULTIPLE = "the spacing reads {0} MHz, a multiple of the nominal {1} MHz: modes between those seen are missing; \
        realign, set the gain so that no peak is lost, and repeat",
        "der Abstand zeigt {0} MHz, ein Vielfaches des Nennwerts {1} MHz: Moden dazwischen fehlen; neu justieren, Verstärkung so \
        wählen, dass keine Linie fehlt, und wiederholen";
    NO_TURN = "no usable ramp channel, and the modes come out as if the ramp turned within the record; record the ramp, or at \
        least two and a half of its periods",
        "kein brauchbarer Rampenkanal, und die Moden sehen aus, als kehrte die Rampe in der Aufnahme um; die Rampe aufzeichnen \
        oder mindestens zweieinhalb ihrer Perioden";
}
