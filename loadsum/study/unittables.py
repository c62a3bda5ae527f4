"""The tables of the study file that are about the transformer: its record, allowed loading, criteria."""

from dataclasses import dataclass

from loadsum.study.keys import key


@dataclass(frozen=True, slots=True, kw_only=True)
class Transformer:
    """``[transformer]``, or ``[[transformer]]`` for several: the unit in service or the ratings to choose from."""

    id: str = key("Asset number.", default="")
    ratings_kva: tuple[float, ...] = key("Ratings to compare. [kVA]", default=(), above=0.0, example="[15, 25, 37.5]")
    series: str = key(
        "Published preferred series of ratings instead of a list.",
        default="",
        choices=("single-phase 60 Hz", "three-phase 60 Hz"),
    )
    installed_kva: float = key("Rating in service; 0 where the unit is new. [kVA]", default=0.0, at_least=0.0)
    phases: int = key("Number of phases.", default=1, choices=("1", "3"))
    power_factor: float = key(
        "Power factor of the group where reactive power is not metered.", default=0.0, at_least=0.0, at_most=1.0
    )
    power_factor_source: str = key("Where the power factor comes from.", default="")
    losses_allowance_pct: float = key(
        "Allowance for losses between meters and transformer, % of demand.", default=0.0, at_least=0.0
    )
    unmetered_kw: float = key(
        "Unmetered block such as street lighting, at all hours stated. [kW]", default=0.0, at_least=0.0
    )
    unmetered_hours: tuple[int, ...] = key(
        "Hours of the day at which the unmetered block runs; all when empty.", default=(), at_least=0, at_most=23
    )
    connection: str = key("Connection of the windings, as on the nameplate.", default="", example='"Dyn11"')
    cooling: str = key("Cooling, as on the nameplate.", default="", example='"ONAN"')
    temperature_rise_c: float = key(
        "Average winding temperature rise at rated load, as on the nameplate; 0 where unknown. [K]",
        default=0.0,
        at_least=0.0,
    )
    impedance_pct: float = key(
        "Short-circuit impedance, % of rated voltage; 0 where unknown.", default=0.0, at_least=0.0, at_most=100.0
    )
    year_made: int = key("Year of manufacture; 0 where unknown.", default=0, at_least=0)
    feeder_head: bool = key(
        "Whether this is the head of the feeder, which serves the customers of every transformer of the study.",
        default=False,
    )
    sources: tuple[str, ...] = key(
        "Source and date of figures of this table, each led by the key it is about.",
        default=(),
        example='["impedance_pct: nameplate, read 2031-02-03"]',
    )
    loading_guide: str = key(
        "Loading guide whose equations give the temperatures; none is computed when left out.",
        default="",
        choices=("", "IEEE C57.91", "IEC 60076-7"),
    )
    both_guides: bool = key(
        "Shows the equations of the other guide beside, on the same drawn years; criteria go by `loading_guide`.",
        default=False,
    )
    paper: str = key(
        "Insulation paper of the windings; needed for temperatures, never assumed.",
        default="",
        choices=("", "kraft", "thermally upgraded"),
    )
    top_oil_rise_k: float = key(
        "Top-oil rise over ambient at rated load; 0 where unknown. [K]", default=0.0, at_least=0.0
    )
    hot_spot_gradient_k: float = key(
        "Hot-spot rise over top oil at rated load; 0 where unknown. [K]", default=0.0, at_least=0.0
    )
    loss_ratio: float = key(
        "Load losses at rated load over no-load losses; 0 where unknown.", default=0.0, at_least=0.0
    )
    oil_exponent: float = key("Oil exponent, n or x of the guide; 0 where unknown.", default=0.0, at_least=0.0)
    winding_exponent: float = key("Winding exponent, m or y of the guide; 0 where unknown.", default=0.0, at_least=0.0)
    oil_time_constant_min: float = key(
        "Oil time constant at rated load; 0 where unknown. [min]", default=0.0, at_least=0.0
    )
    winding_time_constant_min: float = key(
        "Winding time constant at rated load; 0 where unknown. [min]", default=0.0, at_least=0.0
    )
    k11: float = key("Constant k11 of IEC 60076-7.", default=1.0, above=0.0)
    k21: float = key("Constant k21 of IEC 60076-7.", default=1.0, above=0.0)
    k22: float = key("Constant k22 of IEC 60076-7.", default=1.0, above=0.0)
    thermal_source: str = key("Where the thermal data come from.", default="")
    derating_pu: float = key(
        "Altitude and enclosure: rating that counts over nameplate, by the utility's own rule. [pu]",
        default=1.0,
        above=0.0,
        at_most=1.0,
    )
    ambient_c: float = key(
        "Constant ambient temperature where no series is given, a stated high one; -100 where none. [°C]",
        default=-100.0,
        at_least=-100.0,
        at_most=60.0,
    )
    no_load_losses_w: tuple[float, ...] = key(
        "No-load losses of each rating compared, from test reports, in their order. [W]", default=(), at_least=0.0
    )
    load_losses_w: tuple[float, ...] = key(
        "Load losses at rated load of each rating compared, in their order. [W]", default=(), at_least=0.0
    )
    loss_factor_a_per_w: float = key(
        "Worth of a watt of no-load losses; 0 where none. [currency/W]", default=0.0, at_least=0.0
    )
    loss_factor_b_per_w: float = key(
        "Worth of a watt of rated load losses; 0 where none. [currency/W]", default=0.0, at_least=0.0
    )
    energy_price_per_kwh: float = key(
        "Price of lost energy, instead of the worth of a watt; 0 where none. [currency/kWh]", default=0.0, at_least=0.0
    )
    discount_rate_pct: float = key(
        "Rate at which the price of a year's lost energy is discounted, % per year.",
        default=0.0,
        at_least=0.0,
        at_most=100.0,
    )
    worth_years: int = key("Years over which lost energy is counted; 0 where none. [a]", default=0, at_least=0)
    prices: tuple[float, ...] = key(
        "Price of each rating compared, in their order. [currency]", default=(), at_least=0.0
    )
    currency: str = key("Unit of money.", default="")


@dataclass(frozen=True, slots=True, kw_only=True)
class AllowedLoading:
    """``[[allowed_loading]]``: loading that the utility allows in a season, per unit of nameplate."""

    season: str = key('Season, or "all".', default="all")
    normal_pu: float = key("Allowed in normal service. [pu of nameplate]", default=1.0, above=0.0)
    emergency_pu: float = key("Allowed in an emergency; 0 where none. [pu of nameplate]", default=0.0, at_least=0.0)
    source: str = key("Document that allows it.", default="")


@dataclass(frozen=True, slots=True, kw_only=True)
class Criterion:
    """``[[criterion]]``: a limit that the user's utility sets."""

    quantity: str = key(
        "What is limited.",
        choices=(
            "exceedance hours per year",
            "exceedance probability in any interval",
            "annual exceedance probability",
            "hot-spot temperature",
            "top-oil temperature",
            "ageing per year",
        ),
        advice="say what is limited",
    )
    limit: float = key(
        "The limit, in the unit of the quantity.", at_least=0.0, advice="your utility's loading standard states it"
    )
    of: str = key(
        "Loading that the exceedance is of.",
        default="allowed loading, normal",
        choices=("nameplate", "allowed loading, normal", "allowed loading, emergency"),
    )
    probability: float = key(
        "Allowed probability per year that a temperature limit is passed.", default=0.0, at_least=0.0, at_most=1.0
    )
    statistic: str = key(
        "Which figure is held against the limit.",
        default="predictive value",
        choices=("predictive value", "upper end of interval"),
    )
    direction: str = key("Direction of flow.", default="both", choices=("both", "delivered", "exported"))
    season: str = key('Season, or "all".', default="all")
    source: str = key("Document and clause the criterion comes from.", default="")
