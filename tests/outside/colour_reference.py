"""Reference values of the colour tests in src/figure/scale_tests.rs.

colorspacious 1.1 (CIELAB under D65, Machado et al. 2009 dichromacy) and scikit-image (CIEDE2000)
are general-purpose colour libraries from the package registry:

    pip install colorspacious scikit-image
    python3 colour_reference.py
"""
import numpy as np
from colorspacious import cspace_convert
from skimage.color import deltaE_ciede2000

LAB = {"name": "CIELab", "XYZ100_w": "D65"}
samples = ["0e5560", "c8582f", "f4f3ef", "78222e", "8cc4dd"]
rgb = [np.array([int(h[k:k + 2], 16) for k in (0, 2, 4)]) / 255 for h in samples]
lab = [cspace_convert(c, "sRGB1", LAB) for c in rgb]
for h, l in zip(samples, lab):
    print("lab", h, np.round(l, 3).tolist())
for a, b in [(0, 1), (1, 3), (2, 4), (0, 4)]:
    print("ciede2000", samples[a], samples[b], round(float(deltaE_ciede2000(lab[a], lab[b])), 4))
for kind in ("protanomaly", "deuteranomaly"):
    for h, c in zip(samples[:2], rgb):
        seen = cspace_convert(c, {"name": "sRGB1+CVD", "cvd_type": kind, "severity": 100}, "sRGB1")
        print(kind, h, np.round(seen, 4).tolist())
