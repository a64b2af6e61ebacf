//! The table: what the program asks a technician. Hints to hands near the tube carry the caution.
//! Must not hold a recipe's own words: those are the shop's, as they stand.
//! Main items: the constants, and [`ALL`].

use super::table;

table! {
    SWITCH_ON = "Switch the supply on and time it until first light",
        "Das Netzteil einschalten und die Zeit bis zum ersten Licht nehmen";
    TRIES = "Tries to start, at most {0}; 0 if there was no light", "Zündversuche, höchstens {0}; 0, wenn kein Licht kam";
    START_VOLTAGE = "Highest voltage at the anode in the first try", "Höchste Spannung an der Anode beim ersten Versuch";
    RUN_CURRENT = "Run current, in the cathode return", "Betriebsstrom, in der Kathodenrückleitung";
    RUN_VOLTAGE = "Run voltage at the supply", "Betriebsspannung am Netzteil";
    DROPOUT = "Lower the current slowly until the discharge goes out and note the last current. The tube stays dark",
        "Den Strom langsam senken, bis die Entladung erlischt, und den letzten Strom notieren. Die Röhre bleibt dunkel";
    TURN = "Turn the polarizer to {0}°, counter-clockwise looking toward the tube",
        "Den Polarisator auf {0}° drehen, gegen den Uhrzeigersinn mit Blick auf die Röhre";
    POLARIZER_OUT = "Take the polarizer out of the beam", "Den Polarisator aus dem Strahl nehmen";
    BLOCK_BEAM = "Block the beam ahead of the power meter", "Den Strahl vor dem Leistungsmesser abdecken";
    BLOCK_LIGHT = "Block the beam ahead of the light detector, with a beam stop",
        "Den Strahl vor dem Lichtempfänger mit einem Strahlfänger abdecken";
    KNIFE_DISTANCE = "Set the knife edge across the beam and note its distance from the output mirror. Laser \
        radiation: look at the meter, never along the beam",
        "Die Messerschneide in den Strahl stellen und ihre Entfernung vom Auskoppelspiegel notieren. Laserstrahlung: \
        auf das Messgerät blicken, nie in den Strahl";
    KNIFE_AT_10 = "Position of the knife edge at which 10 % of the power passes",
        "Stellung der Messerschneide, bei der 10 % der Leistung durchgehen";
    KNIFE_AT_90 = "Position of the knife edge at which 90 % of the power passes",
        "Stellung der Messerschneide, bei der 90 % der Leistung durchgehen";
    // Above a question, between two zigzags.
    MIND_SWITCHING = "High voltage and laser light: start pulses reach 10 kV. Tube seated, leads covered, beam stop in \
        place, eyewear on, hands clear. Local rules and licensed practice decide who may switch on.",
        "Hochspannung und Laserlicht: Zündimpulse erreichen 10 kV. Röhre sitzt, Anschlüsse abgedeckt, Strahlfänger am \
        Platz, Schutzbrille auf, Hände weg. Wer einschalten darf, bestimmen die örtlichen Regeln und die Zulassung.";
    MIND_METERS = "High voltage: read the meter and touch nothing. Charge stays in tube and ballast. A probe goes on or \
        off only with the supply off and both discharged with an insulated tool.",
        "Hochspannung: ablesen, nichts berühren. In Röhre und Vorwiderstand bleibt Ladung. Ein Tastkopf wird nur bei \
        ausgeschaltetem Netzteil angelegt oder abgenommen, nach Entladen beider mit isoliertem Werkzeug.";
    MIND_BEAM = "Laser light: eyewear on, a beam stop behind, no reflection toward an eye. High voltage is on: hands \
        stay clear of the tube and its leads.",
        "Laserlicht: Schutzbrille auf, Strahlfänger dahinter, kein Reflex ins Auge. Hochspannung liegt an: Hände weg \
        von der Röhre und ihren Anschlüssen.";
    MIND_LOOKS = "Laser light and high voltage: never look along the beam. No hand near a tube that burns, but by an insulated \
        tool where the question asks for it; else supply off, tube and ballast discharged first. Local rules decide who may.",
        "Laserlicht und Hochspannung: nie in den Strahl blicken. Keine Hand an eine brennende Röhre, außer mit isoliertem \
        Werkzeug, wo die Frage es verlangt; sonst erst Netzteil aus, Röhre und Vorwiderstand entladen. Wer das darf, \
        bestimmen die örtlichen Regeln.";
    OPEN_BEAM = "Open the beam again", "Den Strahl wieder freigeben";
}
