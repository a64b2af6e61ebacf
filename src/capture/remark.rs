//! What a reader should know about a capture that could be read.
//! Must not fail anything: these are remarks.
//! Main type: [`CaptureRemark`].

use std::fmt;

/// One thing to know about how a capture was read. `Display` is a plain sentence.
#[derive(Debug, Clone, PartialEq)]
pub enum CaptureRemark {
    /// Successive time stamps are equal: rounded in the export.
    StampsRepeated {
        /// How many equal their predecessor.
        count: usize,
    },
    /// Time stamps are rounded to a good part of the step.
    StampsRounded {
        /// Largest distance from the even base, in steps.
        largest: f64,
    },
    /// Single time stamps are wrong.
    StampsWrong {
        /// How many.
        count: usize,
        /// Line of the first, from 1.
        line: usize,
        /// What it says, seconds.
        stamp: f64,
    },
    /// Neither time stamps nor a sampling period.
    NoTime,
    /// Lines at the ends without numbers in every channel.
    EndsDropped {
        /// Lines before the first whole sample.
        first: usize,
        /// Lines after the last.
        last: usize,
    },
    /// The head promises another number of samples.
    CountDiffers {
        /// What the head says.
        stated: usize,
        /// What is there.
        found: usize,
    },
    /// The unit of a channel is not one of voltage.
    UnitOdd {
        /// Which channel.
        channel: &'static str,
        /// The unit given.
        unit: String,
    },
    /// Integer codes without volts a code.
    RawCodes {
        /// Which channel.
        channel: &'static str,
    },
    /// Few levels are in use.
    StepsCoarse {
        /// Which channel.
        channel: &'static str,
        /// Range in steps.
        levels: usize,
    },
    /// The parts of the channels were guessed from their shape.
    RolesGuessed {
        /// Where the ramp is, as `column 3` or a file's name.
        ramp: String,
        /// Where the photodiode is.
        photodiode: String,
        /// The shapes were too alike to be sure.
        uncertain: bool,
    },
    /// Channels with numbers that nothing uses.
    ChannelsUnused {
        /// How many.
        count: usize,
    },
    /// A line of our own head that cannot be read.
    HeadUnreadable {
        /// The key.
        key: String,
        /// What is wrong.
        fault: String,
    },
}

impl fmt::Display for CaptureRemark {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::StampsRepeated { count } => {
                write!(f, "{count} time stamps repeat the one before: rounded; an even time base was fitted")
            }
            Self::StampsRounded { largest } => {
                write!(f, "Time stamps lie up to {largest:.2} steps off an even time base, which was fitted")
            }
            Self::StampsWrong { count: 1, line, stamp } => {
                write!(f, "The time stamp in line {line} is wrong ({stamp} s); the even time base was used")
            }
            Self::StampsWrong { count, line, stamp } => {
                write!(
                    f,
                    "{count} time stamps are wrong, first in line {line} ({stamp} s); the even time base was used"
                )
            }
            Self::NoTime => write!(f, "No time stamps and no sampling period: time counts samples, not seconds"),
            Self::EndsDropped { first, last } => {
                write!(
                    f,
                    "Lines without a number in every channel were dropped: {first} at the start, {last} at the end"
                )
            }
            Self::CountDiffers { stated, found } => write!(f, "The head promises {stated} samples, {found} are there"),
            Self::UnitOdd { channel, unit } => {
                write!(f, "The unit of the {channel} is given as {unit}; its numbers were taken as volts")
            }
            Self::RawCodes { channel } => {
                write!(f, "The {channel} holds raw codes without volts a code; they were taken as they are")
            }
            Self::StepsCoarse { channel, levels } => write!(f, "The {channel} uses only about {levels} levels"),
            Self::RolesGuessed { ramp, photodiode, uncertain: false } => {
                write!(f, "Ramp ({ramp}) and photodiode ({photodiode}) were told apart by their shape")
            }
            Self::RolesGuessed { ramp, photodiode, uncertain: true } => write!(
                f,
                "Ramp ({ramp}) and photodiode ({photodiode}) have shapes too alike to be sure; name the columns"
            ),
            Self::ChannelsUnused { count: 1 } => write!(f, "One more channel was not used"),
            Self::ChannelsUnused { count } => write!(f, "{count} more channels were not used"),
            Self::HeadUnreadable { key, fault } => write!(f, "The head's `{key}` was left out: {fault}"),
        }
    }
}
