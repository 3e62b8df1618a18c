"""Studies to start from: one for each family, with comments, ready to be estimated and swept.

The entries are kept here as text, apart from the families themselves, so that completion can list names quickly.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from scanner.errors import ScannerError

STARTS: Mapping[str, Mapping[str, str]] = MappingProxyType(
    {
        "ellipse": {"eccentricity": "{ start = 0.0, stop = 0.9, count = 10 }"},
        "radial_harmonic": {"harmonic": "2", "amplitude": "{ start = 0.0, stop = 0.18, count = 19 }"},
        "normal_harmonic": {
            "eccentricity": "0.5",
            "harmonic": "3",
            "phase": "0.0",
            "amplitude": "{ start = 0.0, stop = 0.08, count = 17 }",
        },
        "confocal_harmonic": {
            "eccentricity": "0.5",
            "harmonic": "3",
            "phase": "0.0",
            "amplitude": "{ start = 0.0, stop = 0.08, count = 17 }",
        },
        "support_harmonic": {
            "eccentricity": "0.5",
            "harmonic": "3",
            "phase": "0.0",
            "amplitude": "{ start = 0.0, stop = 0.09, count = 19 }",
        },
        "curvature_harmonic": {"harmonic": "3", "amplitude": "{ start = 0.0, stop = 0.9, count = 19 }"},
        "limacon": {"quadratic": "{ start = 0.0, stop = 0.24, count = 25 }"},
        "lame": {"exponent": "{ values = [2.0, 4.0] }", "aspect": "{ start = 0.6, stop = 1.0, count = 9 }"},
        "random_harmonic": {
            "eccentricity": "0.4",
            "decay": "3.0",
            "harmonic_max": "8",
            "realisation": "{ start = 1, stop = 10, count = 10 }",
            "amplitude": "{ values = [0.0, 0.005, 0.01, 0.02, 0.03] }",
        },
        "outline_file": {"file": '"outline.txt"', "amplitude": "{ start = 0.0, stop = 1.0, count = 11 }"},
    }
)
"""Entries of table [table] for each built-in family, in the order in which they are written."""

USERS_OWN = {"amplitude": "{ start = 0.0, stop = 0.1, count = 11 }"}

STUDY = """\
# A study of family {{ family }}: change what you like, then
#
#     {{ "%-58s" | format("scanner estimate study.toml" + allow) }} what will it cost, and are all tables convex?
#     {{ "%-58s" | format("scanner sweep study.toml --store study.zarr" + allow) }} run it; the same again carries on
#     {{ "%-58s" | format("scanner summary study.zarr") }} the table of results
{%- if family == "outline_file" %}
#
# It needs your outline first: a text file of points, x and y on each line, once round, in the folder of this file.
{%- elif module %}
#
# It needs a function of yours first, from parameters to points once round.  For a start, write this, without the marks
# in front, to {{ module }}.py in the folder that you run from:
#
#     import numpy as np
#
#     def {{ function }}(amplitude):
#         phi = 2 * np.pi * np.arange(256) / 256
#         r = 1 + amplitude * np.cos(2 * phi) + amplitude**2 * np.cos(3 * phi)
#         return np.column_stack([r * np.cos(phi), r * np.sin(phi)])
{%- endif %}

[study]
title = "A first look at {{ family | replace("_", " ") }}"
seed = 1                      # another whole number draws other initial conditions

[table]                       # each parameter is a number or swept; swept ones make a grid, in the order written
# {{ formula }}
# convex {{ convexity }}
family = "{{ family }}"
{%- for name, value, meaning in entries %}
# {{ name }}: {{ meaning }}
{{ name }} = {{ value }}
{%- endfor %}
# Tables that are not convex are recorded as such and cost nothing.
# A range is { start = ..., stop = ..., count = ... }, with spacing = "log" if wanted; a list is { values = [...] }

[orbits]
per_table = 1024              # initial conditions, evenly spread over the section: more of them for smaller errors
bounces = 8192                # the horizon: more of them where the summary's drift is larger than its error
replicates = 8                # independent scramblings of the initial conditions: the error bars
# target_error = 0.005        # go on, with twice as many orbits in all, until the regular area is known to this error
# most_per_table = 16384      #   or up to this many

# [resonances]                # periodic orbits up to this period
# period_max = 8

[resources]                   # where it runs; never changes a result
runner = "local"              # as many workers as cores, unless workers = ... says otherwise
"""


def starting_study(family: str) -> str:
    """Write a study of a family to start from.

    Raises
    ------
    ScannerError
        The family is not known.
    """
    from jinja2 import Template

    words = _own_words(family) if ":" in family else _known_words(family)
    text: str = Template(STUDY, keep_trailing_newline=True).render(family=family, **words)
    return text


def _known_words(family: str) -> dict[str, object]:
    """What the text says of a built-in family."""
    require_known(family)
    from scanner.study.convexity import CONVEXITY
    from scanner.study.parameters import describe_bounds
    from scanner.tables import FAMILIES

    known = {parameter.name: parameter for parameter in FAMILIES[family].parameters}
    return {
        "allow": "",
        "formula": FAMILIES[family].formula,
        "convexity": CONVEXITY[family].rule,
        "entries": [
            (name, value, f"{known[name].meaning}; {describe_bounds(known[name])}")
            for name, value in STARTS[family].items()
        ],
    }


def _own_words(family: str) -> dict[str, object]:
    """What the text says of a function of the user's own."""
    module, _, function = family.partition(":")
    if not all(part.isidentifier() for part in [*module.split("."), function]):
        raise ScannerError(f"family {family!r} must be module:function, for example my_tables:oval")
    return {
        "module": module.replace(".", "/"),
        "function": function,
        "allow": " --allow-code",
        "formula": "a function of your own",
        "convexity": "as far as your function makes them",
        "entries": [(name, value, "a number, as the function takes it") for name, value in USERS_OWN.items()],
    }


def require_known(family: str) -> None:
    """Refuse the name of a family that there is not."""
    from scanner.study.messages import nearest

    if family not in STARTS:
        guess = nearest(family, STARTS)
        remedy = f"did you mean {guess}?" if guess else "use one of the known ones"
        raise ScannerError(f"family {family!r} is not known: {remedy} (known: {', '.join(STARTS)}, module:function)")
