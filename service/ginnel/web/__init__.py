"""The dashboard: answers as pages.

In come the small tables of `reports`, out go HTML, and JSON for the charts. It knows no SQL and does
no sums, so that a page never says anything that an exported file would not. It listens on the loopback
address, and everything a page needs comes from this machine.
"""
