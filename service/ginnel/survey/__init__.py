"""Making a mounting and its counts trustworthy: what it will hear, how well it hears.

In: a sensor, its settings, samples or rows of the store. Out: frozen values with figures, verdicts and
advice. May know the chain, the statistics and the store. Must not know pages, commands or threads, so
that a terminal, a page and the daemon all show the same finding.
"""
