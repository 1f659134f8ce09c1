//! Spectra of drives, their condensation and the closed forms of converters against published and independent values.
//!
//! | case | against | tolerance | source of the right side |
//! |---|---|---|---|
//! | trapezoid lines | values computed with 30 digits | 1e-9 | C. Paul, Introduction to EMC, 2006 (formula from memory), evaluated outside the project |
//! | trapezoid lines | direct integration of the pulse | 1e-12 | the definition of a Fourier coefficient |
//! | trapezoid power | mean square of the pulse | 1e-9 | Parseval |
//! | NRZ density and fractions | values computed with 30 digits | 1e-9 | J. Proakis, Digital Communications (formula from memory), evaluated outside |
//! | lines of a 127-bit sequence | values computed with 30 digits; transform of a sequence | 1e-9 | S. Golomb, Shift Register Sequences (from memory) |
//! | band limits | lower exclusive, upper inclusive | exact | Recommendation ITU-R V.431-8; Radio Regulations 2.1 |
//! | condensed band | full sum | 1e-6 | the sum itself |
//! | current into a capacitance | mean square of C dV/dt | 1e-9 | Parseval |
//! | converter | LSB and ideal ratio | 1e-10 | W. Kester, The Data Conversion Handbook, 2005 (from memory) |

use ebbmap::math::quadrature::legendre;
use ebbmap::review::drive::{Budget, Drive, Level, Load, Pattern, Pulse, Stream, TableLine, Tone};
use ebbmap::signal::combine::band_rms;
use ebbmap::signal::converter::{budget_v, ideal_snr_db, in_lsb, lsb_v, quantization_noise_v};
use ebbmap::signal::load::{admittance, current_of};
use ebbmap::signal::spectrum::{
    Limits, Line, band_current_rms, band_spectrum, lines_in_band, points_for, pulse, stream,
};
use num_complex::Complex64;
use std::f64::consts::{PI, TAU};

const EVERYTHING: Limits = Limits { from_hz: 1.0, to_hz: 1e13 };

#[track_caller]
fn near(what: &str, got: f64, want: f64, tolerance: f64) {
    let error = (got - want).abs() / want.abs();
    assert!(
        error <= tolerance,
        "{what}: got {got}, want {want}, relative error {error:.2e} > {tolerance:.0e}"
    );
}

fn unit(_: f64) -> Complex64 {
    Complex64::new(1.0, 0.0)
}

/// A pulse of 1 A; `rise_s` and `fall_s` are 0-100 % lengths.
fn trapezoid(frequency_hz: f64, duty: f64, rise_s: f64, fall_s: f64) -> Pulse {
    let level = Some(Level::Amperes(1.0));
    Pulse { frequency_hz, rise_s: 0.8 * rise_s, fall_s: 0.8 * fall_s, duty, level }
}

fn bits(bit_rate_hz: f64, edge_s: f64, pattern: Pattern) -> Stream {
    Stream { bit_rate_hz, edge_s, pattern, level: Some(Level::Amperes(1.0)) }
}

#[test]
fn trapezoid_lines_match_published_values() {
    // 2 |c_n| in volts. First: 3.3 V, 100 MHz, half the period, edges 1 ns. Second: 1 V, 25 MHz, 18 ns, 2 and 1 ns.
    let even: [(u64, f64); 8] = [
        (1, 2.06645786395),
        (3, 0.601117436017),
        (5, 0.267487924816),
        (7, 0.110409324983),
        (9, 0.0255118254809),
        (11, 0.0170781641649),
        (13, 0.0320121711488),
        (15, 0.0297208805351),
    ];
    let clock = trapezoid(100e6, 0.5, 1e-9, 1e-9);
    for (n, want) in even {
        near(&format!("line {n}"), 3.3 * 2.0 * pulse::coefficient(&clock, n).norm(), want, 1e-9);
        let product = 2.0 * 0.5 * pulse::sinc(n as f64 * 0.5).abs() * pulse::sinc(n as f64 * 0.1).abs();
        near(&format!("product {n}"), 3.3 * product, want, 1e-9);
    }
    for n in [2, 4, 6, 8, 10, 12, 14] {
        assert!(pulse::coefficient(&clock, n).norm() < 1e-18, "line {n} must vanish");
    }
    near("mean", 3.3 * pulse::coefficient(&clock, 0).re, 1.65, 1e-12);

    let lopsided: [f64; 15] = [
        0.627167537804,
        0.0973738288268,
        0.184749515195,
        0.0898193439519,
        0.0844622113887,
        0.0782592431372,
        0.036788781213,
        0.0640771653123,
        0.0117989080338,
        0.048922195141,
        0.0109979632773,
        0.0345058844565,
        0.0165961180146,
        0.02246441497,
        0.0178184527956,
    ];
    let pulse = trapezoid(25e6, 0.45, 2e-9, 1e-9);
    for (index, want) in lopsided.into_iter().enumerate() {
        let n = index as u64 + 1;
        near(&format!("line {n}"), 2.0 * pulse::coefficient(&pulse, n).norm(), want, 1e-9);
    }
    near("mean", pulse::coefficient(&pulse, 0).re, 0.45, 1e-12);
    // The rms current of a line is its amplitude over sqrt 2.
    let lines = lines_in_band(&Drive::Clock(pulse), Limits { from_hz: 3e6, to_hz: 30e6 }, &unit);
    assert_eq!(lines.len(), 1);
    near("rms", lines[0].current_rms_a, 0.627167537804 / 2f64.sqrt(), 1e-9);
}

#[test]
fn trapezoid_lines_match_direct_integration() {
    for (duty, rise, fall) in [(0.5, 0.1, 0.1), (0.45, 0.05, 0.025), (0.3, 0.2, 0.01), (0.72, 0.01, 0.33)] {
        let pulse = trapezoid(1.0, duty, rise, fall);
        // Corners over one period: the pulse is `duty` long at half height.
        let top = rise + duty - 0.5 * (rise + fall);
        let pieces = [(0.0, rise, 0.0, 1.0), (rise, top, 1.0, 1.0), (top, top + fall, 1.0, 0.0)];
        for n in [1, 2, 3, 5, 8, 13, 21] {
            let mut want = Complex64::default();
            for (from, to, low, high) in pieces {
                for (x, weight) in legendre(60) {
                    let part = 0.5 * (1.0 + x);
                    let t = from + (to - from) * part;
                    let value = low + (high - low) * part;
                    want += Complex64::cis(-TAU * n as f64 * t) * (value * 0.5 * (to - from) * weight);
                }
            }
            let got = pulse::coefficient(&pulse, n);
            assert!((got - want).norm() < 1e-12, "duty {duty} line {n}: {got} against {want}");
        }
    }
}

#[test]
fn trapezoid_power_is_its_mean_square() {
    for (duty, rise, fall) in [(0.5, 0.1, 0.1), (0.3, 0.2, 0.01)] {
        let drive = Drive::Ripple(trapezoid(1.0, duty, rise, fall));
        let sum: f64 =
            band_current_rms(&lines_in_band(&drive, Limits { from_hz: 0.0, to_hz: 2e4 }, &unit)).powi(2);
        let zero =
            band_current_rms(&lines_in_band(&drive, Limits { from_hz: 0.0, to_hz: 0.0 }, &unit)).powi(2);
        near("power", sum + zero, duty - (rise + fall) / 6.0, 1e-9);
    }
}

#[test]
fn nrz_density_and_fractions() {
    let random = bits(1.0, 0.0, Pattern::Random);
    // S/(A^2 Tb), two-sided; one-sided and with A = 1/2 the density is half of it.
    let densities = [
        (1e-12, 1.0),
        (0.1, 0.967531209275),
        (0.25, 0.810569469139),
        (0.5, 0.405284734569),
        (0.75, 0.0900632743487),
        (1.5, 0.0450316371744),
        (2.5, 0.0162113893828),
    ];
    for (f_tb, want) in densities {
        near(&format!("density at {f_tb}"), 2.0 * stream::random_density(&random, f_tb), want, 1e-9);
    }
    assert!(stream::random_density(&random, 1.0) < 1e-30);
    let power = |limits| band_current_rms(&lines_in_band(&Drive::Data(random), limits, &unit)).powi(2);
    // All of the power but the mean's is A^2 = 1/4.
    let fractions =
        [(0.5, 0.773695009903), (0.75, 0.888826984981), (1.0, 0.90282333358), (2.0, 0.949939339767)];
    for (f_tb, want) in fractions {
        near(&format!("power below {f_tb}"), 4.0 * power(Limits { from_hz: 0.0, to_hz: f_tb }), want, 1e-9);
    }
    // The power of two bands is that of both together, wherever they are cut.
    let (low, high) = (Limits { from_hz: 0.0, to_hz: 0.013 }, Limits { from_hz: 0.013, to_hz: 2.0 });
    near("cut", 4.0 * (power(low) + power(high)), 0.949939339767, 1e-9);
    near("mean", power(Limits { from_hz: 0.0, to_hz: 0.0 }), 0.25, 1e-12);
    // Edges take power away: with edges as long as a bit the density falls as sinc^4, integral 2/3 of the whole.
    let soft = bits(1.0, 0.8, Pattern::Random);
    let all =
        band_current_rms(&lines_in_band(&Drive::Data(soft), Limits { from_hz: 0.0, to_hz: 2e3 }, &unit))
            .powi(2);
    near("soft edges", 4.0 * all, 2.0 / 3.0, 1e-9);
}

#[test]
fn prbs_lines_match_published_values() {
    let prbs = bits(127.0, 0.0, Pattern::Prbs { order: 7 });
    // power/A^2, two-sided.
    let lines = [
        (1, 0.00793439727722),
        (10, 0.00777545812922),
        (32, 0.00641089626368),
        (64, 0.00316580263755),
        (100, 0.000497466596616),
        (190, 0.000359200210621),
    ];
    let got = lines_in_band(&Drive::Data(prbs), Limits { from_hz: 0.0, to_hz: 200.0 }, &unit);
    for (k, want) in lines {
        near(&format!("line {k}"), 2.0 * stream::sequence_line(&prbs, 127, k), want, 1e-9);
        // Line 127 is silent and therefore absent.
        let index = if k < 127 { k as usize - 1 } else { k as usize - 2 };
        near("frequency", got[index].frequency_hz, k as f64, 1e-12);
        near("listed", 2.0 * got[index].current_rms_a.powi(2), want, 1e-9);
    }
    assert_eq!(stream::sequence_line(&prbs, 127, 127), 0.0);
}

#[test]
fn prbs_lines_match_a_sequence() {
    // x^7 + x^6 + 1, a primitive polynomial (common practice for test sequences).
    let mut register = 1u32;
    let sequence: Vec<f64> = (0..127)
        .map(|_| {
            let bit = ((register >> 6) ^ (register >> 5)) & 1;
            register = ((register << 1) | bit) & 0x7f;
            f64::from(bit)
        })
        .collect();
    assert_eq!(sequence.iter().sum::<f64>(), 64.0);
    let (rate_hz, whole_edge) = (1.0, 0.3);
    let prbs = bits(rate_hz, 0.8 * whole_edge, Pattern::Prbs { order: 7 });
    for k in [0u64, 1, 2, 9, 63, 64, 100, 126, 128, 200, 300] {
        // Coefficient of the waveform: the held bit, smeared over the edge, times the sequence's transform.
        let f = k as f64 / 127.0;
        let sum: Complex64 =
            sequence.iter().enumerate().map(|(i, bit)| bit * Complex64::cis(-TAU * f * i as f64)).sum();
        let sinc = |x: f64| if x == 0.0 { 1.0 } else { (PI * x).sin() / (PI * x) };
        let c = sum / 127.0 * sinc(f) * sinc(f * whole_edge);
        let one_sided = if k == 0 { 1.0 } else { 2.0 };
        near(&format!("line {k}"), stream::sequence_line(&prbs, 127, k), one_sided * c.norm_sqr(), 1e-9);
    }
    // So many lines that they are taken as a density: the same power as a short sequence's lines have per hertz.
    let long = bits(1.0, 0.1, Pattern::Prbs { order: 31 });
    let random = bits(1.0, 0.1, Pattern::Random);
    let limits = Limits { from_hz: 0.2, to_hz: 0.9 };
    let power = |stream| band_current_rms(&lines_in_band(&Drive::Data(stream), limits, &unit));
    near("long sequence", power(long), power(random), 1e-9);
    near("middle sequence", power(bits(1.0, 0.1, Pattern::Prbs { order: 20 })), power(random), 1e-5);
}

#[test]
fn bands_exclude_their_lower_and_include_their_upper_limit() {
    let clock = Drive::Ripple(trapezoid(3e6, 0.4, 1e-9, 2e-9));
    let frequencies = |from_hz, to_hz| -> Vec<f64> {
        lines_in_band(&clock, Limits { from_hz, to_hz }, &unit).iter().map(|line| line.frequency_hz).collect()
    };
    assert_eq!(frequencies(0.3e6, 3e6), [3e6]);
    let hf = frequencies(3e6, 30e6);
    // every fifth line of a 40 % pulse nearly vanishes but not quite with unequal edges
    assert_eq!((hf[0], hf[hf.len() - 1], hf.len()), (6e6, 30e6, 9));
    assert_eq!(frequencies(30e6, 300e6)[0], 33e6);
    // 0.1 MHz is no binary fraction of 0.3 MHz; rounding must not move the line over the limit.
    let slow = Drive::Ripple(trapezoid(0.1e6, 0.3, 1e-9, 2e-9));
    let first = |limits| lines_in_band(&slow, limits, &unit).first().map(|line: &Line| line.frequency_hz);
    near("first above", first(Limits { from_hz: 0.3e6, to_hz: 3e6 }).unwrap(), 0.4e6, 1e-12);
    assert_eq!(lines_in_band(&slow, Limits { from_hz: 0.03e6, to_hz: 0.3e6 }, &unit).len(), 3);
    let tone = |frequency_hz| {
        Drive::Tone(Tone { frequency_hz, bandwidth_hz: 0.0, level: Some(Level::Amperes(2.0)) })
    };
    let hf = Limits { from_hz: 3e6, to_hz: 30e6 };
    assert!(lines_in_band(&tone(3e6), hf, &unit).is_empty());
    assert_eq!(lines_in_band(&tone(30e6), hf, &unit)[0].current_rms_a, 2.0);
    let table = Drive::Spectrum(
        [(0.0, 1.0), (30e6, 2.0), (3e6, 3.0), (5e6, 4.0)]
            .map(|(frequency_hz, current_rms_a)| TableLine { frequency_hz, current_rms_a })
            .to_vec(),
    );
    let lines = lines_in_band(&table, hf, &unit);
    assert_eq!(lines.iter().map(|line| line.current_rms_a).collect::<Vec<_>>(), [4.0, 2.0]);
    let zero = lines_in_band(&table, Limits { from_hz: 0.0, to_hz: 0.0 }, &unit);
    assert_eq!((zero.len(), zero[0].current_rms_a), (1, 1.0));
}

#[test]
fn a_wide_tone_shares_its_power_among_bands() {
    let tone =
        Drive::Tone(Tone { frequency_hz: 300e3, bandwidth_hz: 40e3, level: Some(Level::Amperes(0.02)) });
    let power =
        |from_hz, to_hz| band_current_rms(&lines_in_band(&tone, Limits { from_hz, to_hz }, &unit)).powi(2);
    near("LF", power(30e3, 300e3), 0.5 * 0.0004, 1e-12);
    near("MF", power(300e3, 3e6), 0.5 * 0.0004, 1e-12);
    near("slice", power(310e3, 3e6), 0.25 * 0.0004, 1e-12);
    assert_eq!(power(3e6, 30e6), 0.0);
}

#[test]
fn condensed_bands_match_the_full_sum() {
    // Relaxations with corners from far below to far above the band, and a square root of frequency like a skin effect.
    let corners: [f64; 6] = [1e3, 1e5, 1e6, 1e7, 1e8, 1e10];
    let transfer = |f: f64| -> Vec<Complex64> {
        let mut values: Vec<Complex64> =
            corners.iter().map(|corner| 1.0 / Complex64::new(1.0, f / corner)).collect();
        values.push(1.0 / (1.0 + Complex64::new(0.0, f / 1e7).sqrt()));
        values.push(Complex64::new(0.0, f / 1e7) / Complex64::new(1.0, f / 1e7));
        values
    };
    let level = Some(Level::Amperes(0.01));
    let clock = Pulse { frequency_hz: 1e3, rise_s: 5e-9, fall_s: 3e-9, duty: 0.37, level };
    let data = Stream { bit_rate_hz: 115_200.0, edge_s: 4e-9, pattern: Pattern::Random, level };
    let prbs = Stream { bit_rate_hz: 10e6, edge_s: 1e-9, pattern: Pattern::Prbs { order: 15 }, level };
    let drives = [Drive::Clock(clock), Drive::Data(data), Drive::Data(prbs)];
    let bands = [(3e5, 3e6), (3e6, 30e6), (30e6, 300e6), (1e5, 1e8), (0.0, 1e7)];
    for drive in &drives {
        for (from_hz, to_hz) in bands {
            let limits = Limits { from_hz, to_hz };
            let full = lines_in_band(drive, limits, &unit);
            let mut want = vec![0.0; corners.len() + 2];
            for line in &full {
                for (sum, value) in want.iter_mut().zip(transfer(line.frequency_hz)) {
                    *sum += line.current_rms_a.powi(2) * value.norm_sqr();
                }
            }
            let tolerance = 1e-6;
            let spectrum = band_spectrum(drive, limits, &unit, tolerance);
            assert_eq!(spectrum.line_count, full.len() as u64);
            near("band current", spectrum.current_rms_a, band_current_rms(&full), 1e-12);
            near("points' current", band_current_rms(&spectrum.points), band_current_rms(&full), 1e-9);
            assert!(spectrum.points.len() <= points_for(full[0].frequency_hz, to_hz, tolerance));
            let got = band_rms(&spectrum, |f| Ok::<_, String>(transfer(f))).unwrap();
            let largest = want.iter().fold(0.0, |a: f64, b| a.max(*b)).sqrt();
            for (index, (got, want)) in got.rms.iter().zip(&want).enumerate() {
                let error = (got - want.sqrt()).abs() / want.sqrt();
                println!(
                    "{} {from_hz:.0e}-{to_hz:.0e}: {} lines, {} points, transfer {index}: {error:.1e} ({:.1e} of largest)",
                    drive.kind(),
                    full.len(),
                    spectrum.points.len(),
                    (got - want.sqrt()).abs() / largest
                );
                assert!(error < 10.0 * tolerance, "transfer {index}: {got} against {}", want.sqrt());
            }
        }
    }
}

#[test]
fn band_fields_add_in_power() {
    // Two lines and a field that is a known function: hand calculation.
    let table = Drive::Spectrum(vec![
        TableLine { frequency_hz: 1e6, current_rms_a: 3e-3 },
        TableLine { frequency_hz: 2e6, current_rms_a: 4e-3 },
    ]);
    let spectrum = band_spectrum(&table, Limits { from_hz: 3e5, to_hz: 3e6 }, &unit, 1e-6);
    assert!(!spectrum.is_condensed());
    near("band current", spectrum.current_rms_a, 5e-3, 1e-12);
    let field = |f: f64| Ok::<_, String>(vec![Complex64::new(f / 1e6, 0.0), Complex64::new(0.0, 100.0)]);
    let band = band_rms(&spectrum, field).unwrap();
    near("rising", band.rms[0], (9e-6f64 + 16e-6 * 4.0).sqrt(), 1e-12);
    near("flat", band.rms[1], 0.5, 1e-12);
    near("flat per ampere", band.per_ampere()[1], 100.0, 1e-12);
    let failed = band_rms(&spectrum, |f| if f > 1.5e6 { Err("no solution") } else { Ok(vec![unit(f)]) });
    assert_eq!(failed, Err("no solution"));
    // A band that holds nothing has an empty field.
    let nothing = band_spectrum(&table, Limits { from_hz: 3e6, to_hz: 3e7 }, &unit, 1e-6);
    assert_eq!((nothing.current_rms_a, nothing.points.len()), (0.0, 0));
}

#[test]
fn a_capacitance_draws_the_slope_of_the_voltage() {
    let (volts, farad) = (3.3, 5e-12);
    let clock = Pulse {
        frequency_hz: 8e6,
        rise_s: 1.6e-9,
        fall_s: 2.4e-9,
        duty: 0.5,
        level: Some(Level::Volts(volts)),
    };
    let load = Load { capacitance_f: farad, ..Load::default() };
    let lines = lines_in_band(&Drive::Clock(clock), EVERYTHING, &|f| admittance(&load, f).unwrap());
    // Mean square of C dV/dt: slopes V/tr and V/tf for tr and tf each period, tr = 2 ns, tf = 3 ns.
    let want = (farad * volts).powi(2) * (1.0 / 2e-9 + 1.0 / 3e-9) * 8e6;
    // Lines above the cut, with sin^2 at its mean of one half: (f0 C V)^2 (1/r^2 + 1/q^2)/(pi^2 N), r = tr f0, q = tf f0.
    let (last, r, q) = (1.25e6 + 0.5, 2e-9 * 8e6, 3e-9 * 8e6);
    let rest = (8e6 * farad * volts).powi(2) * (1.0 / (r * r) + 1.0 / (q * q)) / (PI * PI * last);
    near("rms", (band_current_rms(&lines).powi(2) + rest).sqrt(), want.sqrt(), 1e-9);
    // Each line by hand: I = j 2 pi f C V.
    let c = std::f64::consts::SQRT_2 * volts * pulse::coefficient(&clock, 3);
    let by_hand = current_of(c, 1.0 / Complex64::new(0.0, TAU * 24e6 * farad));
    let third = lines.iter().find(|line| line.frequency_hz == 24e6).unwrap();
    near("third line", third.current_rms_a, by_hand.norm(), 1e-12);
    let turn = (third.phase_rad.unwrap() - by_hand.arg()).rem_euclid(TAU);
    assert!(turn.min(TAU - turn) < 1e-12);
}

#[test]
fn series_and_termination_limit_the_current() {
    // 33 ohm into 50 ohm at low frequency; 33 ohm alone at high frequency, where the capacitance shorts.
    let load = Load { series_ohm: 33.0, termination_ohm: Some(50.0), capacitance_f: 5e-12 };
    near("low", admittance(&load, 1.0).unwrap().norm(), 1.0 / 83.0, 1e-9);
    near("high", admittance(&load, 1e15).unwrap().norm(), 1.0 / 33.0, 1e-6);
    // by hand at 1/(2 pi 50 ohm 5 pF): shunt (1 + j)/50 S, Z = 33 + 25 - 25j
    let corner = 1.0 / (TAU * 50.0 * 5e-12);
    near("corner", 1.0 / admittance(&load, corner).unwrap().norm(), (58.0f64.powi(2) + 625.0).sqrt(), 1e-12);
    assert_eq!(admittance(&Load::default(), 1e6), Some(Complex64::default()));
    assert!(admittance(&Load { termination_ohm: Some(0.0), ..Load::default() }, 1e6).is_none());
}

#[test]
fn converter_steps_and_ratios() {
    // LSB in uV for (full scale in V, bits).
    let steps = [
        (1.0, 8, 3906.25),
        (1.0, 24, 0.0596046447754),
        (1.8, 10, 1757.8125),
        (2.048, 12, 500.0),
        (2.5, 16, 38.1469726562),
        (3.3, 12, 805.6640625),
        (3.3, 20, 3.14712524414),
        (5.0, 18, 19.0734863281),
    ];
    for (full_scale_v, bits, want) in steps {
        near(&format!("{full_scale_v} V {bits} bit"), 1e6 * lsb_v(full_scale_v, bits), want, 1e-10);
    }
    let ratios = [(8, 49.9257118968), (12, 74.0081115499), (16, 98.090511203), (24, 146.255310509)];
    for (bits, want) in ratios {
        near(&format!("{bits} bit ratio"), ideal_snr_db(bits), want, 1e-10);
        near("rule", ideal_snr_db(bits), 6.02 * f64::from(bits) + 1.76, 2e-4);
        let sine = 2.5 / (2.0 * 2f64.sqrt());
        near("from noise", 20.0 * (sine / quantization_noise_v(2.5, bits)).log10(), want, 1e-10);
    }
    let budget = Budget::Converter { bits: 12, full_scale_v: 2.048, lsb: 0.5 };
    near("budget", budget_v(&budget), 250e-6, 1e-12);
    assert_eq!(in_lsb(&budget, 1e-3), Some(2.0));
    assert_eq!((budget_v(&Budget::Volts(5e-7)), in_lsb(&Budget::Volts(5e-7), 1.0)), (5e-7, None));
}
