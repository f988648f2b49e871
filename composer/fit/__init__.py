"""Fitting: the parameters of a fiber type from what a bench measured, with how well the data tell each of them."""
