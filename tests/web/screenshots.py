"""Pictures of every page, desk and phone, light and dark: ``python -m tests.web.screenshots DIR``.

Over the demo's drawn weeks, or over the store of other settings: ``... DIR --config ginnel.toml``.
"""

from __future__ import annotations

import argparse
import tempfile
from pathlib import Path
from typing import Literal

from playwright.sync_api import Browser, sync_playwright
from tests.web.conftest import CHROMIUM, serving

from ginnel.config import Settings, load_settings
from ginnel.demo import draw_weeks, prepare

WEEK = "show=week&on=2026-04-06"
MONTH = "show=month&on=2026-03-01"
PAGES = {
    "now": "",
    "busy-day": "busy?on=2026-04-14",
    "busy-week": f"busy?{WEEK}",
    "busy-month": f"busy?{MONTH}",
    "busy-year": "busy?show=year&on=2026-01-01",
    "busy-clock-change": "busy?on=2026-03-29",
    "fast": f"fast?{MONTH}",
    "full": "full?on=2026-04-14",
    "one-by-one": "one-by-one?on=2026-04-14&hour=08",
    "sure": f"sure?{MONTH}",
    "take-away": f"take-away?{WEEK}",
    "side-by-side": f"side-by-side?{WEEK}&with=yard-gate",
}
Scheme = Literal["light", "dark"]
LOOKS: dict[str, tuple[int, int, Scheme]] = {
    "desk": (1280, 900, "light"),
    "dark": (1280, 900, "dark"),
    "phone": (390, 844, "light"),
}


def main() -> None:
    """Read the command line and take the pictures."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("folder", type=Path)
    parser.add_argument("--config", type=Path)
    parser.add_argument("--only", help="pages whose name has this in it")
    asked = parser.parse_args()
    asked.folder.mkdir(parents=True, exist_ok=True)
    with tempfile.TemporaryDirectory() as place, sync_playwright() as playwright:
        if asked.config:
            settings = load_settings(asked.config)
        else:
            settings = prepare(Path(place))
            draw_weeks(settings)
        browser = playwright.chromium.launch(
            executable_path=CHROMIUM,
            args=["--no-sandbox", "--disable-gpu", "--disable-background-networking"],
        )
        take(settings, browser, asked.folder, asked.only or "")
        browser.close()


def take(settings: Settings, browser: Browser, folder: Path, only: str) -> None:
    """Take a picture of each page in each look."""
    with serving(settings) as server:
        for look, (width, height, scheme) in LOOKS.items():
            context = browser.new_context(viewport={"width": width, "height": height}, color_scheme=scheme)
            page = context.new_page()
            for name, address in PAGES.items():
                if only not in name:
                    continue
                page.goto(server.address + address)
                if page.locator("main[data-charts]").count():
                    page.wait_for_selector("main[data-drawn]", timeout=60_000)
                    page.wait_for_timeout(250)
                page.screenshot(path=folder / f"{name}-{look}.png", full_page=True)
            context.close()


if __name__ == "__main__":
    main()
