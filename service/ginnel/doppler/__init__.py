"""Samples in, a whitened spectrogram and what stands out of it, out.

Knows frequencies, speeds and sample numbers. Must not know files, clocks, SQL or what a
passage is, so that the same code serves live listening, replay and tests.
"""
