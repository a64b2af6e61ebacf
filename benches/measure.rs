//! Times reading and measuring of simulated captures of 20,000 samples on one core, beside a laboratory's script on the same files.
//! Must not gate: times depend on the machine, whose name is printed with them. Only ratios may gate.
//! Main function: `main`. Run with `cargo bench --bench measure`; see the modes at `main`.

use std::fs;
use std::hint::black_box;
use std::path::{Path, PathBuf};
use std::process::{Command, ExitCode};
use std::time::{Duration, Instant};

use tubewright::capture;
use tubewright::instruments::{CaptureHead, simulated_csv};
use tubewright::phantom::{Scenario, Setting, World};
use tubewright::sweep::{Settings, measure};

/// Captures, and samples of each.
const N_CAPTURES: usize = 200;
const N_SAMPLES: usize = 20_000;
/// Samples of the long capture.
const LONG: usize = 5_000_000;
/// A four-mode tube of the demo scenario, and its type's spacing, Hz.
const SERIAL: &str = "DEMO-0003";
const NOMINAL: f64 = 399.7e6;
/// First capture after first light, and time from one to the next, ms: a few walk cycles, so that the comb is seen at
/// many phases.
const FIRST_MS: i64 = 600_000;
const EVERY_MS: i64 = 1_000;
/// Captures a second in live use.
const LIVE: u32 = 50;

/// A capture as a digitizer's export: name and bytes.
type Export = (String, Vec<u8>);

/// Without arguments: times, then the script's. `--sustained SECONDS`: [`LIVE`] captures a second. `--long`: one capture
/// of five million samples and the memory it takes.
fn main() -> ExitCode {
    let arguments: Vec<String> = std::env::args().skip(1).filter(|a| a != "--bench").collect();
    let scenario = Scenario::demo();
    let Some(world) = scenario.world(SERIAL, None) else {
        eprintln!("the demo scenario has no tube {SERIAL}");
        return ExitCode::FAILURE;
    };
    if arguments.first().is_none_or(|argument| argument != "--read") {
        println!("machine   {}", machine());
    }
    let ran = match arguments.first().map(String::as_str) {
        None => exports(&scenario, &world, N_CAPTURES, N_SAMPLES).and_then(|exports| beside(&exports, &world)),
        Some("--sustained") => {
            let seconds = arguments.get(1).and_then(|s| s.parse().ok()).unwrap_or(60);
            exports(&scenario, &world, N_CAPTURES, N_SAMPLES).and_then(|exports| sustained(&exports, &world, seconds))
        }
        Some("--long") => exports(&scenario, &world, 1, LONG).and_then(|exports| long(&exports, &world)),
        Some("--read") => read_alone(arguments.get(1).map_or("", String::as_str), &world),
        Some(other) => Err(format!("unknown argument {other}; expected none, --sustained SECONDS or --long")),
    };
    match ran {
        Ok(()) => ExitCode::SUCCESS,
        Err(why) => {
            eprintln!("{why}");
            ExitCode::FAILURE
        }
    }
}

fn settings(world: &World) -> Settings {
    Settings {
        free_spectral_range: world.bench().free_spectral_range,
        u_free_spectral_range: 0.003,
        nominal_spacing: Some(NOMINAL),
        mode_floor: 0.02,
        fsr_source_id: "bench".to_owned(),
    }
}

/// Times of this program, then of the script, and what each found.
fn beside(exports: &[Export], world: &World) -> Result<(), String> {
    let folder = std::env::temp_dir().join(format!("tubewright-bench-{}", std::process::id()));
    fs::create_dir_all(&folder).map_err(|error| format!("cannot make {}: {error}", folder.display()))?;
    let done = times(exports, world, &folder);
    // Best effort: what is left is in the system's own folder for such files.
    let _ = fs::remove_dir_all(&folder);
    done
}

fn times(exports: &[Export], world: &World, folder: &Path) -> Result<(), String> {
    let settings = settings(world);
    let bytes: usize = exports.iter().map(|(_, bytes)| bytes.len()).sum();
    println!("captures  {} of {N_SAMPLES} samples, {SERIAL}, {bytes} bytes", exports.len());
    let mut paths = Vec::new();
    for (name, bytes) in exports {
        let path = folder.join(name);
        fs::write(&path, bytes).map_err(|error| format!("cannot write {}: {error}", path.display()))?;
        paths.push(path);
    }
    let (mut reading, mut measuring, mut both) = (Watch::default(), Watch::default(), Watch::default());
    let mut captures = Vec::new();
    for (name, bytes) in exports {
        captures.push(reading.time(|| capture::read(name, bytes, None)).map_err(|error| error.to_string())?);
    }
    let found: Vec<_> = captures.iter().map(|capture| measuring.time(|| measure(capture, &settings))).collect();
    for path in &paths {
        both.time(|| {
            let bytes = fs::read(path).unwrap_or_default();
            let read = capture::read("c.csv", &bytes, None).ok()?;
            Some(measure(&read, &settings))
        });
    }
    reading.report("read", bytes);
    measuring.report("measure", bytes);
    both.report("both, from disk", bytes);
    let truth = world.comb().mode_spacing();
    let spacings: Vec<Option<f64>> =
        found.iter().map(|m| m.mode_spacing.as_ref().map(|spacing| spacing.value)).collect();
    answers("this program", &spacings, truth);
    match script(&paths, world) {
        Ok(theirs) => {
            answers("the script", &theirs.spacings, truth);
            theirs.both.report("script, from disk", bytes);
            let ratio = theirs.both.median().as_secs_f64() / both.median().as_secs_f64();
            let (read, rest) = (theirs.reading.median(), theirs.measuring.median());
            println!("script    {:.2} ms reading, {:.2} ms measuring", ms(read), ms(rest));
            println!(
                "ratio     {ratio:.1} by the clock (medians of whole captures, one core each, same files, same run)"
            );
            if both.on_core > Duration::ZERO {
                let ratio = theirs.both.on_core.as_secs_f64() / both.on_core.as_secs_f64();
                println!("ratio     {ratio:.1} by processor time, which a busy machine changes less");
            }
        }
        Err(why) => println!("script    not run: {why}"),
    }
    Ok(())
}

/// What the script said of every file.
#[derive(Default)]
struct Theirs {
    spacings: Vec<Option<f64>>,
    reading: Watch,
    measuring: Watch,
    both: Watch,
}

/// Runs the laboratory's script on the files, held to one thread as this program is.
fn script(paths: &[PathBuf], world: &World) -> Result<Theirs, String> {
    let script = Path::new(env!("CARGO_MANIFEST_DIR")).join("benches/reference.py");
    let mut command = Command::new("python3");
    for threads in ["OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"] {
        command.env(threads, "1");
    }
    command.arg(script).arg(world.bench().free_spectral_range.to_string()).arg(NOMINAL.to_string()).args(paths);
    let output = command.output().map_err(|error| format!("python3: {error}"))?;
    if !output.status.success() {
        let said = String::from_utf8_lossy(&output.stderr);
        return Err(format!(
            "python3 with numpy, scipy and pandas is needed: {}",
            said.lines().last().unwrap_or_default()
        ));
    }
    let mut theirs = Theirs::default();
    for line in String::from_utf8_lossy(&output.stdout).lines() {
        let value: serde_json::Value = serde_json::from_str(line).map_err(|error| format!("{error}: {line}"))?;
        let seconds = |key: &str| Duration::from_secs_f64(value[key].as_f64().unwrap_or(0.0));
        theirs.spacings.push(value["spacing_hz"].as_f64());
        theirs.reading.times.push(seconds("read_s"));
        theirs.measuring.times.push(seconds("measure_s"));
        theirs.both.times.push(seconds("read_s") + seconds("measure_s"));
        theirs.both.on_core += seconds("cpu_s");
        theirs.reading.on_core += seconds("read_cpu_s");
    }
    Ok(theirs)
}

fn answers(who: &str, spacings: &[Option<f64>], truth: f64) {
    let found: Vec<f64> = spacings.iter().flatten().map(|s| (s - truth) / 1e3).collect();
    // A script that lays one capture's orders wrong is out by megahertz: medians say what it usually does.
    let mut sizes: Vec<f64> = found.iter().map(|off| off.abs()).collect();
    sizes.sort_by(f64::total_cmp);
    let middle = sizes.get(sizes.len() / 2).copied().unwrap_or(f64::NAN);
    let ninth = sizes.get(sizes.len() * 9 / 10).copied().unwrap_or(f64::NAN);
    println!(
        "answers   {who}: {} of {} with a spacing, |error| {middle:.0} kHz in the median, {ninth:.0} kHz for 9 of 10",
        found.len(),
        spacings.len()
    );
}

/// Fifty captures a second, each read and measured as it comes; how busy one core is, and what came late.
fn sustained(exports: &[Export], world: &World, seconds: u32) -> Result<(), String> {
    let settings = settings(world);
    let every = Duration::from_secs(1) / LIVE;
    let begun = Instant::now();
    let (mut busy, mut late, mut worst) = (Duration::ZERO, 0_u32, Duration::ZERO);
    let mut cpu = Watch::default();
    for k in 0..seconds * LIVE {
        let due = every * k;
        std::thread::sleep(due.saturating_sub(begun.elapsed()));
        let (name, bytes) = &exports[k as usize % exports.len()];
        let one = Instant::now();
        cpu.time(|| capture::read(name, bytes, None).map(|read| measure(&read, &settings)))
            .map_err(|error| error.to_string())?;
        busy += one.elapsed();
        // Late: not done before the next one came.
        let behind = begun.elapsed().saturating_sub(due + every);
        late += u32::from(behind > Duration::ZERO);
        worst = worst.max(behind);
    }
    println!(
        "sustained {LIVE} captures of {N_SAMPLES} samples a second for {seconds} s on one core: busy {:.1} % of the time, \
         {late} of {} late, the worst by {:.1} ms",
        100.0 * busy.as_secs_f64() / begun.elapsed().as_secs_f64(),
        seconds * LIVE,
        ms(worst)
    );
    cpu.report("each", 0);
    Ok(())
}

/// One long capture: times, and how much memory it takes against its own numbers.
fn long(exports: &[Export], world: &World) -> Result<(), String> {
    let Some((name, bytes)) = exports.first() else { return Err("no capture".to_owned()) };
    let path = std::env::temp_dir().join(format!("tubewright-long-{}.csv", std::process::id()));
    fs::write(&path, bytes).map_err(|error| format!("cannot write {}: {error}", path.display()))?;
    let columns = 3 + usize::from(world.bench().analyser.is_some());
    println!(
        "capture   {name}: {LONG} samples, {} bytes; {columns} columns are {} kB of numbers",
        bytes.len(),
        columns * LONG * 8 / 1024
    );
    // A process of its own, so that what made the capture is not counted.
    let program = std::env::current_exe().map_err(|error| error.to_string())?;
    let ran = Command::new(program).arg("--read").arg(&path).output().map_err(|error| error.to_string());
    let _ = fs::remove_file(&path);
    print!("{}", String::from_utf8_lossy(&ran?.stdout));
    Ok(())
}

/// Reads and measures one file, and prints times and the most memory the process ever held.
fn read_alone(path: &str, world: &World) -> Result<(), String> {
    let begun = Instant::now();
    let bytes = fs::read(path).map_err(|error| error.to_string())?;
    let read = capture::read("long.csv", &bytes, None).map_err(|error| error.to_string())?;
    drop(bytes);
    let read_at = Instant::now();
    let found = measure(&read, &settings(world));
    println!(
        "read      {:.2} s, then measured in {:.2} s",
        (read_at - begun).as_secs_f64(),
        read_at.elapsed().as_secs_f64()
    );
    println!("found     {:?} Hz for {}", found.mode_spacing.map(|s| s.value), world.comb().mode_spacing());
    let status = fs::read_to_string("/proc/self/status").unwrap_or_default();
    let peak = status.lines().find_map(|line| line.strip_prefix("VmHWM:")).map_or("unknown", str::trim);
    println!("memory    {peak} at most, the text of the file among it");
    Ok(())
}

/// The captures as a digitizer's exports.
fn exports(scenario: &Scenario, world: &World, captures: usize, samples: usize) -> Result<Vec<Export>, String> {
    let setting = Setting { lit: true, ..Setting::default() };
    let export = |k: usize| {
        let at_ms = FIRST_MS + k as i64 * EVERY_MS;
        let trace = world.capture(at_ms, samples, setting)?;
        let head = CaptureHead {
            captured_at: scenario.started_at,
            number: k as u64,
            polarizer: None,
            power: world.power(at_ms, 100, setting),
            run_current: world.run_current(at_ms, setting),
        };
        Some((format!("c{k:05}.csv"), simulated_csv(&trace, &head)))
    };
    (0..captures).map(|k| export(k).ok_or_else(|| format!("capture {k} was lost"))).collect()
}

/// Times of single captures, by the clock and by the processor.
#[derive(Default)]
struct Watch {
    times: Vec<Duration>,
    on_core: Duration,
}

impl Watch {
    fn time<T>(&mut self, work: impl FnOnce() -> T) -> T {
        let (begun, core) = (Instant::now(), on_core());
        let done = black_box(work());
        self.times.push(begun.elapsed());
        self.on_core += on_core().saturating_sub(core);
        done
    }

    fn median(&self) -> Duration {
        self.share(0.5)
    }

    fn share(&self, share: f64) -> Duration {
        let mut sorted = self.times.clone();
        sorted.sort();
        sorted.get((share * sorted.len() as f64) as usize).copied().unwrap_or_default()
    }

    /// One line: median, first and ninth decile by the clock; mean of processor time where the system tells it; bytes a second.
    fn report(&self, what: &str, bytes: usize) {
        let n = self.times.len().max(1) as f64;
        let rate = |each: f64| bytes as f64 / n / each / 1e6;
        let median = self.median().as_secs_f64();
        let mut line = format!(
            "{what:<18} {:.3} ms a capture (median), {:.3} (1 of 10 below), {:.3} (9 of 10 below)",
            1e3 * median,
            ms(self.share(0.1)),
            ms(self.share(0.9))
        );
        if bytes > 0 {
            line += &format!(", {:.0} MB/s", rate(median));
        }
        if self.on_core > Duration::ZERO {
            line += &format!("; {:.3} ms of processor time (mean)", ms(self.on_core) / n);
        }
        println!("{line}");
    }
}

fn ms(time: Duration) -> f64 {
    time.as_secs_f64() * 1e3
}

/// Time this thread has spent on a core; zero where the system does not tell.
fn on_core() -> Duration {
    let text = fs::read_to_string("/proc/thread-self/schedstat").unwrap_or_default();
    let nanoseconds = text.split(' ').next().and_then(|n| n.parse().ok()).unwrap_or(0);
    Duration::from_nanos(nanoseconds)
}

/// Name of the machine, its processor and how many of them, as far as the system says.
fn machine() -> String {
    let name = fs::read_to_string("/proc/sys/kernel/hostname").unwrap_or_default();
    let processors = fs::read_to_string("/proc/cpuinfo").unwrap_or_default();
    let model =
        processors.lines().find_map(|line| line.strip_prefix("model name")?.split(": ").nth(1)).unwrap_or("unknown");
    let n = std::thread::available_parallelism().map_or(0, usize::from);
    let name = if name.trim().is_empty() { "unnamed" } else { name.trim() };
    format!("{name}: {model}, {n} processors, {}", std::env::consts::OS)
}
