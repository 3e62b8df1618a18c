"""What stands on axes and colour bars: words with the trade's symbols, and units where there are any."""

from __future__ import annotations

import textwrap

import xarray as xr

PARAMETERS = {
    "amplitude": r"amplitude $\varepsilon$",
    "eccentricity": r"eccentricity $e$",
    "harmonic": r"harmonic $k$",
    "quadratic": r"quadratic coefficient $\lambda$",
    "harmonic_max": r"highest harmonic $k_\mathrm{max}$",
    "p_bin": r"$p = \sin\chi$",
    "period": r"island period $q$",
    "replicate": "replicate",
    "horizon": "bounces judged",
}

QUANTITIES = {
    "regular_area_fraction": r"regular fraction of section area",
    "regular_volume_fraction": r"regular fraction of shell volume $\rho_1$",
    "chaotic_area_fraction": "chaotic fraction of section area",
    "undecided_area_fraction": "undecided fraction of section area",
    "rotational_area_fraction": "rotational fraction of section area",
    "librational_area_fraction": "librational fraction of section area",
    "regular_area_fraction_by_p": "regular fraction of section area",
    "island_area_fraction": r"section area in period-$q$ islands",
    "lyapunov_per_bounce": r"Lyapunov exponent $\lambda$ per bounce",
    "lyapunov_per_length": r"Lyapunov exponent $\lambda/\langle\ell\rangle$",
    "entropy_per_bounce": r"entropy $h$ per bounce",
    "diffusion_median": r"median $\log_{10}|\Delta\nu|$",
    "frequency_diffusion": r"frequency diffusion $\log_{10}|\Delta\nu|$",
    "mean_chord": r"mean chord $\langle\ell\rangle$",
    "mean_chord_exact": r"mean chord $\pi A/L$",
    "perimeter": r"perimeter $L$",
    "area": r"area $A$",
    "curvature_min": r"smallest curvature $\kappa_\mathrm{min}$",
    "curvature_max": r"largest curvature $\kappa_\mathrm{max}$",
}

ARC_LENGTH = r"arc length $s/L$"
MOMENTUM = r"$p = \sin\chi$"
ROTATION = "rotation number"
VERDICTS = {
    "regular_rotational": "regular, rotational",
    "regular_librational": "regular, librational",
    "chaotic": "chaotic",
    "undecided": "undecided",
}


def parameter_label(name: str) -> str:
    """Label of a swept parameter or of a further dimension."""
    return PARAMETERS.get(name, _plain(name))


def quantity_label(variable: xr.DataArray, width: int = 46) -> str:
    """Label of a stored variable, with its units where it has any, wrapped to about `width` letters a line."""
    name = str(variable.name)
    label = QUANTITIES.get(name) or str(variable.attrs.get("long_name", _plain(name)))
    units = str(variable.attrs.get("units", "1"))
    powers = {"length": "length", "length2": "length$^2$", "length-1": "1/length"}
    return "\n".join(textwrap.wrap(label, width)) + (f" ({powers.get(units, units)})" if units != "1" else "")


def starts_at_zero(name: str) -> bool:
    """Tell whether a variable is an exponent or a fraction, which are read against zero."""
    return "_fraction" in name or name.startswith(("lyapunov", "entropy"))


def _plain(name: str) -> str:
    return name.replace("_", " ").replace("$", r"\$")
