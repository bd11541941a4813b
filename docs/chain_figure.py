"""Draws docs/chain.png: one recording as the chain sees it, stage by stage.

python docs/chain_figure.py RECORDING.wav [OUTPUT.png], with the dependency group `figure` installed; for the
picture in the guide: 08-uncontrol-3-2cars-towards.wav of the roadside recordings (see tests/real).
"""

from __future__ import annotations

import sys
from pathlib import Path

import matplotlib as mpl
import numpy as np
import soundfile

from ginnel.doppler.cfar import ca_multiplier
from ginnel.doppler.frontend import CELL_FALSE_ALARM_RATE, FrontEnd, SpectrumBatch, broadband_rise
from ginnel.passages.activity import ActivityStage
from ginnel.passages.cluster import Cluster
from ginnel.passages.explain import explain
from ginnel.passages.mover import Mover, line_of
from ginnel.passages.site import Site
from ginnel.passages.stories import tell
from ginnel.words import Aspect, FloatArray, Mounting, Sensor, Story

mpl.use("Agg")
from matplotlib import pyplot as plt

SENSOR = Sensor(
    name="roadside",
    carrier_hz=24.125e9,
    min_speed_mps=2.0,
    max_speed_mps=25.0,
    mounting=Mounting(aspect=Aspect.OBLIQUE, height_m=1.0, offset_m=4.5, beam_angle_deg=10.0),
)
N_LOOKS = 100  # of the background, for the gate drawn here


def heard(samples: FloatArray, rate_hz: float) -> tuple[Site, list[SpectrumBatch], list[Mover]]:
    """Run front end, activity, fit and stories; give the movers that are passages."""
    front = FrontEnd(SENSOR, rate_hz)
    batches = front.push(samples.astype(np.float32)) + front.finish()
    site = Site(SENSOR, front.plan)
    activity = ActivityStage(site.frame_rate_hz, CELL_FALSE_ALARM_RATE, int(front.watched.sum()))
    stretches = [stretch for batch in batches for stretch in activity.push(batch)] + activity.finish()
    movers = []
    for stretch in stretches:
        cluster = Cluster(site, stretch.first_frame_idx, stretch.power, stretch.background, front.watched)
        movers += [told.one.mover for told in tell(site, explain(cluster)) if told.story is Story.PASSAGE]
    return site, batches, movers


def draw(path: Path, output: Path) -> None:
    """Draw spectrogram, background, detections, and fitted movers with their crossings."""
    samples, rate_hz = soundfile.read(path, dtype="float32", always_2d=True)
    site, batches, movers = heard(samples[:, 0], rate_hz)
    power = np.concatenate([batch.power for batch in batches])
    background = batches[-1].background
    gate = ca_multiplier(N_LOOKS, CELL_FALSE_ALARM_RATE)
    detected = power > gate * background * broadband_rise(power, background)
    times_s = np.arange(len(power)) / site.frame_rate_hz
    speeds_mps = (np.arange(power.shape[1]) + site.plan.first_bin_idx) / site.bins_per_mps
    figure, axes = plt.subplot_mosaic(
        [["heard", "background"], ["told", "."]],
        figsize=(9.5, 6.0),
        width_ratios=(4, 1),
        layout="constrained",
    )
    level_db = 10 * np.log10(power / np.median(background))
    axes["heard"].pcolormesh(times_s, speeds_mps, level_db.T, vmin=-3, vmax=45, cmap="Greys", rasterized=True)
    axes["heard"].set(title="Spectrogram", ylabel="radial speed, m/s")
    axes["background"].plot(10 * np.log10(background / np.median(background)), speeds_mps, color="#0072b2")
    axes["background"].set(title="Background", xlabel="dB")
    frame, column = np.nonzero(detected)
    axes["told"].plot(times_s[frame], speeds_mps[column], ",", color="#999999")
    for mover in movers:
        line = line_of(site, mover, times_s)
        seen = line.log_power > 0.0
        axes["told"].plot(times_s[seen], line.centre[seen] / site.bins_per_mps, color="#d55e00")
        axes["told"].axvline(mover.crossed_s, color="#0072b2", linestyle=":")
    axes["told"].set(
        title="Detections (grey), fitted movers (lines), crossings (dotted)",
        xlabel="time, s",
        ylabel="radial speed, m/s",
    )
    for one in ("heard", "told"):
        axes[one].set(xlim=(0, times_s[-1]), ylim=(0, 16))
    axes["background"].set_ylim(0, 16)
    figure.savefig(output, dpi=90)


if __name__ == "__main__":
    draw(Path(sys.argv[1]), Path(sys.argv[2] if len(sys.argv) > 2 else "docs/chain.png"))
