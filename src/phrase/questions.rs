//! The table: what the program asks a technician. Hints to hands near the tube carry the caution.
//! Must not hold a recipe's own words: those are the shop's, as they stand.
//! Main items: the constants, and [`ALL`].

use super::table;

table! {
    SWITCH_ON = "Tube seated, leads covered, beam stop in place, hands clear: switch the supply on and time \
        it until first light. Start pulses of up to 10 kV; laser radiation",
        "Röhre sitzt, Anschlüsse abgedeckt, Strahlfänger am Platz, Hände weg: Netzteil einschalten und die Zeit bis \
        zum ersten Licht nehmen. Zündimpulse bis 10 kV; Laserstrahlung";
    TRIES = "Tries to start, at most {0}; 0 if there was no light", "Zündversuche, höchstens {0}; 0, wenn kein Licht kam";
    START_VOLTAGE = "Highest voltage at the anode in the first try", "Höchste Spannung an der Anode beim ersten Versuch";
    RUN_CURRENT = "Run current, in the cathode return", "Betriebsstrom, in der Kathodenrückleitung";
    RUN_VOLTAGE = "Run voltage at the supply", "Betriebsspannung am Netzteil";
    DROPOUT = "Lower the current slowly until the discharge goes out and note the last current. The tube stays \
        dark; charge stays in tube and ballast",
        "Den Strom langsam senken, bis die Entladung erlischt, und den letzten Strom notieren. Die Röhre bleibt \
        dunkel; in Röhre und Vorwiderstand bleibt Ladung";
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
    OPEN_BEAM = "Open the beam again", "Den Strahl wieder freigeben";
}
