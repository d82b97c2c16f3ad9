//! What lights the board from one place: a plane wave, or a dipole over the floor with its exact near field.

use super::lights::Scan;
use crate::radiation::vector::{cross, difference, dot, norm, scaled};
use num_complex::Complex64;

/// The fields of one source at a point.
#[derive(Clone, Copy)]
pub(super) struct Wave {
    pub(super) e: [Complex64; 3],
    /// Times the impedance of free space.
    pub(super) h: [Complex64; 3],
}

/// What lights the board from one place, in two ways.
pub(super) enum Source {
    Direction {
        k: f64,
        toward: [f64; 3],
        ways: [[f64; 3]; 2],
    },
    Dipoles {
        k: f64,
        /// Where they are and which ways they point, themselves and in the floor.
        places: [([f64; 3], [[f64; 3]; 2]); 2],
    },
}

impl Source {
    /// Two dipoles where the antenna of a scan stands.
    pub(super) fn dipoles(k: f64, scan: &Scan, angle: f64, height_m: f64) -> Self {
        let floor = scan.stand.floor;
        let at_m = scan.stand.place_m(scan.distance_m, angle, height_m);
        let ways = [scan.stand.across(angle), scan.stand.up()];
        let images = ways.map(|way| floor.image_way(way));
        Self::Dipoles {
            k,
            places: [(at_m, ways), (floor.mirrored_m(at_m), images)],
        }
    }

    /// Its waves at a point.
    pub(super) fn at(&self, point_m: [f64; 3]) -> [Wave; 2] {
        match self {
            Self::Direction { k, toward, ways } => {
                let phase = Complex64::cis(k * dot(*toward, point_m));
                ways.map(|e| Wave {
                    e: e.map(|part| phase * part),
                    h: cross(e, *toward).map(|part| phase * part),
                })
            }
            Self::Dipoles { k, places } => of_dipoles(*k, places, point_m),
        }
    }
}

fn of_dipoles(k: f64, places: &[([f64; 3], [[f64; 3]; 2]); 2], point_m: [f64; 3]) -> [Wave; 2] {
    let none = Wave {
        e: [Complex64::ZERO; 3],
        h: [Complex64::ZERO; 3],
    };
    let mut waves = [none; 2];
    for (from_m, ways) in places {
        let apart = difference(point_m, *from_m);
        let distance_m = norm(apart);
        let away = scaled(apart, 1.0 / distance_m);
        let turn = k * distance_m;
        let spread = Complex64::cis(-turn) / distance_m;
        let near = Complex64::new(0.0, -1.0 / turn);
        let nearer = 1.0 / (turn * turn);
        let across = spread * (1.0 + near - nearer);
        let along = spread * (1.0 + 3.0 * near - 3.0 * nearer);
        let magnetic = spread * (1.0 + near);
        for (wave, way) in waves.iter_mut().zip(ways) {
            let lengthwise = along * dot(away, *way);
            let turned = cross(away, *way);
            for i in 0..3 {
                wave.e[i] += across * way[i] - lengthwise * away[i];
                wave.h[i] += magnetic * turned[i];
            }
        }
    }
    waves
}
