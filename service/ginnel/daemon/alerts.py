"""Word of conditions to people, wherever the Apprise library can send it."""

from __future__ import annotations

import logging
from collections.abc import Sequence

from ginnel.words import Condition, Severity

log = logging.getLogger(__name__)


def send_alerts(urls: Sequence[str], site_name: str, changes: Sequence[Condition]) -> bool:
    """Send one message about conditions that were raised or cleared; tells whether all of it went out.

    What cannot be sent is logged, without the addresses: they hold passwords.
    """
    try:
        from apprise import Apprise, NotifyType
    except ModuleNotFoundError:
        log.error("[notify] needs the Apprise library: pip install apprise")
        return False
    raised = [one for one in changes if one.cleared_us is None]
    kind = NotifyType.SUCCESS
    if raised:
        worst = any(one.severity is Severity.FAILURE for one in raised)
        kind = NotifyType.FAILURE if worst else NotifyType.WARNING
    sender = Apprise()
    for number, url in enumerate(urls, 1):
        if not sender.add(url):
            log.error("address %d of [notify] urls is none that Apprise knows", number)
    sent = bool(sender.notify(body=message(changes), title=f"Ginnel at {site_name}", notify_type=kind))
    if not sent:
        log.error("word of %d conditions could not be sent to all of [notify]", len(changes))
    return sent


def message(changes: Sequence[Condition]) -> str:
    """One line for each change; what to do where something is wrong."""
    return "\n".join(
        f"{one.sentence} {one.advice}" if one.cleared_us is None else f"Over: {one.sentence}"
        for one in changes
    )
