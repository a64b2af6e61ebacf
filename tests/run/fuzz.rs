//! Happenings in any order, repeated, dropped and damaged: none may panic.
//! Must not expect a result.

use tubewright::record::{event::Happening, question::Answer};

use crate::{bench::Noise, driven, fresh, texts::plate};

/// Seeds of the fuzz: each shuffles, repeats, drops and damages the happenings of a sound run.
const FUZZ_SEEDS: u64 = 16;

#[test]
fn no_order_of_happenings_panics() {
    let script = driven(plate(), 10_000);
    for seed in 0..FUZZ_SEEDS {
        let mut noise = Noise(seed);
        let mut run = fresh(&script.texts, script.identity.clone());
        let mut next = 0;
        for _ in 0..400 {
            // Three in four in order, so that the run gets somewhere.
            let pick = if noise.below(4) > 0 { next } else { noise.below(script.events.len() as u64) as usize };
            next = if pick == next { next + 1 } else { next };
            let Some((happening, at)) = script.events.get(pick) else { break };
            run.take(&damaged(happening, &mut noise), *at);
            if noise.below(20) == 0 {
                run.take(&odd(&mut noise), *at);
            }
            run.wants();
            run.progress();
        }
        let sheet = run.sheet();
        assert_eq!(sheet, run.sheet(), "no NaN may stand on a sheet");
    }
}

/// Now and then with numbers that no engine gives.
fn damaged(happening: &Happening, noise: &mut Noise) -> Happening {
    let mut happening = happening.clone();
    let odd = [f64::NAN, f64::INFINITY, -1.0, 0.0, 1e300][noise.below(5) as usize];
    if noise.below(10) > 0 {
        return happening;
    }
    match &mut happening {
        Happening::Captured(captured) => match noise.below(8) {
            0 => captured.fact.taken_s = odd,
            1 => captured.fact.power = Some(odd),
            2 => captured.finding.free_spectral_range = odd,
            3 => captured.finding.mode_spacing = Some(odd),
            4 => captured.finding.modes.clear(),
            5 => captured.finding.modes.iter_mut().for_each(|mode| mode.position = odd),
            6 => captured.finding.modes.iter_mut().for_each(|mode| (mode.peak_height, mode.u_position) = (odd, odd)),
            _ => captured.finding.budget.iter_mut().for_each(|line| line.standard_uncertainty = odd),
        },
        Happening::Reading { value, .. } => *value = Some(odd),
        Happening::Answered { answer, .. } => *answer = Answer::Number(odd),
        _ => {}
    }
    happening
}

fn odd(noise: &mut Noise) -> Happening {
    match noise.below(4) {
        0 => Happening::Resumed,
        1 => Happening::MadeSafe,
        2 => Happening::Waited,
        _ => Happening::CaptureLost {
            step: "warm".into(),
            number: noise.below(100),
            reason: "noise".into(),
            for_good: noise.below(10) == 0,
        },
    }
}
