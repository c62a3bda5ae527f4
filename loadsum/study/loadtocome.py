"""Tables of the study file about load to come and the laws drawn beside it."""

from dataclasses import dataclass

from loadsum.study.keys import key


@dataclass(frozen=True, slots=True, kw_only=True)
class ScenarioKeys:
    """``[[scenario]]``: one future of the load; what it adds stands under [[addition]]."""

    name: str = key(
        "Name of the scenario.", example='"20 chargers, diversified"', advice="give the scenario a name of its own"
    )
    note: str = key("What it assumes, in words, and who says so.", default="")
    first_year: int = key("Year from which growth is counted. [-]", default=0, at_least=0, example="2031")
    horizon_years: int = key("Years of growth to look at. [a]", default=0, at_least=0, at_most=60, example="20")
    growth_pct_per_year: float = key("Growth of the load there is, compound. [%/a]", default=0.0, above=-100.0)
    growth_of: str = key(
        "What grows.",
        default="every reading",
        choices=("every reading", "number of customers", "customer class"),
    )
    growth_class: str = key("Customer class that grows, in number or in its readings.", default="")
    pickup_factor: float = key(
        "Demand just after an outage over the demand it would have been; 0 where no pickup is studied. [-]",
        default=0.0,
        at_least=0.0,
    )
    pickup_h: float = key("How long the pickup lasts. [h]", default=0.0, at_least=0.0)
    outages_per_year: float = key(
        "Outages a year that are long enough for a pickup; 0 where unknown. [1/a]", default=0.0, at_least=0.0
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Addition:
    """``[[addition]]``: what a scenario adds; without a scenario, what headroom is counted in."""

    name: str = key(
        "What is added.", example='"charger 7.2 kW"', advice="say what is added, in the words the report shall use"
    )
    scenario: str = key("Scenario it belongs to; headroom is counted in it when left out.", default="")
    kind: str = key(
        "Customers of a class, devices each by its own law, or a block of load.",
        default="device",
        choices=("customers", "device", "block"),
    )
    count: int = key("How many. [-]", default=1, at_least=0)
    customer_class: str = key("Class of the customers.", default="")
    annual_kwh: float = key(
        "Energy of each customer per year; 0 takes the class as metered. [kWh]", default=0.0, at_least=0.0
    )
    kw: float = key("Power of one while it is on, negative where it generates. [kW]", default=0.0)
    share_by_hour: tuple[float, ...] = key(
        "Probability that one is on in each of the 24 hours of the day; always on when left out. [-]",
        default=(),
        at_least=0.0,
        at_most=1.0,
    )
    profile: str = key(
        "Delimited text with the demand of one in kW: a header, then one row a day of a name and equal intervals.",
        default="",
    )
    synchronised: bool = key(
        "Whether all are on at the same time (timer, start of a tariff, the same sun): added as one block.",
        default=False,
    )
    seasons: tuple[str, ...] = key("Seasons in which it is there; all when empty.", default=())
    hours: tuple[int, ...] = key(
        "Hours of the day at which it is there; all when empty.", default=(), at_least=0, at_most=23
    )
    source: str = key("Where the figures come from.", default="")


@dataclass(frozen=True, slots=True, kw_only=True)
class Velander:
    """``[velander]``: the user's coefficients of the two-term law, drawn beside the maximum demand of the class."""

    k1_kw_per_kwh: float = key("Coefficient of the energy per year. [kW/kWh]", default=0.0, at_least=0.0)
    k2_kw_per_sqrt_kwh: float = key(
        "Coefficient of the square root of the energy per year. [kW/√kWh]", default=0.0, at_least=0.0
    )
    source: str = key("Where the coefficients come from.", default="")


@dataclass(frozen=True, slots=True, kw_only=True)
class Rusck:
    """``[rusck]``: the user's coincidence of very many customers in the square-root law."""

    coincidence_of_many: float = key(
        "Coincidence factor that very many customers approach; 0 where the law is not drawn. [-]",
        default=0.0,
        at_least=0.0,
        at_most=1.0,
    )
    source: str = key("Where the figure comes from.", default="")


@dataclass(frozen=True, slots=True, kw_only=True)
class DiversityTable:
    """``[[diversity_table]]``: a table of factors that the user works with, drawn beside the readings."""

    name: str = key("Name of the table.", example='"company standard 7"', advice="name the table")
    customers: tuple[int, ...] = key(
        "Smallest number of customers of each row, rising. [-]", at_least=1, advice="list the numbers of customers"
    )
    factor: tuple[float, ...] = key("Factor of each row. [-]", above=0.0, advice="list the factors")
    kind: str = key(
        "Whether the sum of individual maxima is multiplied or divided by the factor.",
        choices=("coincidence factor", "diversity factor"),
        advice='"coincidence factor" multiplies, "diversity factor" divides the sum of individual maxima',
    )
    source: str = key("Where the table comes from.", default="")
