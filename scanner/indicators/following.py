"""Follow orbits from horizon to horizon, and leave each as soon as what it is is clear."""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np
import numpy.typing as npt

from scanner.indicators.blocks import Batch
from scanner.indicators.islands import Returns, Windings, collect_returns, wind_orbits
from scanner.indicators.readings import Readings, digits_of, read_streams
from scanner.indicators.schedule import Schedule
from scanner.indicators.verdicts import Verdicts, is_settled, judge
from scanner.quantities import CHAOTIC, REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL

Floats = npt.NDArray[np.float64]
Whole = npt.NDArray[np.int64]
Mask = npt.NDArray[np.bool_]

AT_ONCE = 2048
"""Orbits followed together: enough to keep the blocks full, few enough for what is kept of them."""


@dataclass
class Course:
    """What was found of n orbits; every array has shape (n,) but ``verdict_by_horizon``, (n, horizons).

    The numbers of a chaotic orbit are those of the common horizon, of a regular one those of the horizon at which it
    was left.  ``frequency_digits`` are those to which the leading frequency of two halves agrees: rotation number, or
    winding in an island.  The last three are NaN outside islands.
    """

    bounces: Whole
    failed: Mask
    verdict_by_horizon: npt.NDArray[np.int8]
    island_period: npt.NDArray[np.int16]
    island_rotation: npt.NDArray[np.int16]
    rotation: Floats
    frequency_digits: Floats
    agreement_digits: Floats
    exponent: Floats
    chord: Floats
    winding: Floats
    centre_turns: Floats
    centre_p: Floats

    @classmethod
    def of(cls, orbits: int, horizons: int) -> Course:
        """Room for what will be found of some orbits."""
        floats = {field.name: np.full(orbits, np.nan) for field in fields(cls) if field.type == "Floats"}
        return cls(
            bounces=np.zeros(orbits, dtype=np.int64),
            failed=np.zeros(orbits, dtype=bool),
            verdict_by_horizon=np.zeros((orbits, horizons), dtype=np.int8),
            island_period=np.zeros(orbits, dtype=np.int16),
            island_rotation=np.zeros(orbits, dtype=np.int16),
            **floats,
        )

    def note_verdicts(self, orbits: Whole, number: int, bounces: int, verdicts: Verdicts) -> None:
        """Note the verdicts at horizon ``number``; they stand at all later ones for orbits that go no further."""
        self.verdict_by_horizon[orbits, number:] = verdicts.code[:, None]
        self.bounces[orbits] = bounces
        self.island_period[orbits] = verdicts.island_period
        self.island_rotation[orbits] = verdicts.island_rotation

    def note_numbers(self, orbits: Whole, readings: Readings, verdicts: Verdicts, chosen: Mask) -> None:
        """Note the readings of the chosen ones of some orbits."""
        orbits = orbits[chosen]
        self.rotation[orbits] = readings.rotation[chosen]
        self.frequency_digits[orbits] = digits_of(readings.rotation_change[chosen])
        self.agreement_digits[orbits] = readings.digits[chosen]
        self.exponent[orbits] = readings.exponent[chosen]
        self.chord[orbits] = np.where(verdicts.is_regular, readings.chord, readings.plain_chord)[chosen]

    def note_windings(self, orbits: Whole, windings: Windings) -> None:
        """Note the motion inside islands of orbits that are left."""
        inside = orbits[~windings.resonant]
        self.winding[inside] = windings.winding[~windings.resonant]
        self.frequency_digits[inside] = digits_of(windings.change[~windings.resonant])
        self.centre_turns[inside] = windings.centre_turns[~windings.resonant]
        self.centre_p[inside] = windings.centre_p[~windings.resonant]
        outside = orbits[windings.resonant]  # on a resonant invariant curve
        verdicts = self.verdict_by_horizon[outside]
        self.verdict_by_horizon[outside] = np.where(verdicts == REGULAR_LIBRATIONAL, REGULAR_ROTATIONAL, verdicts)
        self.island_period[outside] = 0
        self.island_rotation[outside] = 0


def follow_orbits(harmonics: Floats, turns: Floats, momenta: Floats, schedule: Schedule, chord_scale: float) -> Course:
    """Follow orbits until what each of them is is clear, at most up to the last horizon.

    Parameters
    ----------
    harmonics
        Boundary, shape (4, K + 1).
    turns, momenta
        Start of each orbit, shape (n,): boundary parameter and p; n > 0.
    schedule
        Where the horizons lie.
    chord_scale
        Chords are compared in units of this.
    """
    course = Course.of(turns.size, len(schedule.horizons))
    for first in range(0, turns.size, AT_ONCE):
        part = slice(first, first + AT_ONCE)
        batch = Batch(harmonics, turns[part], momenta[part], schedule)
        stages = []
        for number in range(len(schedule.horizons)):
            stages += _visit_horizon(batch, number, first, schedule, chord_scale, course)
            if not batch.orbits.size:
                break
        if stages:
            course.note_windings(np.concatenate([stage.orbits for stage in stages]), wind_orbits(harmonics, stages))
    return course


def _visit_horizon(
    batch: Batch, number: int, first: int, schedule: Schedule, chord_scale: float, course: Course
) -> list[Returns]:
    """Bring a batch, whose orbits are numbered from ``first``, to a horizon; leave out what is clear there.

    Gives the returns of the orbits that are left in islands, if there are any.
    """
    streams = batch.advance(number)
    readings = read_streams(streams, schedule, number, chord_scale)
    verdicts = judge(readings, streams.failed)
    orbits = first + batch.orbits
    chaotic = verdicts.code == CHAOTIC
    last = number == len(schedule.horizons) - 1
    leaving = np.full(orbits.size, last)
    if schedule.adaptive:
        leaving |= is_settled(readings, verdicts) | (chaotic & (number >= schedule.common)) | streams.failed
    course.note_verdicts(orbits, number, readings.bounces, verdicts)
    # What is said of a chaotic orbit is what it did up to the common horizon, however late it is found out.
    course.note_numbers(orbits, readings, verdicts, (leaving & ~chaotic) | (number == schedule.common))
    course.failed[orbits] = streams.failed
    inside = np.flatnonzero(leaving & (verdicts.code == REGULAR_LIBRATIONAL))
    stages = []
    if inside.size:
        island = verdicts.island_period[inside].astype(np.int64), verdicts.island_rotation[inside].astype(np.int64)
        stages = [collect_returns(orbits[inside], batch.recall(inside), *island)]
        # Of the others there are too few returns to know the frequency.
        course.frequency_digits[np.setdiff1d(orbits[inside], stages[0].orbits)] = np.nan
    batch.keep(~leaving)
    return [stage for stage in stages if stage.orbits.size]
