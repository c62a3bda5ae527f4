"""Which parts of the demand model are on, and how they are set."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class ModelSettings:
    """Settings of the demand model, each a switch or a number that hold-out may choose.

    Parameters
    ----------
    temperature, common_component, shrinkage, mean_uncertainty : bool
        Parts of the model that are on.
    borrowed_days : float
        Weight of the customer class in each customer's distribution. [d]
    smoothing_h : float
        Standard deviation of the smoothing of correlation and skewness along the day. [h]
    lattice_kw : float
        Step of the lattice; 0 takes it from the meters' resolution. [kW]
    correlation : float or None
        Mean correlation between customers where they were never metered together; None takes the class's.
    beyond_metered_range : bool
        Whether days of the record outside the metered temperatures are extrapolated.
    resamples : int
        Resamples of whole weeks behind each interval; 0 makes no interval. [-]
    """

    temperature: bool = True
    common_component: bool = True
    shrinkage: bool = True
    mean_uncertainty: bool = True
    borrowed_days: float = 10.0
    smoothing_h: float = 3.0
    lattice_kw: float = 0.0
    correlation: float | None = None
    beyond_metered_range: bool = False
    resamples: int = 0
