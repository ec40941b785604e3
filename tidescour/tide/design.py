"""How well the samples of a record tell its constituents apart."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from tidescour.tide.library import constituent_frequencies
from tidescour.units import SECONDS_PER_HOUR, FloatArray

SAMPLES_PER_BLOCK: Final = 20_000


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DesignCondition:
    """Condition number of a fit, and the two constituents (or the mean) that are hardest to tell apart."""

    number: float
    pair: tuple[str, str]


def design_condition(time_s: FloatArray, constituents: Sequence[str]) -> DesignCondition:
    """Condition number of the least squares of a mean and cosines at given times, columns of unit length.

    It is 1 where all are told apart completely, about 7 for S2 with K2 in 30 days, and without bound where two are
    one and the same in the record. Nodal corrections, slow as they are, are left out.

    Parameters
    ----------
    time_s : (n,) array
        Times of the good samples, seconds since 1970, finite.
    constituents : sequence of str
        What is fitted freely, at least one.

    Returns
    -------
    DesignCondition
        `number` is at least 1, infinite where rounding hides the smallest singular value.
    """
    names = ("the mean", *constituents)
    frequencies = constituent_frequencies(constituents)
    middle_s = 0.5 * (time_s[0] + time_s[-1])
    gram = np.zeros((2 * len(names) - 1, 2 * len(names) - 1))
    for first in range(0, time_s.size, SAMPLES_PER_BLOCK):
        time_h = (time_s[first : first + SAMPLES_PER_BLOCK] - middle_s) / SECONDS_PER_HOUR
        angle = 2.0 * np.pi * np.outer(time_h, frequencies)
        block = np.hstack((np.ones((time_h.size, 1)), np.cos(angle), np.sin(angle)))
        gram += block.T @ block
    # A sine column can vanish (a constituent at the Nyquist frequency): its length is then taken as that of rounding.
    lengths = np.sqrt(np.maximum(np.diag(gram), np.finfo(np.float64).tiny))
    values, vectors = np.linalg.eigh(gram / np.outer(lengths, lengths))
    cosine, sine = vectors[1 : len(names), 0], vectors[len(names) :, 0]
    weight = np.concatenate((vectors[:1, 0] ** 2, cosine**2 + sine**2))
    second, largest = np.argsort(weight)[-2:]
    number = float(np.sqrt(values[-1] / values[0])) if values[0] > 0.0 else float("inf")
    return DesignCondition(number=number, pair=(names[largest], names[second]))
