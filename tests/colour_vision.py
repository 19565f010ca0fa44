"""Colours as normal and colour-blind eyes see them, and contrast."""

import numpy as np

# Opponent-based simulation of full dichromacy, linear RGB: G. M. Machado, M. M. Oliveira and L. A. F. Fernandes,
# IEEE Trans. Vis. Comput. Graph. 15 (2009) 1291-1298, severity 1.0 of their table of matrices (from memory).
VISION = {
    "normal": np.eye(3),
    "protan": [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]],
    "deutan": [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]],
    "tritan": [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]],
}
# Relative luminance and contrast: W3C, WCAG 2.1, 2018; sRGB to CIE XYZ: IEC 61966-2-1:1999.
TO_XYZ = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])
JUST_NOTICEABLE = 2.3  # CIELAB: M. Mahy, L. Van Eycken and A. Oosterlinck, Color Res. Appl. 19 (1994) 105-121


def linear(colour: str) -> np.ndarray:
    channel = np.array([int(colour[i : i + 2], 16) for i in (1, 3, 5)]) / 255.0
    return np.where(channel <= 0.04045, channel / 12.92, ((channel + 0.055) / 1.055) ** 2.4)


def contrast(one: str, other: str) -> float:
    dark, light = sorted(float(TO_XYZ[1] @ linear(colour)) for colour in (one, other))
    return (light + 0.05) / (dark + 0.05)


def cielab(rgb: np.ndarray) -> np.ndarray:
    ratio = TO_XYZ @ np.clip(rgb, 0.0, 1.0) / np.array([0.9505, 1.0, 1.089])
    f = np.where(ratio > 0.008856, np.cbrt(ratio), 7.787 * ratio + 16.0 / 116.0)
    return np.array([116.0 * f[1] - 16.0, 500.0 * (f[0] - f[1]), 200.0 * (f[1] - f[2])])
