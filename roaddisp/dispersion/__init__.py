"""The Gaussian line integral: a reference path and a fast one."""
