"""The tables of the study file as frozen dataclasses."""

from dataclasses import dataclass

from loadsum.study.keys import key
from loadsum.study.loadtocome import Addition, DiversityTable, Rusck, ScenarioKeys, Velander
from loadsum.study.unittables import AllowedLoading, Criterion, Transformer


@dataclass(frozen=True, slots=True, kw_only=True)
class Heading:
    """``[study]``: what the study is called, where and when it holds, and how it is printed."""

    title: str = key("Title of the study.", example='"Pole transformer at Mill Lane"', advice="give the study a title")
    reference: str = key("The user's own number for the study.", default="", example='"DP-0117"')
    revision: str = key("Revision of the study.", default="0", example='"A"')
    status: str = key("Standing of the document.", default="draft", choices=("draft", "for review", "issued"))
    date: str = key(
        "Date of the study, ISO 8601; printed as given and used for every date inside the PDF.",
        default="",
        example='"2031-05-04"',
    )
    question: str = key("The question the study answers, in one sentence.", default="")
    place: str = key("Where the transformer stands, in words.", default="", example='"Mill Lane, Exampleton"')
    region: str = key(
        "Whose standards the cautions name.",
        default="international",
        choices=("international", "north america", "europe", "united kingdom", "australia"),
    )
    time_zone: str = key(
        "IANA time zone of the place, or a fixed offset.",
        example='"America/Chicago"',
        advice='name the IANA zone of the place ("Europe/Oslo") or a fixed offset ("+10:00")',
    )
    demand_interval_min: int = key(
        "Demand interval of the study. [min]",
        choices=("5", "10", "15", "30", "60"),
        example="60",
        advice="15, 30 or 60; the utility's loading standard states it",
    )
    page: str = key("Paper size of the report.", default="A4", choices=("A4", "letter"))
    temperature_unit: str = key("Unit in which temperatures are printed.", default="C", choices=("C", "F"))
    language: str = key("Language of the report.", default="en", choices=("en",))
    seed: int = key("Seed of every random draw.", default=1, at_least=0)


@dataclass(frozen=True, slots=True, kw_only=True)
class MeterFiles:
    """``[[readings]]``: one file, folder or pattern of meter files and how to read it."""

    files: str = key(
        "File, folder or pattern, relative to the study file.",
        example='"meters/*.csv"',
        advice="name the meter file, relative to the study file",
    )
    format: str = key(
        "Format of the files.",
        default="delimited text",
        choices=("delimited text", "workbook", "parquet", "espi", "nem12"),
    )
    layout: str = key(
        "Layout of a table of readings; guessed and said when left out.",
        default="",
        choices=("one row a reading", "one column a customer", "one row a day"),
    )
    delimiter: str = key("Field separator; guessed when left out.", default="")
    decimal: str = key("Decimal sign; guessed when left out.", default="", choices=(".", ","))
    encoding: str = key("Text encoding; UTF-8 unless a byte-order mark says otherwise.", default="")
    customer_column: str = key("Header of the column with the customer's identifier.", default="")
    time_column: str = key("Header of the column with the time stamp.", default="")
    time_of_day_column: str = key(
        "Column of the time of day, where date and time stand in columns of their own.", default="", example='"Time"'
    )
    value_column: str = key("Header of the column with the reading.", default="")
    kvar_column: str = key("Header of the column with reactive energy or power.", default="")
    export_column: str = key(
        "Header of the column with exported energy or power, counted as negative demand.", default=""
    )
    flag_column: str = key("Header of the column with the quality flag.", default="")
    estimated_flags: tuple[str, ...] = key("Flags that mean estimated or substituted.", default=())
    customer: str = key("Customer of a file that holds one customer and no identifier.", default="")
    time_format: str = key(
        "Form of the time stamps, in strptime notation; ISO 8601 is understood without it.", default=""
    )
    quantity: str = key("What a reading is.", default="energy", choices=("energy", "power", "register"))
    unit: str = key(
        "Unit of a reading.",
        choices=("Wh", "kWh", "MWh", "W", "kW", "MW"),
        example='"kWh"',
        advice="state the unit of the readings; it is never guessed",
    )
    multiplier: float = key("Meter multiplier (instrument transformer ratio).", default=1.0, above=0.0)
    interval_min: int = key("Interval of the readings; found in the data when 0. [min]", default=0, at_least=0)
    stamp: str = key(
        "Whether a stamp marks the start or the end of its interval.",
        choices=("start", "end"),
        example='"start"',
        advice='"start" or "end"; ask whoever exported the file',
    )
    clock: str = key(
        'What clock the stamps show: "local" (with daylight saving), "utc", "standard" (local standard time all'
        ' year) or a fixed offset such as "+10:00". A stamp that carries its own offset is believed.',
        default="local",
    )
    day_first: str = key("Order of day and month in stamps such as 03/04/2031.", default="", choices=("yes", "no"))
    header: str = key(
        "Whether a table begins with a row of names; columns without one are called column 1, column 2 and so on.",
        default="yes",
        choices=("yes", "no"),
    )
    first_stamp: str = key(
        "Stamp of the first row of a table without stamps, ISO 8601; the others follow at interval_min, which must be"
        " stated too.",
        default="",
        example='"2031-01-01T00:00"',
    )
    meters: str = key(
        "Whose demand the files hold: each customer's, or the sum that a meter at the transformer or feeder head"
        " measures, which is compared and never added.",
        default="customers",
        choices=("customers", "group"),
    )
    register_digits: int = key(
        "Digits before the decimal point of a register that rolls over; 0 where a fall means a new meter.",
        default=0,
        at_least=0,
        at_most=12,
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Customer:
    """``[[customer]]``, or a row of the customer table."""

    id: str = key("Identifier, as in the meter files.", example='"H-01"', advice="identifier as in the meter files")
    customer_class: str = key(
        "Customer class; customers of a class lend each other what they have not shown yet.", default="all"
    )
    role: str = key(
        "Part the customer plays in the study.",
        default="existing",
        choices=("existing", "planned", "leaving", "transferred in", "transferred out", "reference only"),
    )
    transformer: str = key("Transformer that serves the customer.", default="")
    phase: str = key("Phase of a single-phase customer.", default="")
    annual_kwh: float = key("Energy per year; 0 where unknown. [kWh]", default=0.0, at_least=0.0)
    count: int = key("Number of like customers that a planned entry stands for.", default=1, at_least=1)
    multiplier: float = key("Meter multiplier.", default=1.0, above=0.0)
    service_rating_kw: float = key("Rating of the service; 0 where unknown. [kW]", default=0.0, at_least=0.0)
    export: bool = key("Whether the customer may export.", default=False)
    devices: tuple[str, ...] = key("Devices known to be there.", default=())
    monthly_kwh: tuple[float, ...] = key(
        "Energy billed in each month, January first, where there are no readings. [kWh]", default=(), at_least=0.0
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class CustomerTable:
    """``[customers]``: a table of customers beside the study file."""

    table: str = key("CSV or .xlsx file with the columns of [[customer]].", default="")


@dataclass(frozen=True, slots=True, kw_only=True)
class Season:
    """``[[season]]``: months that are studied together."""

    name: str = key("Name of the season.", example='"winter"', advice="name the season")
    months: tuple[int, ...] = key(
        "Months, 1 to 12.", example="[12, 1, 2]", at_least=1, at_most=12, advice="list the months"
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class DayTypes:
    """``[day_types]``: which days are alike."""

    split: str = key(
        "How days are grouped.",
        default="workday and other",
        choices=("workday and other", "workday, saturday and sunday", "all days alike"),
    )
    holidays_country: str = key("ISO 3166 code of the country whose public holidays count as other days.", default="")
    holidays_subdivision: str = key("Subdivision of that country.", default="")
    holidays: tuple[str, ...] = key("Further holidays, ISO 8601 dates.", default=())


@dataclass(frozen=True, slots=True, kw_only=True)
class Weather:
    """``[weather]``: outdoor temperature."""

    file: str = key("Delimited text with a temperature series.", default="")
    time_column: str = key("Header of the column with the time stamp.", default="")
    temperature_column: str = key("Header of the column with the temperature.", default="")
    unit: str = key("Unit of the temperature.", default="C", choices=("C", "F"))
    clock: str = key("Clock of the stamps, as in [[readings]].", default="local")
    time_format: str = key("Form of the time stamps.", default="")
    record_file: str = key(
        "Longer record of temperature over which the year is averaged; the file above when left out.", default=""
    )
    first_stamp: str = key("Stamp of the first row of a series without stamps, ISO 8601.", default="")
    interval_min: int = key("Interval of a series without stamps. [min]", default=0, at_least=0)
    beyond_metered_range: bool = key(
        "Whether days outside the metered range of temperature are extrapolated, marked.", default=False
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class FindingLimits:
    """``[findings]``: limits of the rules that readings are held against, common practice where not set."""

    spike_factor: float = key(
        "Times the level exceeded 0.1 % of the time above which a reading is a spike.", default=5.0, above=1.0
    )
    stuck_h: float = key("Hours of the same value, not zero, that are a stuck run. [h]", default=12.0, above=0.0)
    zero_h: float = key("Hours of exact zeros that look like a filled gap. [h]", default=24.0, above=0.0)
    outage_share: float = key(
        "Share of the customers that read zero together in an outage.", default=0.8, above=0.0, at_most=1.0
    )
    unit_ratio: float = key(
        "Ratio of a customer's mean demand to the middle customer's above which, or below whose inverse, the unit is in"
        " doubt.",
        default=300.0,
        above=1.0,
    )
    moved_share: float = key(
        "Share of a customer's earlier or later mean below which it has moved in or out.",
        default=0.1,
        above=0.0,
        at_most=1.0,
    )
    exclude: tuple[str, ...] = key(
        "Rules whose readings are left out of the study, named as in docs/findings.md.",
        default=(),
        choices=("spike", "stuck value", "zeros like a gap", "outage", "negative demand", "above service rating"),
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class ModelKeys:
    """``[model]``: parts of the demand model that can be switched off, and their settings."""

    temperature: bool = key("Take each customer's temperature response out first.", default=True)
    common_component: bool = key("Carry the part of demand that moves all customers together.", default=True)
    shrinkage: bool = key("Borrow from other customers of the class what a customer has not shown yet.", default=True)
    mean_uncertainty: bool = key("Carry the uncertainty of the mean.", default=True)
    borrowed_days: float = key("Weight of the class, in days; the program's 10 when 0.", default=0.0, at_least=0.0)
    lattice_w: float = key("Step of the lattice; from the meters' resolution when 0. [W]", default=0.0, at_least=0.0)
    correlation: float = key(
        "Mean correlation between customers, where they were never metered together; -1 asks the class.",
        default=-1.0,
        at_least=-1.0,
        at_most=1.0,
    )
    resamples: int = key("Resamples of whole weeks behind each interval.", default=200, at_least=0, at_most=100_000)


@dataclass(frozen=True, slots=True, kw_only=True)
class Person:
    """``[[person]]``: who made, checked and answers for the study."""

    role: str = key(
        "Role.", choices=("prepared", "checked", "responsible engineer", "approved"), advice="give the role"
    )
    name: str = key("Name.", default="")
    registration: str = key("Registration or licence number.", default="")


@dataclass(frozen=True, slots=True, kw_only=True)
class Privacy:
    """``[privacy]``: how customers are called in the report, the results and everything attached."""

    raw_identifiers: bool = key(
        "Print the identifiers of the meter files instead of pseudonyms; the report says so.", default=False
    )
    key_file: str = key(
        "File of the key that makes the pseudonyms, beside the study file; made when it is not there. Keep it: with the"
        " same key a customer keeps its pseudonym in every revision.",
        default="study.key",
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Study:
    """A study file, checked."""

    study: Heading = key("What the study is.")
    readings: tuple[MeterFiles, ...] = key("Meter files.", advice="name at least one meter file under [[readings]]")
    customers: CustomerTable = key("Table of customers.", default_factory=CustomerTable)
    customer: tuple[Customer, ...] = key("Customers; every customer in the files when none is listed.", default=())
    season: tuple[Season, ...] = key("Seasons; the whole year as one when none is listed.", default=())
    day_types: DayTypes = key("Day types.", default_factory=DayTypes)
    weather: Weather = key("Outdoor temperature.", default_factory=Weather)
    findings: FindingLimits = key("Limits of the rules that readings are held against.", default_factory=FindingLimits)
    model: ModelKeys = key("Demand model.", default_factory=ModelKeys)
    transformer: tuple[Transformer, ...] = key("Transformer, or transformers.", advice="describe the transformer")
    allowed_loading: tuple[AllowedLoading, ...] = key("Allowed loading by season.", default=())
    criterion: tuple[Criterion, ...] = key(
        "Criteria of the user's utility; none means a table and no verdict.", default=()
    )
    person: tuple[Person, ...] = key("People.", default=())
    scenario: tuple[ScenarioKeys, ...] = key("Scenarios of load to come.", default=())
    addition: tuple[Addition, ...] = key("What scenarios add, and what headroom is counted in.", default=())
    velander: Velander = key("Two-term law of maximum demand.", default_factory=Velander)
    rusck: Rusck = key("Square-root law of coincidence.", default_factory=Rusck)
    diversity_table: tuple[DiversityTable, ...] = key("Tables of factors that the user works with.", default=())
    privacy: Privacy = key("Names of customers.", default_factory=Privacy)
