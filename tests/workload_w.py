"""Workload W: a study whose answer is known to 13 digits by quadrature.

d ~ lognormal(2 Hz, factor 2); FWHM g ~ normal(60 kHz, 5 kHz); SNR s ~ lognormal(30, factor 1.2);
spacing g/50; sigma = kappa sqrt(g × spacing)/s per scan of 2 s; alternating arms; ee ~ uniform(0.9, 1);
floor f ~ lognormal(0.05 Hz, factor 1.5); 5 sigma, power 0.5.
t = 8 s sigma^2/((d ee/5)^2 - f^2), infinite where the bracket is not positive.
"""

from __future__ import annotations

STUDY = """
title = "Workload W"

[goal]
kind = "detect"
significance = 5
power = 0.5
within = "30 d"

[shared]
ee = "0.9 .. 1"

[scenario.w]
splitting = { value = "2 Hz ×/ 2", of = "difference" }
line = { profile = "lorentzian", fwhm = "60(5) kHz" }
technique = { kind = "scan", snr = "30 ×/ 1.2", points = 10000, span = "200 FWHM", time = "2 s", free = [] }
samples = { ee_a = "@ee", ee_b = "@ee" }

[scenario.w.systematics]
floor = { size = "0.05 Hz ×/ 1.5", averages = "never" }
"""

DAY = 86400.0

# Quadrature to 13 digits, confirmed by 2e7 draws, with kappa rounded to 0.798 (independent of this code).
EXACT_DAYS = {"q05": 3.02497083, "q16": 7.77244289, "q50": 33.3242757, "q84": 151.146327, "q95": 458.052395}
EXACT_IN_30_DAYS = 0.471653594393
EXACT_REACHABLE = 1.0 - 0.005813961047
ROUNDED_KAPPA = 0.798
KAPPA = 0.7978845608028654  # sqrt(2/pi), infinite span
