"""`ginnel replay`: the chain over recorded captures."""

from __future__ import annotations

from collections.abc import Sequence
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING

import click

from ginnel.cli.options import Moment, Rate, config_option, moment_us, quiet_option, sensor_option

if TYPE_CHECKING:
    from ginnel.capture import RawFormat, Recording
    from ginnel.config import SensorSettings, Settings
    from ginnel.errors import GinnelError
    from ginnel.replay import ReplayedSpan
    from ginnel.words import Sensor


@click.command()
@click.argument("captures", metavar="CAPTURE...", nargs=-1, required=True, type=click.Path(path_type=Path))
@config_option
@sensor_option
@click.option(
    "--started-at", type=Moment(), help="When the capture begins; site time unless it has an offset."
)
@click.option(
    "--raw-format", metavar="TYPE", help="Samples of a file without a header, such as ri16_le or ci16_le."
)
@click.option("--rate", "rate_hz", type=Rate(), help="Sample rate of a file without a header, Hz.")
@quiet_option
def replay(
    captures: tuple[Path, ...],
    config_file: Path | None,
    sensor_name: str | None,
    started_at: datetime | None,
    raw_format: str | None,
    rate_hz: float | None,
    quiet: bool,
) -> None:
    """Find the passages in each CAPTURE, and log them.

    A CAPTURE is a WAV, FLAC, SigMF or raw file, or a folder of such. Files that follow on are one span.
    Replaying the same captures again changes nothing. Whatever is wrong with one file is told in a line,
    the others go on, and the exit code is 1.
    """
    from ginnel.capture import RawFormat
    from ginnel.config import load_settings

    if (raw_format is None) != (rate_hz is None):
        raise click.UsageError("--raw-format and --rate go together")
    settings = load_settings(config_file)
    config = settings.find_sensor(sensor_name)
    raw = (
        None
        if raw_format is None or rate_hz is None
        else RawFormat(sample_type=raw_format, sample_rate_hz=rate_hz)
    )
    start_us = None if started_at is None else moment_us(started_at, settings.site.timezone)
    recordings, faults = _open(captures, config.to_sensor(), start_us, raw)
    replayed, late_faults = _replay(settings, config, recordings, quiet=quiet)
    for fault in (*faults, *late_faults):
        for line in str(fault).splitlines():
            click.echo(f"ginnel: {line}", err=True)
    if not quiet:
        click.echo("\n".join(summary(config.to_sensor(), replayed)))
    if faults or late_faults:
        click.get_current_context().exit(1)


def _open(
    captures: Sequence[Path], sensor: Sensor, start_us: int | None, raw: RawFormat | None
) -> tuple[list[Recording], list[GinnelError]]:
    """Open what is good; the rest comes back as errors."""
    from ginnel.capture import find_captures, open_recording
    from ginnel.errors import CaptureError

    paths: list[Path] = []
    faults: list[GinnelError] = []
    for capture in captures:
        try:
            inside = find_captures([capture])
        except CaptureError as exc:
            faults.append(exc)
            continue
        if not inside:
            faults.append(CaptureError(f"{capture}: there are no captures in this folder"))
        paths += [path for path in inside if path not in paths]
    if start_us is not None and len(paths) > 1:
        raise click.UsageError(f"--started-at goes with one capture, and there are {len(paths)}")
    recordings: list[Recording] = []
    for path in paths:
        try:
            recordings.append(open_recording(path, sensor, started_us=start_us, raw=raw).check())
        except CaptureError as exc:
            faults.append(exc)
    return recordings, faults


def _replay(
    settings: Settings, config: SensorSettings, recordings: Sequence[Recording], *, quiet: bool
) -> tuple[list[ReplayedSpan], list[GinnelError]]:
    """Read every span and store it; what cannot be read or stored comes back as errors."""
    from ginnel.capture import arrange
    from ginnel.cli.progress import progress
    from ginnel.errors import CaptureError, StoreError
    from ginnel.replay import replay_span
    from ginnel.store import open_store, put_site

    arrangement = arrange(recordings)
    faults: list[GinnelError] = list(arrangement.refused)
    replayed: list[ReplayedSpan] = []
    if not arrangement.spans:
        return replayed, faults
    listened_s = sum(recorded.to_span().listened_s for recorded in arrangement.spans)
    with (
        open_store(settings.store.url, create=True) as store,
        progress("Replaying", listened_s, quiet=quiet) as advance,
    ):
        put_site(store, settings.site.to_site())
        for recorded in arrangement.spans:
            try:
                sensor = config.to_sensor(recorded.started_us)
                replayed.append(replay_span(store, sensor, recorded, advance))
            except (CaptureError, StoreError) as exc:
                faults.append(exc)
    return replayed, faults


def summary(sensor: Sensor, replayed: Sequence[ReplayedSpan]) -> list[str]:
    """Tell in a few lines what a replay found."""
    from ginnel.words import Direction, Story

    if not replayed:
        return [f"{sensor.name}: nothing was replayed"]

    def plural(n: int, one: str, many: str = "") -> str:
        return f"{n} {one if n == 1 else many or one + 's'}"

    listened_s = sum(one.span.listened_s for one in replayed)
    ways = [
        f"{sum(one.count(Direction.APPROACHING) for one in replayed)} {sensor.approaching_name}",
        f"{sum(one.count(Direction.RECEDING) for one in replayed)} {sensor.receding_name}",
    ]
    if unknown := sum(one.count(Direction.UNKNOWN) for one in replayed):
        ways.append(f"{unknown} of unknown direction")
    turned = sum(one.count_story(Story.TURN_BACK) for one in replayed)
    fidgets = sum(one.count_story(Story.FIDGET) for one in replayed)
    passages = sum(one.count_story(Story.PASSAGE) for one in replayed)
    added = sum(one.change.added for one in replayed)
    removed = sum(one.change.removed for one in replayed)
    kept = sum(one.change.kept for one in replayed)
    return [
        f"{sensor.name}: {plural(len(replayed), 'span')}, {listened_s / 60:.1f} min listened",
        f"  {plural(passages, 'passage')}: {', '.join(ways)}",
        f"  not counted: {plural(turned, 'turn-back')}, {plural(fidgets, 'fidget')}",
        f"  in the log: {added} added, {removed} removed, {kept} kept",
    ]
