//! The engine on a net.

use ringfield::board::Net;
use ringfield::ringing::{Network, Settled, settle};
use ringfield::spectrum::{Spectrum, spectrum};

/// A net as a circuit with its settled period, settled or not.
pub fn march(net: &Net, top_hz: f64) -> (Network, Settled) {
    let network = Network::of(net);
    let settled = settle(&network, top_hz);
    (network, settled)
}

/// The same; it has to settle.
pub fn settled(net: &Net, top_hz: f64) -> (Network, Settled) {
    let (network, settled) = march(net, top_hz);
    assert!(settled.report.settled, "{}: {:?}", net.name, settled.report);
    (network, settled)
}

/// The harmonics of a net, which has to settle.
pub fn harmonics(net: &Net, lowest_hz: f64, top_hz: f64) -> Spectrum {
    let (network, settled) = settled(net, top_hz);
    spectrum(&network, &settled, lowest_hz, top_hz)
}
