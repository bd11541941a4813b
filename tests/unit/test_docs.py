"""Nothing a user can type or read is missing from the reference, and nothing there is made up."""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path

import click
import pytest
from pydantic import BaseModel

from ginnel.cli import main
from ginnel.cli.group import COMMANDS
from ginnel.config import Settings
from ginnel.export.columns import (
    COUNT_COLUMNS,
    HEALTH_COLUMNS,
    OCCUPANCY_COLUMNS,
    PASSAGE_COLUMNS,
    SPEED_COLUMNS,
    Column,
)

ROOT = Path(__file__).parents[2]
REFERENCE = (ROOT / "docs/reference.md").read_text("utf-8")


def part(title: str, level: int) -> str:
    """A section of the reference, up to the next heading of its level or above."""
    found = re.search(
        rf"^{'#' * level} {re.escape(title)}.*?$(.*?)(?=^#{{1,{level}}} |\Z)",
        REFERENCE,
        re.MULTILINE | re.DOTALL,
    )
    assert found is not None, f"the reference has no section {title}"
    return found[1]


def options_of(command: click.Command) -> Iterator[str]:
    for param in command.params:
        if isinstance(param, click.Option) and "--help" not in param.opts:
            yield from param.opts
    if isinstance(command, click.Group):
        for inner in command.commands.values():
            yield from options_of(inner)


def command(name: str) -> click.Command:
    assert isinstance(main, click.Group)
    found = main.get_command(click.Context(main), name)
    assert found is not None
    return found


@pytest.mark.parametrize("name", sorted(COMMANDS))
def test_every_option_is_in_its_commands_section(name: str) -> None:
    section = part(f"`ginnel {name}", 3)
    common = part("Commands", 2).split("###", 1)[0]
    for option in options_of(command(name)):
        assert re.search(rf"`{option}\b[^|`]*[`|]|`[^`|]*, `{option}", section + common), option


@pytest.mark.parametrize("name", sorted(COMMANDS))
def test_every_option_in_a_section_exists(name: str) -> None:
    known = set(options_of(command(name)))
    for option in re.findall(r"^\| `(--[a-z-]+)", part(f"`ginnel {name}", 3), re.MULTILINE):
        assert option in known


def test_every_inner_command_is_in_the_reference() -> None:
    for name in COMMANDS:
        found = command(name)
        if isinstance(found, click.Group):
            for inner in found.commands:
                assert f"`ginnel {name} {inner}`" in REFERENCE


def keys_of(model: type[BaseModel]) -> set[str]:
    schema = model.model_json_schema()
    return {key for table in (schema, *schema["$defs"].values()) for key in table.get("properties", {})}


def test_every_setting_is_in_the_reference_and_in_the_generated_file() -> None:
    from ginnel.config import default_config_text

    section, generated = part("Settings", 2), default_config_text()
    for key in keys_of(Settings):
        assert re.search(rf"[`.\[]{key}[`\]]", section), key
        assert re.search(rf"(^|[ .\[]){key}( =|\])", generated, re.MULTILINE), key


@pytest.mark.parametrize(
    ("title", "columns"),
    [
        ("passages", PASSAGE_COLUMNS),
        ("counts", COUNT_COLUMNS),
        ("speeds", SPEED_COLUMNS),
        ("occupancy", OCCUPANCY_COLUMNS),
        ("health", HEALTH_COLUMNS),
    ],
)
def test_every_column_is_in_its_table_and_no_other(title: str, columns: tuple[Column, ...]) -> None:
    table = REFERENCE.split(f"**{title}**", 1)[1].split("**", 1)[0]
    listed = {
        name
        for row in re.findall(r"^\| (`[^|]+) \|", table, re.MULTILINE)
        for name in re.findall(r"`([a-z0-9_.]+)`", row)
    }
    assert listed - {"band_..."} == {column.name for column in columns}


def test_links_between_the_documents_lead_somewhere() -> None:
    for page in (*ROOT.glob("*.md"), *ROOT.glob("docs/*.md")):
        for target in re.findall(r"\]\(([^)#]+)(?:#[^)]*)?\)", page.read_text("utf-8")):
            assert "://" in target or (page.parent / target).exists(), f"{page.name}: {target}"


def test_the_readme_has_exactly_the_two_commands_to_set_up() -> None:
    setup = (ROOT / "README.md").read_text("utf-8").split("## Two commands")[1].split("##")[0]
    assert re.findall(r"^    (\S.*)$", setup, re.MULTILINE) == ["deploy/try", "deploy/test"]
    for script in ("deploy/try", "deploy/test"):
        assert (ROOT / script).stat().st_mode & 0o111
