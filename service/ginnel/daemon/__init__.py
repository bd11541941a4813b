"""The year-long life: samples in, passages and coverage into the store, and word of whatever is wrong.

It joins capture, chain and store, keeps time, and starts the jobs of housekeeping. What samples mean is
the chain's business, what rows look like the store's.
"""
