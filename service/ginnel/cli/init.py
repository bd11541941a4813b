"""`ginnel init`: settings to begin with, and an empty store."""

from __future__ import annotations

from pathlib import Path

import click

from ginnel.cli.options import quiet_option


@click.command()
@click.argument("folder", metavar="[DIR]", default=".", type=click.Path(path_type=Path, file_okay=False))
@click.option("--site", default="My site", show_default=True, help="What the place is called.")
@click.option("--timezone", help="IANA zone of the place; without it this machine's own.")
@quiet_option
def init(folder: Path, site: str, timezone: str | None, quiet: bool) -> None:
    """Write a commented ginnel.toml and an empty store into DIR (here without one).

    A ginnel.toml that is there already is left alone, and that is an error.
    """
    from ginnel.config import DEFAULT_FILE, default_config_text, load_settings
    from ginnel.errors import ConfigError
    from ginnel.store import open_store, put_site

    file = folder / DEFAULT_FILE
    text = default_config_text(site, timezone or machine_zone())
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with file.open("x", encoding="utf-8") as target:
            target.write(text)
    except FileExistsError as exc:
        raise ConfigError(f"{file} is there already; it was left as it is") from exc
    except OSError as exc:
        raise ConfigError(f"{file} cannot be written: {exc.strerror}") from exc
    try:
        settings = load_settings(file)
    except ConfigError:
        file.unlink()
        raise
    with open_store(settings.store.url, create=True) as store:
        put_site(store, settings.site.to_site())
    if not quiet:
        click.echo(f"{file} is written; say there how the sensor is mounted.")
        click.echo(f"The store is {settings.store.url}")


def machine_zone() -> str:
    """IANA zone that this machine is set to, as far as it tells; UTC otherwise."""
    target = Path("/etc/localtime")
    if target.is_symlink():
        _, found, zone = str(target.resolve()).partition("/zoneinfo/")
        if found and "/" in zone and zone != "Etc/UTC":
            return zone
    return "UTC"
