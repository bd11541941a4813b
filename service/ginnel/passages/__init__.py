"""Spectrograms in; what moved, and which of it is a passage, out.

Knows frames, bins, metres and seconds since the span's start. Must not know files, clocks, SQL
or pages. Whole movers are fitted to the spectrogram of one cluster of activity at a time.
"""
