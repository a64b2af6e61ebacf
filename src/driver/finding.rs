//! From what `sweep` measured to the form that is stored.
//! Must not measure.
//! Main functions: [`finding_of`], `light_finding_of`.

use crate::behaviour::{LIGHT_ENGINE, LightMeasurement};
use crate::record::finding::{CaptureFinding, ModeFinding, StoredLine, Trace};
use crate::record::light::{LightFinding, StoredMains, StoredTone};
use crate::sweep::{ENGINE, Measurement, Mode, ThinTrace};
use crate::uncertainty::{BudgetLine, Evaluation};

/// The stored form of a measurement; without a trace.
pub fn finding_of(measurement: &Measurement) -> CaptureFinding {
    let mut warnings: Vec<String> = measurement.warnings.iter().map(ToString::to_string).collect();
    warnings.extend(measurement.no_spacing.iter().map(ToString::to_string));
    let spacing = measurement.mode_spacing.as_ref();
    CaptureFinding {
        engine: ENGINE.to_owned(),
        refused: measurement.refused.as_ref().map(ToString::to_string),
        dark: measurement.dark,
        mode_spacing: spacing.map(|spacing| spacing.value),
        budget: spacing.map(|spacing| spacing.budget.iter().map(stored_line).collect()).unwrap_or_default(),
        free_spectral_range: measurement.free_spectral_range,
        order_count: measurement.order_count,
        finesse: measurement.finesse,
        mean_level: measurement.mean_level,
        noise: measurement.noise,
        ramp_ends: measurement.ramp_ends,
        modes: measurement.modes.iter().map(mode_finding).collect(),
        off_axis: measurement.off_axis.iter().map(mode_finding).collect(),
        warnings,
        trace: None,
    }
}

/// The stored form of what one light trace says, or of why it says nothing.
pub(super) fn light_finding_of(measured: Result<LightMeasurement, String>) -> LightFinding {
    let engine = LIGHT_ENGINE.to_owned();
    let measured = match measured {
        Ok(measured) => measured,
        Err(reason) => return LightFinding { engine, refused: Some(reason), ..LightFinding::default() },
    };
    LightFinding {
        engine,
        refused: None,
        sample_rate: measured.sample_rate,
        duration: measured.duration,
        mean: measured.mean,
        noise: measured.noise,
        overlap: measured.overlap,
        mains: measured.mains.map(|mains| StoredMains {
            frequency: mains.frequency,
            clear: mains.clear,
            power: mains.power,
            u_power: mains.u_power,
            n_harmonics: mains.n_harmonics,
        }),
        tone: measured.tone.map(|tone| StoredTone {
            frequency: tone.frequency,
            u_frequency: tone.u_frequency,
            power: tone.power,
            u_power: tone.u_power,
            probability: tone.probability,
        }),
        warnings: Vec::new(),
    }
}

/// The stored form of a thinned trace.
pub(super) fn trace_of(thin: ThinTrace) -> Trace {
    Trace { detuning: thin.detuning, low: thin.low, high: thin.high, marks: thin.marks }
}

fn stored_line(line: &BudgetLine) -> StoredLine {
    StoredLine {
        source_id: line.source_id.clone(),
        line: line.line.clone(),
        type_a: line.evaluation == Evaluation::TypeA,
        standard_uncertainty: line.standard_uncertainty,
        dof: line.dof.is_finite().then_some(line.dof),
        sensitivity: line.sensitivity,
        note: line.note.clone(),
    }
}

fn mode_finding(mode: &Mode) -> ModeFinding {
    ModeFinding {
        position: mode.position,
        u_position: mode.u_position,
        offset: mode.offset,
        u_offset: mode.u_offset,
        peak_height: mode.peak_height,
        u_peak_height: mode.u_peak_height,
        fwhm: mode.fwhm,
        area: mode.area,
        crossed_height: mode.crossed_height,
        places: mode.places.iter().map(|place| (place.order, place.ramp)).collect(),
        u_ramp: mode.u_ramp,
    }
}
