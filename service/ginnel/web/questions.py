"""The questions that the dashboard answers, in the order in which they are asked."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class Question:
    """A page: its endpoint, its name in the row of questions, and the question in full."""

    endpoint: str
    name: str
    asked: str


NOW = Question(endpoint="pages.now", name="Now", asked="Is everything all right?")
BUSY = Question(endpoint="pages.busy", name="How busy", asked="How busy was it?")
FAST = Question(endpoint="pages.fast", name="How fast", asked="How fast did they go?")
FULL = Question(endpoint="pages.full", name="How full", asked="How full was it?")
SINGLE = Question(endpoint="pages.single", name="One by one", asked="What exactly passed?")
TRUST = Question(endpoint="pages.trust", name="How sure", asked="How far can this be trusted?")
TAKE = Question(endpoint="pages.take", name="Take away", asked="What would you like to take with you?")

QUESTIONS = (NOW, BUSY, FAST, FULL, SINGLE, TRUST, TAKE)

#: Two sensors beside each other: reached from the first page, not a question of its own.
SIDE = Question(endpoint="pages.side", name="Side by side", asked="How do the two compare?")
