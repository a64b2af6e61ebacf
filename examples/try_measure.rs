//! scratch
use tubewright::{capture, sweep};
fn main() {
    let mut a = std::env::args().skip(1);
    let fsr: f64 = a.next().unwrap().parse().unwrap();
    let nominal: Option<f64> = a.next().unwrap().parse().ok();
    let names: Vec<String> = a.collect();
    for group in capture::pair_names(&names) {
        let data: Vec<(String, Vec<u8>)> =
            group.iter().map(|i| (names[*i].clone(), std::fs::read(&names[*i]).unwrap())).collect();
        let refs: Vec<(&str, &[u8])> = data.iter().map(|(n, b)| (n.as_str(), b.as_slice())).collect();
        let short = names[group[0]].rsplit('/').next().unwrap().to_owned();
        match capture::read_many(&refs, None) {
            Err(e) => println!("{short:32} UNREAD {e}"),
            Ok(c) => {
                let s = sweep::Settings {
                    free_spectral_range: fsr,
                    u_free_spectral_range: 0.0,
                    nominal_spacing: nominal,
                    mode_floor: 0.02,
                    fsr_source_id: "fsr".into(),
                };
                let t = std::time::Instant::now();
                let m = sweep::measure(&c, &s);
                let dt = t.elapsed().as_secs_f64() * 1e3;
                if let Some(r) = &m.refused {
                    println!("{short:32} REFUSED {r}   [{dt:.1} ms]");
                } else {
                    println!(
                        "{short:32} Δν {} ± {} MHz  modes {} off {} orders {} F {:.1}/{:.1} [{dt:.1} ms] {}",
                        m.mode_spacing.as_ref().map_or("-".into(), |m| format!("{:.4}", m.value / 1e6)),
                        m.mode_spacing.as_ref().map_or("-".into(), |m| format!(
                            "{:.4} ({})",
                            m.u() / 1e6,
                            m.budget
                                .iter()
                                .map(|l| format!("{:.4}", l.contribution() / 1e6))
                                .collect::<Vec<_>>()
                                .join(" ")
                        )),
                        m.modes.len(),
                        m.off_axis.len(),
                        m.order_count,
                        m.finesse.unwrap_or(0.),
                        m.finesse_apparent.unwrap_or(0.),
                        m.no_spacing.as_ref().map_or(String::new(), |r| format!("NO SPACING {r}"))
                    );
                    println!(
                        "      offs {:?}",
                        m.modes
                            .iter()
                            .map(|m| ((m.offset / 1e5).round() / 10., (m.relative_height * 1000.).round() / 1000.))
                            .collect::<Vec<_>>()
                    );
                }
                for w in &m.warnings {
                    println!("      ! {w}");
                }
            }
        }
    }
}
