"""How often a depth is exceeded: annual exceedance probability and return period, and the way between them."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

from basinrain.errors import JobError, Problem, unknown

__all__ = ["ANNUAL_MAXIMUM", "PARTIAL_DURATION", "SERIES", "Frequency", "reduced_variate"]

ANNUAL_MAXIMUM: Final = "annual-maximum"
"""Series of the greatest depth of every year; its return periods are above one year."""

PARTIAL_DURATION: Final = "partial-duration"
"""Series of all depths over a threshold; its return periods are any above zero."""

SERIES: Final = (ANNUAL_MAXIMUM, PARTIAL_DURATION)
"""The kinds of series that return periods are counted in."""


@dataclass(frozen=True, order=True)
class Frequency:
    """How often a depth is exceeded, counted in one kind of series.

    Parameters
    ----------
    return_period : float
        Years; above 1 in an annual maximum series, above 0 in a partial duration series.
    series : str
        One of :data:`SERIES`.

    Raises
    ------
    JobError
        The return period is no number that its series can have; the series is not known.

    Notes
    -----
    The two series differ for what is not rare. One is brought to the other by AEP = 1 - exp(-1/T) (Langbein, W. B.,
    1949: Annual floods and the partial-duration flood series, Transactions of the American Geophysical Union, 30).
    With it the Gumbel reduced variate of a partial-duration return period is its logarithm.

    Examples
    --------
    >>> Frequency(10.0, "annual-maximum").aep
    0.1
    >>> [round(Frequency(years, "partial-duration").aep, 4) for years in (0.5, 2, 10)]
    [0.8647, 0.3935, 0.0952]
    >>> round(Frequency(2.0, "partial-duration").to("annual-maximum").return_period, 3)
    2.541
    >>> Frequency(1.0, "annual-maximum")
    Traceback (most recent call last):
        ...
    basinrain.errors.JobError: return period: found 1 years of an annual maximum series; expected more than 1; \
shorter ones are of a partial duration series
    """

    return_period: float
    series: str

    def __post_init__(self) -> None:
        if self.series not in SERIES:
            raise JobError(unknown("series", self.series, SERIES))
        annual = self.series == ANNUAL_MAXIMUM
        if not math.isfinite(self.return_period) or self.return_period <= (1 if annual else 0):
            kind = "an annual maximum series" if annual else "a partial duration series"
            raise JobError(
                Problem(
                    item="return period",
                    found=f"{self.return_period:g} years of {kind}",
                    expected="more than 1" if annual else "more than 0",
                    remedy="shorter ones are of a partial duration series" if annual else "correct it",
                )
            )

    @classmethod
    def of_aep(cls, aep: float) -> Frequency:
        """Return the frequency of an annual exceedance probability, a fraction.

        Raises
        ------
        JobError
            It is not between 0 and 1, both excluded.

        Examples
        --------
        >>> Frequency.of_aep(0.02).return_period
        50.0
        >>> Frequency.of_aep(2)
        Traceback (most recent call last):
            ...
        basinrain.errors.JobError: annual exceedance probability: found 2; expected a fraction between 0 and 1; \
write 0.02 for 2 %
        """
        if not 0 < aep < 1:
            percent = 1 < aep < 100
            raise JobError(
                Problem(
                    item="annual exceedance probability",
                    found=f"{aep:g}",
                    expected="a fraction between 0 and 1",
                    remedy=f"write {aep / 100:g} for {aep:g} %" if percent else "correct it",
                )
            )
        return cls(1 / aep, ANNUAL_MAXIMUM)

    @property
    def aep(self) -> float:
        """The annual exceedance probability; of a partial duration series by Langbein's relation."""
        if self.series == ANNUAL_MAXIMUM:
            return 1 / self.return_period
        return -math.expm1(-1 / self.return_period)

    @property
    def variate(self) -> float:
        """The Gumbel reduced variate, the same in both series."""
        return reduced_variate(self.aep) if self.series == ANNUAL_MAXIMUM else math.log(self.return_period)

    def to(self, series: str) -> Frequency:
        """Return the same frequency counted in another series, by Langbein's relation."""
        if series == self.series:
            return self
        if series == ANNUAL_MAXIMUM:
            return Frequency(1 / self.aep, series)
        return Frequency(-1 / math.log1p(-self.aep), series)

    @property
    def written_aep(self) -> float:
        """The AEP for files, to 12 digits; NaN for a partial duration series, whose source states none.

        Examples
        --------
        >>> Frequency.of_aep(0.07).written_aep, Frequency(10.0, "partial-duration").written_aep
        (0.07, nan)
        """
        return _written(self.aep) if self.series == ANNUAL_MAXIMUM else math.nan

    @property
    def written_years(self) -> float:
        """The return period for files, years, without what a division leaves behind the twelfth digit.

        Examples
        --------
        >>> Frequency.of_aep(0.07).written_years, Frequency.of_aep(0.01).written_years
        (14.2857142857, 100.0)
        """
        return _written(self.return_period)

    @property
    def label(self) -> str:
        """The frequency in words, for files and figures."""
        if self.series == ANNUAL_MAXIMUM:
            return f"AEP {self.aep:.4g} (1 in {self.return_period:.4g})"
        return f"{self.return_period:.4g}-year, partial duration"

    @property
    def short_label(self) -> str:
        """The frequency in as few letters as can be, where another place says what it is counted in.

        Examples
        --------
        >>> Frequency.of_aep(0.01).short_label, Frequency(2.0, "partial-duration").short_label
        ('1 in 100', '2-year')
        """
        years = f"{self.return_period:.4g}"
        return f"1 in {years}" if self.series == ANNUAL_MAXIMUM else f"{years}-year"


def _written(value: float) -> float:
    return float(f"{value:.12g}")


def reduced_variate(aep: float) -> float:
    """Return the Gumbel reduced variate of an annual exceedance probability: -ln(-ln(1 - AEP)).

    Examples
    --------
    >>> round(reduced_variate(0.01), 4)
    4.6001
    """
    return -math.log(-math.log1p(-aep))
