//! From tables to a capture: which column is what, one range of whole samples, seconds and volts.
//! Must not parse text.
//! Main function: [`assemble`].

use super::{
    Capture, FEWEST_SAMPLES, Head, TimeBase,
    columns::{Columns, Place},
    error::CaptureError,
    keys::{self, Surroundings, is_index_word},
    layout::{self, Layout},
    remark::CaptureRemark,
    roles::{self, Candidate},
    table,
    timebase::{self, Stamps},
    units::{ColumnUnit, unit},
};

/// A ramp monitor or photodiode below this many levels is worth a remark.
const COARSE: usize = 64;

/// One file, read.
struct Source<'a> {
    name: &'a str,
    bytes: &'a [u8],
    layout: Layout,
    around: Surroundings,
    /// One for each of `layout.columns`; NaN where a cell had no number.
    columns: Vec<Vec<f64>>,
    /// Index of the column of time stamps.
    time: Option<usize>,
}

/// One column: file, then index into its columns.
type Spot = (usize, usize);

/// Which columns are used.
#[derive(Debug, Clone, Copy)]
struct Parts {
    time: Option<Spot>,
    ramp: Option<Spot>,
    photodiode: Spot,
    crossed: Option<Spot>,
}

impl Parts {
    fn spots(&self) -> impl Iterator<Item = Spot> {
        [self.time, self.ramp, Some(self.photodiode), self.crossed].into_iter().flatten()
    }
}

/// See [`super::read_many`].
pub(super) fn assemble(files: &[(&str, &[u8])], columns: Option<&Columns>) -> Result<Capture, CaptureError> {
    let within = |name: &str, error: CaptureError| if files.len() > 1 { error.within(name) } else { error };
    let mut sources = Vec::with_capacity(files.len());
    for &(name, bytes) in files {
        sources.push(source(name, bytes).map_err(|error| within(name, error))?);
    }
    same_length(&sources)?;
    let mut remarks = Vec::new();
    let parts = match columns {
        Some(columns) => named_parts(&sources, columns)?,
        None => guessed_parts(&sources, &mut remarks)?,
    };
    let rows = sources[0].columns.first().map_or(0, Vec::len);
    let (first, end) = whole_samples(&sources, &parts).map_err(|(file, error)| within(sources[file].name, error))?;
    drop_unused(&mut sources, &parts);
    let time = time_base(&mut sources, &parts, first, end, &mut remarks)?;
    if first > 0 || end < rows {
        remarks.push(CaptureRemark::EndsDropped { first, last: rows - end });
    }
    if let Some(stated) = sources[0].around.count(column_of(&sources, parts.photodiode)).filter(|&n| n != rows) {
        remarks.push(CaptureRemark::CountDiffers { stated, found: rows });
    }
    let mut head_lines = sources.iter_mut().flat_map(|source| std::mem::take(&mut source.around.head));
    let head = Head::from_lines(&head_lines.by_ref().collect::<Vec<_>>(), &mut remarks);
    let mut channel = |spot: Spot, name| volts(&mut sources, &parts, spot, first, end, name, &mut remarks);
    let ramp = parts.ramp.map(|spot| channel(spot, "ramp"));
    let crossed = parts.crossed.map(|spot| channel(spot, "crossed photodiode"));
    let photodiode = channel(parts.photodiode, "photodiode");
    Ok(Capture { time, ramp, photodiode, crossed, head, remarks })
}

/// Lets go of columns that nothing uses: a long capture is held once.
fn drop_unused(sources: &mut [Source<'_>], parts: &Parts) {
    for (file, source) in sources.iter_mut().enumerate() {
        for (c, column) in source.columns.iter_mut().enumerate() {
            if source.time != Some(c) && !parts.spots().any(|spot| spot == (file, c)) {
                *column = Vec::new();
            }
        }
    }
}

/// The samples `first` to `end` of a column, moved out of its file; copied where the column is named for two parts.
fn taken(sources: &mut [Source<'_>], parts: &Parts, spot: Spot, first: usize, end: usize) -> Vec<f64> {
    let column = &mut sources[spot.0].columns[spot.1];
    if parts.spots().filter(|&other| other == spot).count() > 1 {
        return column[first..end].to_vec();
    }
    let mut samples = std::mem::take(column);
    samples.truncate(end);
    samples.drain(..first);
    samples
}

fn source<'a>(name: &'a str, bytes: &'a [u8]) -> Result<Source<'a>, CaptureError> {
    let bytes = bytes.strip_prefix(b"\xEF\xBB\xBF").unwrap_or(bytes);
    let layout = layout::find(bytes)?;
    let around = keys::read(bytes, &layout);
    let columns = table::read_columns(bytes, &layout);
    let mut source = Source { name, bytes, layout, around, columns, time: None };
    source.time = time_column(&source);
    Ok(source)
}

/// The column named time, else the first that runs straight; none where there is one column alone or a running number.
fn time_column(source: &Source<'_>) -> Option<usize> {
    let is_index = |c: usize| is_index_word(&source.around.labels[c].name);
    let is_time = |c: usize| {
        let label = &source.around.labels[c];
        matches!(label.unit, Some(ColumnUnit::Time(_))) || label.name.starts_with("time")
    };
    let many = source.columns.len() > 1;
    let candidates = || (0..source.columns.len()).filter(|&c| many && !is_index(c));
    let named = candidates().find(|&c| is_time(c));
    let counted = source.around.step(0).is_some() && source.columns.first().is_some_and(|c| counts_up(c));
    let straight = |c: &usize| {
        let column = finite_part(&source.columns[*c]);
        let is_channel = matches!(source.around.labels[*c].unit, Some(ColumnUnit::Voltage(_)));
        !is_channel && timebase::fit(column).is_some_and(|stamps| stamps.is_straight(column.len()))
    };
    named.or_else(|| candidates().find(straight).filter(|&c| !(c == 0 && counted)))
}

/// 0, 1, 2, … or 1, 2, 3, …
fn counts_up(column: &[f64]) -> bool {
    let first = column.first().copied().unwrap_or(f64::NAN);
    (first == 0.0 || first == 1.0) && column.windows(2).all(|pair| pair[1] - pair[0] == 1.0)
}

/// From the first finite value to the last.
fn finite_part(column: &[f64]) -> &[f64] {
    let first = column.iter().position(|v| v.is_finite()).unwrap_or(column.len());
    let end = column.iter().rposition(|v| v.is_finite()).map_or(first, |last| last + 1);
    &column[first..end]
}

fn same_length(sources: &[Source<'_>]) -> Result<(), CaptureError> {
    let Some(first) = sources.first() else { return Err(CaptureError::NoFiles) };
    let rows = |source: &Source<'_>| source.columns.first().map_or(0, Vec::len);
    match sources.iter().find(|source| rows(source) != rows(first)) {
        Some(other) => Err(CaptureError::UnequalLengths {
            first: first.name.to_owned(),
            first_samples: rows(first),
            second: other.name.to_owned(),
            second_samples: rows(other),
        }),
        None => Ok(()),
    }
}

fn named_parts(sources: &[Source<'_>], columns: &Columns) -> Result<Parts, CaptureError> {
    let names: Vec<&str> = sources.iter().map(|source| source.name).collect();
    let spot = |place: &Place, role: &'static str| {
        let file = place.file_index(&names, role)?;
        let layout = &sources[file].layout;
        let column = place.column;
        match layout.columns.binary_search(&(column.saturating_sub(1))) {
            Ok(index) => Ok((file, index)),
            Err(_) if column > layout.width => Err(CaptureError::NoSuchColumn { column, role, there: layout.width }),
            Err(_) => {
                let numeric: Vec<String> = layout.columns.iter().map(|c| (c + 1).to_string()).collect();
                Err(CaptureError::NotNumeric { column, role, numeric: numeric.join(", ") })
            }
        }
    };
    let maybe = |place: &Option<Place>, role| place.as_ref().map(|place| spot(place, role)).transpose();
    let photodiode = spot(&columns.photodiode, "photodiode")?;
    let (ramp, crossed) = (maybe(&columns.ramp, "ramp")?, maybe(&columns.crossed, "crossed")?);
    let used = [Some(photodiode), ramp, crossed];
    let found = sources[photodiode.0].time.map(|c| (photodiode.0, c)).filter(|&spot| !used.contains(&Some(spot)));
    let time = maybe(&columns.time, "time")?.or(found);
    Ok(Parts { time, ramp, photodiode, crossed })
}

fn guessed_parts(sources: &[Source<'_>], remarks: &mut Vec<CaptureRemark>) -> Result<Parts, CaptureError> {
    let spots: Vec<Spot> = (0..sources.len()).flat_map(|file| channels(sources, file)).collect();
    let stem = |source: &Source<'_>| {
        let last = source.name.rsplit(['/', '\\']).next().unwrap_or_default().to_lowercase();
        last.rsplit_once('.').map_or(last.clone(), |(stem, _)| stem.to_owned())
    };
    let stems: Vec<String> = sources.iter().map(|s| if sources.len() > 1 { stem(s) } else { String::new() }).collect();
    let candidates: Vec<Candidate<'_>> = spots
        .iter()
        .map(|&(file, c)| Candidate {
            name: &sources[file].around.labels[c].name,
            file: &stems[file],
            volts: finite_part(&sources[file].columns[c]),
        })
        .collect();
    let roles = roles::guess(&candidates).ok_or(CaptureError::NoPhotodiode)?;
    let named = |index: usize| {
        let (file, _) = spots[index];
        let column = column_of(sources, spots[index]) + 1;
        if sources.len() > 1 { format!("{}, column {column}", sources[file].name) } else { format!("column {column}") }
    };
    if let (Some(uncertain), Some(ramp)) = (roles.by_shape, roles.ramp) {
        let (ramp, photodiode) = (named(ramp), named(roles.photodiode));
        remarks.push(CaptureRemark::RolesGuessed { ramp, photodiode, uncertain });
    }
    let used = 1 + usize::from(roles.ramp.is_some()) + usize::from(roles.crossed.is_some());
    if spots.len() > used {
        remarks.push(CaptureRemark::ChannelsUnused { count: spots.len() - used });
    }
    let photodiode = spots[roles.photodiode];
    let time = sources[photodiode.0].time.map(|c| (photodiode.0, c));
    let spot = |index: Option<usize>| index.map(|index| spots[index]);
    Ok(Parts { time, ramp: spot(roles.ramp), photodiode, crossed: spot(roles.crossed) })
}

/// The columns of a file that are neither time, nor a copy of it, nor a running number, nor empty.
fn channels(sources: &[Source<'_>], file: usize) -> Vec<Spot> {
    let source = &sources[file];
    let many = source.columns.len() > 1;
    let copies_time = |column: &[f64]| {
        source.time.is_some_and(|time| {
            let other = column.iter().zip(&source.columns[time]).filter(|(a, b)| a != b && !a.is_nan() && !b.is_nan());
            // One in a hundred may differ; no need to count further.
            let few = column.len() / 100;
            other.take(few + 1).count() <= few
        })
    };
    let is_time = |c: usize| matches!(source.around.labels[c].unit, Some(ColumnUnit::Time(_)));
    let is_number = |c: usize| {
        let label = &source.around.labels[c];
        many && source.time != Some(c) && (is_index_word(&label.name) || (c == 0 && counts_up(&source.columns[c])))
    };
    (0..source.columns.len())
        .filter(|&c| source.time != Some(c) && !copies_time(&source.columns[c]) && !is_number(c))
        .filter(|&c| !is_time(c))
        .filter(|&c| source.columns[c].iter().any(|v| v.is_finite()))
        .map(|c| (file, c))
        .collect()
}

/// Column in its file, from 0.
fn column_of(sources: &[Source<'_>], (file, index): Spot) -> usize {
    sources[file].layout.columns.get(index).copied().unwrap_or(0)
}

/// The range of rows from the first to the last where every used column has a number; all between must have too.
fn whole_samples(sources: &[Source<'_>], parts: &Parts) -> Result<(usize, usize), (usize, CaptureError)> {
    let column = |(file, c): Spot| sources[file].columns[c].as_slice();
    let rows = column(parts.photodiode).len();
    let (mut first, mut end) = (0, rows);
    for spot in parts.spots() {
        let column = column(spot);
        first = first.max(column.iter().position(|v| v.is_finite()).unwrap_or(rows));
        end = end.min(column.iter().rposition(|v| v.is_finite()).map_or(0, |last| last + 1));
    }
    for spot in parts.spots() {
        let gap = column(spot).get(first..end).and_then(first_not_finite);
        if let Some(gap) = gap {
            let (source, column) = (&sources[spot.0], column_of(sources, spot));
            let (line, text) = table::locate(source.bytes, &source.layout, first + gap, column);
            return Err((spot.0, CaptureError::NotANumber { line, column: column + 1, text }));
        }
    }
    let found = end.saturating_sub(first);
    if found < FEWEST_SAMPLES { Err((parts.photodiode.0, CaptureError::TooFew { found })) } else { Ok((first, end)) }
}

/// Position of the first value that is no finite number, looked for in pieces: most captures have none.
fn first_not_finite(values: &[f64]) -> Option<usize> {
    const PIECE: usize = 64;
    let piece = values.chunks(PIECE).position(|piece| !piece.iter().fold(true, |all, v| all & v.is_finite()))?;
    values[piece * PIECE..].iter().position(|v| !v.is_finite()).map(|at| piece * PIECE + at)
}

/// The time base of the capture, checked against the times of every other file that is used.
fn time_base(
    sources: &mut [Source<'_>],
    parts: &Parts,
    first: usize,
    end: usize,
    remarks: &mut Vec<CaptureRemark>,
) -> Result<TimeBase, CaptureError> {
    let many = sources.len() > 1;
    let Some(spot) = parts.time else { return Ok(stated_time(sources, parts, first, end, remarks)) };
    let stamps = taken(sources, parts, spot, first, end);
    let judged = judge(&sources[spot.0], spot.1, stamps, first);
    let (time, found) = judged.map_err(|e| if many { e.within(sources[spot.0].name) } else { e })?;
    remarks.extend(found);
    for (other, source) in sources.iter().enumerate() {
        let used = parts.spots().any(|(file, _)| file == other);
        let Some(c) = source.time.filter(|_| used && other != spot.0) else { continue };
        let stamps = source.columns[c][first..end].to_vec();
        let (second, _) = judge(source, c, stamps, first).map_err(|error| error.within(source.name))?;
        // Two exports of one record round alike; half a step is more than rounding can do to a fitted base.
        let apart = (second.start - time.start).abs() + (second.step - time.step).abs() * time.n as f64;
        if apart > time.step {
            return Err(CaptureError::UnequalTimes {
                second: source.name.to_owned(),
                start: time.start,
                step: time.step,
                second_start: second.start,
                second_step: second.step,
            });
        }
    }
    Ok(time)
}

/// Seconds in one of the column's unit.
fn time_factor(source: &Source<'_>, index: usize) -> f64 {
    let column = source.layout.columns.get(index).copied().unwrap_or(0);
    let stated = || unit(source.around.text(&["horizontalunits", "xunits"], column)?);
    match source.around.labels[index].unit.clone().or_else(stated) {
        Some(ColumnUnit::Time(factor)) => factor,
        _ => 1.0,
    }
}

fn judge(
    source: &Source<'_>,
    index: usize,
    mut stamps: Vec<f64>,
    first: usize,
) -> Result<(TimeBase, Vec<CaptureRemark>), CaptureError> {
    let factor = time_factor(source, index);
    let column = source.layout.columns.get(index).copied().unwrap_or(0);
    if factor != 1.0 {
        stamps.iter_mut().for_each(|stamp| *stamp *= factor);
    }
    let line_of = |row: usize| table::locate(source.bytes, &source.layout, first + row, column).0;
    let fitted: Option<Stamps> = timebase::fit(&stamps);
    match fitted {
        Some(fitted) => fitted.judge(&stamps, source.around.step(column), line_of),
        None => Err(CaptureError::TooFew { found: stamps.len() }),
    }
}

/// The time base that a header states; else samples are counted, with a remark.
fn stated_time(
    sources: &[Source<'_>],
    parts: &Parts,
    first: usize,
    end: usize,
    remarks: &mut Vec<CaptureRemark>,
) -> TimeBase {
    let column = column_of(sources, parts.photodiode);
    let around = &sources[parts.photodiode.0].around;
    let n = end - first;
    match around.step(column) {
        Some(step) => {
            let start = around.start(column, step).unwrap_or(0.0) + first as f64 * step;
            TimeBase { start, step, n }
        }
        None => {
            remarks.push(CaptureRemark::NoTime);
            TimeBase { start: first as f64, step: 1.0, n }
        }
    }
}

/// The samples of one channel in volts, taken out of its file.
fn volts(
    sources: &mut [Source<'_>],
    parts: &Parts,
    spot: Spot,
    first: usize,
    end: usize,
    channel: &'static str,
    remarks: &mut Vec<CaptureRemark>,
) -> Vec<f64> {
    let column = column_of(sources, spot);
    let mut samples = taken(sources, parts, spot, first, end);
    let around = &sources[spot.0].around;
    let integers = samples.iter().all(|v| v.fract() == 0.0);
    let codes = around.number(&["yincrement", "yinc"], column).filter(|_| integers);
    let stated = || unit(around.text(&["verticalunits", "yunits"], column)?);
    if let Some(increment) = codes {
        // volts = (code − reference)·increment + origin, the common practice of digitizers' waveform preambles.
        let reference = around.number(&["yreference"], column).unwrap_or(0.0);
        let origin = around.number(&["yorigin", "yzero"], column).unwrap_or(0.0);
        samples.iter_mut().for_each(|v| *v = (*v - reference) * increment + origin);
    } else {
        match around.labels[spot.1].unit.clone().or_else(stated) {
            Some(ColumnUnit::Voltage(factor)) if factor != 1.0 => samples.iter_mut().for_each(|v| *v *= factor),
            Some(ColumnUnit::Other(unit)) => remarks.push(CaptureRemark::UnitOdd { channel, unit }),
            _ => {}
        }
    }
    let (low, high) = roles::extent(&samples);
    // A screen is eight or ten divisions high (common practice); integers far beyond it are codes, not volts.
    let beyond = |scale: f64| high - low > 20.0 * scale.abs();
    if codes.is_none() && integers && around.number(&["verticalscale"], column).is_some_and(beyond) {
        remarks.push(CaptureRemark::RawCodes { channel });
    }
    if let Some(levels) = roles::coarse_levels(&samples, (low, high), COARSE) {
        remarks.push(CaptureRemark::StepsCoarse { channel, levels });
    }
    samples
}
