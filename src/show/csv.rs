//! CSV: a header on line 1, and the notice last as a comment, so that a plain reader finds its columns.

use csv::Writer;
use serde::Serialize;

use super::{CheckReport, NOTICE};
use crate::study::NetResult;

#[derive(Serialize)]
struct HarmonicRow<'a> {
    net: &'a str,
    harmonic: usize,
    frequency_hz: f64,
    distance_m: f64,
    field_dbuv_per_m: Option<f64>,
    loop_area_dbuv_per_m: Option<f64>,
    driver_current_a: f64,
    limit: Option<&'a str>,
    limit_dbuv_per_m: Option<f64>,
    margin_db: Option<f64>,
}

/// A row for every net, harmonic and distance, with the tightest limit there. Currents are rms.
pub fn harmonics_csv(report: &CheckReport) -> String {
    let mut writer = Writer::from_writer(Vec::new());
    for net in &report.nets {
        for harmonic in &net.harmonics {
            for field in &harmonic.fields {
                let tightest = report.tightest_limit(field.distance_m, harmonic.frequency_hz);
                let level = tightest.map(|(_, level)| level);
                let row = HarmonicRow {
                    net: &net.name,
                    harmonic: harmonic.number,
                    frequency_hz: harmonic.frequency_hz,
                    distance_m: field.distance_m,
                    field_dbuv_per_m: field.field_dbuv_per_m,
                    loop_area_dbuv_per_m: field.loop_area_dbuv_per_m,
                    driver_current_a: harmonic.driver_current_a,
                    limit: tightest.map(|(limit, _)| limit.title.as_str()),
                    limit_dbuv_per_m: level,
                    margin_db: level
                        .zip(field.field_dbuv_per_m)
                        .map(|(limit, field)| limit - field),
                };
                writer.serialize(row).expect(IN_MEMORY);
            }
        }
    }
    with_notice(writer)
}

/// One settled period of a net: time, driver voltage and current, and every receiver's voltage.
pub fn waveform_csv(net: &NetResult) -> String {
    let wave = &net.waveform;
    let mut writer = Writer::from_writer(Vec::new());
    let mut header: Vec<String> = ["time_s", "driver_v", "driver_a"].map(String::from).into();
    header.extend(net.signal.receivers.iter().map(|r| format!("{}_v", r.name)));
    writer.write_record(&header).expect(IN_MEMORY);
    for (index, (driver_v, driver_a)) in wave.driver_v.iter().zip(&wave.driver_a).enumerate() {
        let mut row = vec![wave.pace.time_s(index), *driver_v, *driver_a];
        row.extend(wave.receivers_v.iter().map(|receiver| receiver[index]));
        writer.serialize(row).expect(IN_MEMORY);
    }
    with_notice(writer)
}

pub(super) const IN_MEMORY: &str = "rows of one length always fit into memory as text";

pub(super) fn with_notice(writer: Writer<Vec<u8>>) -> String {
    let bytes = writer.into_inner().expect(IN_MEMORY);
    let mut text = String::from_utf8(bytes).expect("made of text");
    text.push_str("# notice: ");
    text.push_str(NOTICE);
    text.push('\n');
    text
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::show::samples;

    #[test]
    fn a_row_for_each_harmonic_and_distance_with_its_tightest_limit() {
        let mut net = samples::net("CAM_PCLK", 48e6, 20);
        net.harmonics.truncate(1);
        net.harmonics[0].fields[0].field_dbuv_per_m = Some(31.0);
        net.harmonics[0].fields[1].field_dbuv_per_m = None;
        let text = harmonics_csv(&samples::report(vec![net]));
        let lines: Vec<&str> = text.lines().collect();
        assert_eq!(
            lines[0],
            "net,harmonic,frequency_hz,distance_m,field_dbuv_per_m,loop_area_dbuv_per_m,driver_current_a,limit,limit_dbuv_per_m,margin_db"
        );
        assert!(lines[1].starts_with("CAM_PCLK,1,48000000.0,3.0,31.0,"));
        assert!(
            lines[1].ends_with(",47 CFR 15.109 class B,40.0,9.0"),
            "{}",
            lines[1]
        );
        let far: Vec<&str> = lines[2].split(',').collect();
        assert_eq!((far[4], far[9]), ("", ""));
        assert_eq!(lines[3], format!("# notice: {NOTICE}"));
    }

    #[test]
    fn the_waveform_names_every_receiver_in_its_header() {
        let mut net = samples::net("CAM_PCLK", 48e6, 20);
        samples::add_receiver(&mut net, "U7, pin 3");
        let text = waveform_csv(&net);
        assert_eq!(
            text.lines().next(),
            Some("time_s,driver_v,driver_a,cmos-input_v,\"U7, pin 3_v\"")
        );
        assert_eq!(text.lines().count(), net.waveform.driver_v.len() + 2);
        assert_eq!(
            text.lines().last(),
            Some("# notice: pre-compliance estimate, not a compliance test")
        );
    }
}
