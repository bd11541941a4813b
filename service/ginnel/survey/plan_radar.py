"""How strong an echo is, and how strong it must be: the radar equation, noise, power density."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ginnel.doppler.kinematics import wavelength_m
from ginnel.words import FloatArray

_BOLTZMANN_J_K = 1.380649e-23  # exact (SI)
_NOISE_K = 290.0  # the temperature that noise figures refer to (IEEE)
#: Directivity of a beam of one by one degree; Kraus, Antennas, from memory. No real antenna has more.
_BEAM_SOLID_DEG2 = 41_253.0


@dataclass(frozen=True, slots=True, kw_only=True)
class RadarModule:
    """What a module's data sheet says, apart from its carrier and beam."""

    power_mw: float = 20.0
    gain_dbi: float = 8.0
    noise_figure_db: float = 20.0
    loss_db: float = 0.0  # radome, cables, polarisation; both ways together
    flicker_corner_hz: float = 0.0  # below this the mixer's noise rises as 1 / f
    lowpass_hz: float | None = None  # upper corner of the amplifier

    @property
    def eirp_dbm(self) -> float:
        """Equivalent isotropically radiated power along the beam's axis, dBm."""
        return 10 * math.log10(self.power_mw) + self.gain_dbi


@dataclass(frozen=True, slots=True, kw_only=True)
class Target:
    """Something that reflects; ``low_m2`` is what a plan should count on."""

    name: str
    low_m2: float
    usual_m2: float
    high_m2: float
    speed_mps: float  # the speed for which a plan is reckoned
    source: str


#: Speed: Weidmann, ETH IVT 90 (1993), free walking speed.
PERSON = Target(
    name="person",
    low_m2=0.495,
    usual_m2=1.0,
    high_m2=1.22,
    speed_mps=1.34,
    source="Schultz, Burgener, King, Proc. IRE 46(2), 1958: a man at 9.375 GHz, 0.495 to 1.22 m2; "
    "1 m2: Skolnik, Introduction to Radar Systems (from memory)",
)
#: Low and usual: common practice, no source. Speed: 50 km/h.
CAR = Target(
    name="car",
    low_m2=10.0,
    usual_m2=30.0,
    high_m2=100.0,
    speed_mps=50 / 3.6,
    source="100 m2: Skolnik, Introduction to Radar Systems (from memory); "
    "10 and 30 m2: common practice, no source",
)


def received_dbm(
    module: RadarModule,
    carrier_hz: float,
    section_m2: float,
    distance_m: FloatArray,
    off_axis_db: FloatArray | float = 0.0,
) -> FloatArray:
    """Power of an echo, dBm: Pt G^2 lambda^2 sigma / ((4 pi)^3 R^4 L).

    Parameters
    ----------
    section_m2 : radar cross-section, m^2
    distance_m : array, m, > 0
    off_axis_db : gain towards the target against the beam's axis, one way, dB, <= 0

    Returns
    -------
    array of the shape of ``distance_m``

    Notes
    -----
    20 mW, 8 dBi, 10.525 GHz, 1 m^2 at 10 m give -74.874 dBm.
    """
    at_1_m_dbm = (
        10 * math.log10(module.power_mw)
        + 2 * module.gain_dbi
        + 20 * math.log10(wavelength_m(carrier_hz))
        + 10 * math.log10(section_m2)
        - 30 * math.log10(4 * math.pi)
        - module.loss_db
    )
    return np.asarray(at_1_m_dbm + 2 * np.asarray(off_axis_db) - 40 * np.log10(distance_m))


def noise_dbm(module: RadarModule, bandwidth_hz: float, shift_hz: FloatArray | float = np.inf) -> FloatArray:
    """Receiver's own noise, dBm: k T0 B F, and 1 / f below the module's corner.

    Parameters
    ----------
    bandwidth_hz : noise bandwidth, Hz
    shift_hz : Doppler frequency at which it is heard, Hz, > 0; infinite for white noise only

    Notes
    -----
    A noise figure of 20 dB in 100 Hz gives -133.975 dBm. What comes in otherwise (hum, clutter, the
    converter) is not in it and sets the floor of most real modules.
    """
    white_dbm = 10 * math.log10(_BOLTZMANN_J_K * _NOISE_K * bandwidth_hz * 1e3) + module.noise_figure_db
    return np.asarray(white_dbm + 10 * np.log10(1 + module.flicker_corner_hz / np.asarray(shift_hz)))


def needed_snr_db(detection_rate: float, false_alarm_rate: float) -> float:
    """Signal to noise with which a fluctuating target is detected in one look, dB.

    Swerling's first case: Pd = Pfa^(1 / (1 + SNR)). Pd 0.9 and Pfa 1e-6 give 21.14 dB.

    Raises
    ------
    ValueError
        Not 0 < false_alarm_rate < detection_rate < 1.
    """
    if not 0 < false_alarm_rate < detection_rate < 1:
        raise ValueError(f"{false_alarm_rate=} must lie below {detection_rate=}, both in (0, 1)")
    return 10 * math.log10(math.log(false_alarm_rate) / math.log(detection_rate) - 1)


def most_gain_dbi(beam_width_deg: tuple[float, float]) -> float:
    """Most that an antenna with these half-power widths can gain, dBi."""
    return 10 * math.log10(_BEAM_SOLID_DEG2 / (beam_width_deg[0] * beam_width_deg[1]))


def power_density_w_m2(module: RadarModule, distance_m: FloatArray) -> FloatArray:
    """Power density on the beam's axis, W/m^2: EIRP / (4 pi R^2).

    In the near field, within about two diameters squared over the wavelength, it is a bound only.
    20 mW with 8 dBi give 0.01004 W/m^2 at 1 m.
    """
    eirp_w = 10 ** (module.eirp_dbm / 10) / 1e3
    return np.asarray(eirp_w / (4 * math.pi * np.asarray(distance_m) ** 2))


def field_v_m(module: RadarModule, distance_m: float) -> float:
    """Electric field on the beam's axis, rms, V/m: sqrt(30 EIRP) / R.

    20 mW with 8 dBi give 0.6486 V/m at 3 m.
    """
    return math.sqrt(30 * 10 ** (module.eirp_dbm / 10) / 1e3) / distance_m


def public_reference_w_m2(carrier_hz: float) -> float | None:
    """Reference level for local exposure of the general public, W/m^2; None up to 6 GHz and above 300.

    55 f^-0.177, f in GHz: ICNIRP 2020, over 6 to 300 GHz, mean of 6 minutes. 10.525 GHz gives 36.26.
    """
    carrier_ghz = carrier_hz / 1e9
    return 55.0 * carrier_ghz**-0.177 if 6 < carrier_ghz <= 300 else None
