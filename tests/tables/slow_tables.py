"""Slow twins of the families in mpmath: points of the boundary from the formulas as they are published."""

import mpmath as mp

mp.mp.dps = 30


def minor(eccentricity):
    return mp.sqrt(1 - mp.mpf(eccentricity) ** 2)


def ellipse(t, eccentricity):
    tau = 2 * mp.pi * t
    return mp.cos(tau), minor(eccentricity) * mp.sin(tau)


def radial_harmonic(t, amplitude, harmonic):
    phi = 2 * mp.pi * t
    r = 1 + mp.mpf(amplitude) * mp.cos(harmonic * phi)
    return r * mp.cos(phi), r * mp.sin(phi)


def limacon(t, quadratic):
    z = mp.expjpi(2 * t)
    w = z + mp.mpf(quadratic) * z * z
    return w.real, w.imag


def normal_harmonic(t, eccentricity, amplitude, harmonic, phase):
    tau, b = 2 * mp.pi * t, minor(eccentricity)
    x, y, u, v = mp.cos(tau), b * mp.sin(tau), b * mp.cos(tau), mp.sin(tau)
    height = mp.mpf(amplitude) * mp.cos(harmonic * tau + mp.mpf(phase))
    return x + height * u / mp.hypot(u, v), y + height * v / mp.hypot(u, v)


def confocal_harmonic(t, eccentricity, amplitude, harmonic, phase):
    f = 2 * mp.pi * t
    raised = mp.mpf(amplitude) * mp.cos(harmonic * f + mp.mpf(phase))
    if eccentricity == 0:
        return mp.exp(raised) * mp.cos(f), mp.exp(raised) * mp.sin(f)
    focal = mp.mpf(eccentricity)
    mu = mp.acosh(1 / focal) + raised
    return focal * mp.cosh(mu) * mp.cos(f), focal * mp.sinh(mu) * mp.sin(f)


def support_harmonic(t, eccentricity, amplitude, harmonic, phase):
    """Point with the normal that the ellipse has at eccentric angle 2 pi t."""
    b = minor(eccentricity)
    psi = mp.atan2(mp.sin(2 * mp.pi * t), b * mp.cos(2 * mp.pi * t))

    def support(angle):
        wave = mp.mpf(amplitude) * mp.cos(harmonic * angle + mp.mpf(phase))
        return mp.sqrt(mp.cos(angle) ** 2 + b**2 * mp.sin(angle) ** 2) + wave

    h, slope = support(psi), mp.diff(support, psi)
    return h * mp.cos(psi) - slope * mp.sin(psi), h * mp.sin(psi) + slope * mp.cos(psi)


def curvature_harmonic(t, amplitude, harmonic):
    """Integrated from the lowest point, (0, -1) of the undeformed circle, shifted as the closed form is."""
    psi = 2 * mp.pi * t
    radius = lambda angle: (1 + mp.mpf(amplitude) * mp.cos(harmonic * angle)) * mp.expj(angle)  # noqa: E731
    z = mp.quad(radius, mp.linspace(0, psi, 9))
    start = -1 - mp.mpf(amplitude) / (2 * (harmonic + 1)) + mp.mpf(amplitude) / (2 * (harmonic - 1))
    return z.real, z.imag + start


def lame(t, exponent, aspect):
    phi = 2 * mp.pi * t
    c, s, n = mp.cos(phi), mp.sin(phi), mp.mpf(exponent)
    r = (abs(c) ** n + abs(s) ** n) ** (-1 / n)
    return r * c, mp.mpf(aspect) * r * s
