//! Lenses and sensors: fields and pixel scales against worked values, and what is refused.

use loopwright::season::lens::{CameraError, Lens, Sensor};

fn lens(focal_length_mm: f64) -> Lens {
    Lens::new("test", focal_length_mm, 4.0).unwrap()
}

#[track_caller]
fn close(got: f64, expected: f64, tolerance: f64) {
    assert!(
        (got - expected).abs() <= tolerance,
        "{got} against {expected}"
    );
}

/// 2 atan(s / 2f) worked out with Python's `math`, printed to 0.001 degrees.
#[test]
fn fields_agree_with_worked_values() {
    let full_frame = Sensor::new(36.0, 24.0, 6000, 4000).unwrap();
    let field = lens(50.0).field(&full_frame);
    close(field.width.degrees(), 39.598, 0.0005);
    close(field.height.degrees(), 26.991, 0.0005);
    // 43.267 mm from corner to corner: a standard lens has about 47 degrees there (common practice, no source).
    close(field.diagonal.degrees(), 46.79, 0.01);
    let smaller = Sensor::new(23.5, 15.6, 6000, 4000).unwrap();
    let field = lens(200.0).field(&smaller);
    close(field.width.degrees(), 6.725, 0.0005);
    close(field.height.degrees(), 4.467, 0.0005);
}

/// 206 265" p / f worked out with Python's `math`.
#[test]
fn pixel_scales_agree_with_worked_values() {
    let scale = |pitch_um, focal| {
        let sensor = Sensor::from_pitch(1000, 800, pitch_um).unwrap();
        lens(focal).pixel_scale(&sensor).arcsec()
    };
    close(scale(3.76, 50.0), 15.511, 0.0005);
    close(scale(2.9, 5000.0), 0.11963, 0.000_005);
}

#[test]
fn sides_and_pitch_describe_the_same_sensor() {
    let by_pitch = Sensor::from_pitch(6000, 4000, 6.0).unwrap();
    close(by_pitch.width_mm(), 36.0, 1e-12);
    close(by_pitch.height_mm(), 24.0, 1e-12);
    close(
        Sensor::new(36.0, 24.0, 6000, 4000).unwrap().pitch_um(),
        6.0,
        1e-12,
    );
    // A data sheet that rounds its sides to 0.1 mm leaves 3.917 and 3.9 um.
    close(
        Sensor::new(23.5, 15.6, 6000, 4000).unwrap().pitch_um(),
        3.908,
        0.001,
    );
    close(lens(280.0).aperture_mm(), 70.0, 1e-12);
}

#[test]
fn lenses_that_cannot_be_are_refused_with_what_would_work() {
    let message = |focal, ratio| Lens::new("x", focal, ratio).unwrap_err().to_string();
    let zero = message(0.0, 2.8);
    assert!(
        zero.contains("focal length 0 is out of range") && zero.contains("1 to 100000 mm"),
        "{zero}"
    );
    for focal in [-50.0, f64::NAN, f64::INFINITY, 1e9] {
        assert!(message(focal, 2.8).contains("focal length"));
    }
    for ratio in [0.0, -1.0, f64::NAN, f64::INFINITY] {
        assert!(message(50.0, ratio).contains("f-ratio"));
    }
}

#[test]
fn sensors_that_cannot_be_are_refused_with_what_would_work() {
    let message = |w, h, c, r| Sensor::new(w, h, c, r).unwrap_err().to_string();
    assert!(message(0.0, 24.0, 6000, 4000).contains("sensor width"));
    assert!(message(36.0, f64::NAN, 6000, 4000).contains("sensor height"));
    assert!(message(36.0, 24.0, 0, 4000).contains("sensor columns"));
    assert!(message(36.0, 24.0, 6000, u32::MAX).contains("sensor rows"));
    let swapped = Sensor::new(36.0, 24.0, 4000, 6000).unwrap_err();
    assert!(matches!(swapped, CameraError::PixelsNotSquare { .. }));
    assert!(
        swapped.to_string().contains("9.000 x 4.000 um"),
        "{swapped}"
    );
    for pitch in [0.0, -3.0, f64::NAN] {
        assert!(
            Sensor::from_pitch(6000, 4000, pitch)
                .unwrap_err()
                .to_string()
                .contains("pixel pitch")
        );
    }
}

#[test]
fn written_lenses_and_sensors_read_back_equal_and_are_checked() {
    let lens = Lens::new("long one", 200.0, 2.8).unwrap();
    let text = ron::to_string(&lens).unwrap();
    assert_eq!(ron::from_str::<Lens>(&text).unwrap(), lens);
    let sensor = Sensor::new(36.0, 24.0, 6000, 4000).unwrap();
    assert_eq!(
        ron::from_str::<Sensor>(&ron::to_string(&sensor).unwrap()).unwrap(),
        sensor
    );
    let bad = ron::from_str::<Lens>("(name:\"x\",focal_length_mm:0,f_ratio:2)").unwrap_err();
    assert!(
        bad.to_string().contains("focal length 0 is out of range"),
        "{bad}"
    );
}
